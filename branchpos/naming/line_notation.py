"""Line notation (SMILES) of chains, both ways.

Written from C1 for alkanes and towards C1 for the other classes, without stereochemistry. Read in any order
of atoms: the end group is found by its pattern, the backbone is the longest carbon chain from it, and all
other carbons must be methyls (IUPAC Recommendations 2013, P-44.3 and P-31.1.4). Any longest chain will do:
two of them part only at ends that are one carbon long.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS, EndGroup
from branchpos.errors import NamingError
from branchpos.naming.structure import Structure, read_structure


@dataclass(frozen=True, slots=True)
class _Head:
    """The end group with the backbone carbon that holds the rest of the chain, written first.

    Attributes
    ----------
    notation : line notation of the group.
    position : number of its first atom in the backbone.
    shortest : the shortest backbone that makes this class.
    also : other spellings of the same atoms.
    """

    notation: str
    position: int = 1
    shortest: int = 1
    also: tuple[str, ...] = ()


_CARBONYL = END_GROUPS["methyl ketone"].first_free - 1
"""Backbone number of a methyl ketone's carbonyl carbon."""


_HEADS = {
    "methyl ester": _Head("C(=O)OC"),
    "ethyl ester": _Head("C(=O)OCC"),
    "trimethylsilyl ester": _Head("C(=O)O[Si](C)(C)C"),
    "3-pyridylcarbinol ester": _Head("C(=O)OCc1cccnc1", also=("C(=O)OCC1=CC=CN=C1", "C(=O)OCC1=CN=CC=C1")),
    "acetate": _Head("COC(C)=O"),
    "acid": _Head("C(=O)O"),
    "pyrrolidide": _Head("C(=O)N1CCCC1"),
    "dimethyloxazoline": _Head("C1=NC(C)(C)CO1"),
    "trimethylsilyl ether": _Head("CO[Si](C)(C)C"),
    "methyl ether": _Head("COC"),
    "methyl ketone": _Head("C(C)=O", position=_CARBONYL, shortest=_CARBONYL + 1),
    "aldehyde": _Head("C=O"),
    "amine": _Head("CN"),
    "alcohol": _Head("CO"),
}
"""By class, in the order in which they are tried: ethyl acetate, say, is read as an ethyl ester."""


def smiles(chain: Chain) -> str:
    """Write the line notation of a chain.

    Raises
    ------
    NamingError : the class is alkene, whose double bond is not placed, or the backbone is too short.

    >>> smiles(Chain(5, (2, 2, 4)))
    'CC(C)(C)CC(C)C'
    >>> smiles(Chain(6, (4,), END_GROUPS["acid"]))
    'CCC(C)CCC(=O)O'
    """
    name = chain.end_group.name
    branches = Counter(chain.methyls)
    if name == "alkane":
        return "".join("C" + "(C)" * branches[position] for position in range(1, chain.backbone + 1))
    if name not in _HEADS:
        raise NamingError(
            f"the double bond of an {name} is not placed", remedy="no line notation can be given"
        )
    head = _HEADS[name]
    if chain.backbone < head.shortest:
        raise NamingError(
            f"a {name} with a backbone of {chain.backbone}",
            remedy=f"give at least {head.shortest} carbons",
        )
    tail = range(chain.backbone, head.position, -1)
    return "".join("C" + "(C)" * branches[position] for position in tail) + head.notation


def parse_smiles(text: str) -> Chain:
    """Read line notation of a methyl-branched chain, atoms in any order.

    Raises
    ------
    NamingError : the notation is broken, or the structure is cyclic, unsaturated, branched otherwise, or ends
    in a group that is no chain class; says which.

    >>> parse_smiles("C(CC)C(C)C") == Chain(5, (2,))
    True
    >>> parse_smiles("C[C@@H](CCCC)CCO") == Chain(7, (3,), END_GROUPS["alcohol"])
    True
    """
    structure = read_structure(text.strip())
    if set(structure.elements) == {"C"} and not _odd_bonds(structure):
        return _alkane(structure, text)
    fitting = [(name, atoms) for name in _HEADS for atoms in _matches(structure, name)]
    fitting = [(name, atoms) for name, atoms in fitting if _covers(structure, atoms)]
    for name, atoms in fitting:
        if len(_chain_starts(structure, atoms)) in _starts_allowed(name):
            return _with_head(structure, atoms, END_GROUPS[name], text)
    if fitting:
        raise NamingError(
            f"{text.strip()!r}: the {fitting[0][0]} group is not at the end of a chain",
            remedy="only groups at a chain's end can be placed",
        )
    raise NamingError(_obstacle(structure, text), remedy=f"the classes read are: alkane, {', '.join(_HEADS)}")


