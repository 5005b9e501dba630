"""Which cleavages give an ion of a chain with an end group, in words."""

from __future__ import annotations

from branchpos.chain import Chain
from branchpos.masses import Formula
from branchpos.predicting.classes import CLASS_RULES
from branchpos.predicting.headed import POOL_RESIDUES, POOL_SIZES, Family, Keeps, composition_of, mass_of

_MCLAFFERTY = 2


def headed_labels(chain: Chain) -> dict[int, str]:
    """Return, by mass number, the route to each ion; bonds beside a branch name it.

    >>> from branchpos.end_group import END_GROUPS
    >>> labels = headed_labels(Chain(16, (2,), END_GROUPS["methyl ester"]))
    >>> labels[88]
    'C2|C3, charge on the end-group side, with hydrogen transfer (McLafferty), beside the branch on C2'
    """
    rules = CLASS_RULES[chain.end_group.name]
    molecule = chain.formula.nominal_mass
    labels = {
        14 * size + residue: "low hydrocarbon series" for size in POOL_SIZES for residue in POOL_RESIDUES
    }
    for family in reversed(rules.families):
        for bond in range(1, chain.backbone):
            size = _ion_size(chain, family, bond)
            if size >= family.smallest:
                labels[mass_of(family, chain.end_group, size)] = _route(chain, family, bond)
    labels |= dict.fromkeys(rules.fixed, "ion of the end group")
    labels |= {molecule - loss: f"loss of {loss} from the molecular ion" for loss in rules.losses}
    labels[molecule] = "molecular ion"
    return labels


def headed_compositions(chain: Chain) -> dict[int, Formula]:
    """Return, by mass number, the composition of the ions whose route is a bond cleavage or none at all.

    >>> from branchpos.end_group import END_GROUPS
    >>> str(headed_compositions(Chain(16, (), END_GROUPS["methyl ester"]))[74])
    'C3H6O2'
    """
    rules = CLASS_RULES[chain.end_group.name]
    found = {
        14 * size + residue: Formula(size, 2 * size + residue)
        for size in POOL_SIZES
        for residue in POOL_RESIDUES
    }
    for family in reversed(rules.families):
        for bond in range(1, chain.backbone):
            size = _ion_size(chain, family, bond)
            if size >= family.smallest:
                found[mass_of(family, chain.end_group, size)] = composition_of(family, chain.end_group, size)
    for mass in (*rules.fixed, *(chain.formula.nominal_mass - loss for loss in rules.losses)):
        found.pop(mass, None)
    return found | {chain.formula.nominal_mass: chain.formula}


def _ion_size(chain: Chain, family: Family, bond: int) -> int:
    left = bond + sum(position <= bond for position in chain.methyls)
    return chain.carbons - left if family.keeps is Keeps.TAIL else left


def _route(chain: Chain, family: Family, bond: int) -> str:
    side = {
        Keeps.HEAD: "charge on the end-group side",
        Keeps.HEAD_WITHOUT: "after loss of the end group",
        Keeps.TAIL: "charge on the alkyl side",
    }[family.keeps]
    transfer = ", with hydrogen transfer" if family.hydrogens else ""
    if transfer and family.keeps is Keeps.HEAD and bond == _MCLAFFERTY:
        transfer += " (McLafferty)"
    beside = [position for position in (bond, bond + 1) if position in chain.methyls]
    branch = f", beside the branch on C{beside[0]}" if beside else ""
    return f"C{bond}|C{bond + 1}, {side}{transfer}{branch}"