def _chain_starts(structure: Structure, atoms: tuple[int, ...]) -> list[int]:
    """Return the atoms outside the end group that its first atom holds."""
    return [near for near in structure.bonds[atoms[0]] if near not in atoms]


def _starts_allowed(name: str) -> tuple[int, ...]:
    """Return how many chains may start at the end group: one, or none where the group is its own class."""
    return (1,) if _HEADS[name].shortest > _HEADS[name].position else (0, 1)


def _odd_bonds(structure: Structure) -> bool:
    return any(order != 1.0 for bonds in structure.bonds for order in bonds.values())


def _alkane(structure: Structure, text: str) -> Chain:
    """Read a structure of carbons and single bonds."""
    if structure.rings:
        raise NamingError(_obstacle(structure, text), remedy="only open chains can be placed")
    end = _longest_path(structure, 0, frozenset())[-1]
    path = _longest_path(structure, end, frozenset())
    return Chain(len(path), _methyls(structure, path, frozenset(), 1, text))


def _with_head(structure: Structure, atoms: tuple[int, ...], group: EndGroup, text: str) -> Chain:
    """Read a structure whose end group is known; ``atoms[0]`` is the backbone carbon that holds the chain."""
    position, head = _HEADS[group.name].position, frozenset(atoms)
    path = _longest_path(structure, atoms[0], head)
    return Chain(len(path) + position - 1, _methyls(structure, path, head, position, text), group)


def _longest_path(structure: Structure, start: int, barred: frozenset[int]) -> list[int]:
    """Return one longest walk from ``start`` that keeps out of ``barred``; there is no ring there."""
    best: list[int] = []
    stack = [(start, -1, 1)]
    walk: list[int] = []
    while stack:
        atom, came_from, depth = stack.pop()
        walk[depth - 1 :] = [atom]
        if len(walk) > len(best):
            best = walk.copy()
        stack += [
            (near, atom, depth + 1)
            for near in structure.bonds[atom]
            if near != came_from and near not in barred
        ]
    return best


def _methyls(
    structure: Structure, path: list[int], head: frozenset[int], start: int, text: str
) -> tuple[int, ...]:
    """Return the positions of the side carbons, each of which must be a methyl."""
    on_path, found = set(path) | head, []
    for position, atom in enumerate(path, start):
        for near in structure.bonds[atom]:
            if near in on_path:
                continue
            if len(structure.bonds[near]) > 1:
                raise NamingError(
                    f"{text.strip()!r}: the branch on position {position} is longer than methyl",
                    remedy="only methyl branches can be placed",
                )
            found.append(position)
    return tuple(found)


@cache
def _patterns(name: str) -> tuple[Structure, ...]:
    head = _HEADS[name]
    return tuple(read_structure(notation) for notation in (head.notation, *head.also))


def _matches(structure: Structure, name: str) -> Iterator[tuple[int, ...]]:
    """Yield the atoms of each place where a class's end group fits, in the order of its pattern."""
    for pattern in _patterns(name):
        for atom, element in enumerate(structure.elements):
            if element == pattern.elements[0]:
                yield from _grown(structure, pattern, (atom,))


def _grown(structure: Structure, pattern: Structure, atoms: tuple[int, ...]) -> Iterator[tuple[int, ...]]:
    """Extend a partial match by the pattern's next atom; pattern atoms follow a neighbour already matched."""
    new = len(atoms)
    if new == len(pattern.elements):
        yield atoms
        return
    earlier = {old: order for old, order in pattern.bonds[new].items() if old < new}
    for near in structure.bonds[atoms[min(earlier)]]:
        fits = (
            near not in atoms
            and structure.elements[near] == pattern.elements[new]
            and len(structure.bonds[near]) == len(pattern.bonds[new])
            and all(structure.bonds[near].get(atoms[old]) == order for old, order in earlier.items())
        )
        if fits:
            yield from _grown(structure, pattern, (*atoms, near))


def _covers(structure: Structure, atoms: tuple[int, ...]) -> bool:
    """Tell whether all that is not a saturated open chain of carbons lies inside the matched end group."""
    head = set(atoms)
    outside = [atom for atom in range(len(structure.elements)) if atom not in head]
    bonds = {frozenset((a, b)) for a in outside for b in structure.bonds[a]}
    plain = all(structure.elements[a] == "C" and set(structure.bonds[a].values()) <= {1.0} for a in outside)
    return plain and len(bonds) == len(outside)


def _obstacle(structure: Structure, text: str) -> str:
    """Say what kind of structure it is that no class describes."""
    given, others = repr(text.strip()), sorted({e for e in structure.elements if e not in ("C", "c")})
    if others:
        return f"{given}: its {', '.join(others)} make none of the end groups, or more than one"
    return f"{given} is {'cyclic' if structure.rings else 'unsaturated'}"
