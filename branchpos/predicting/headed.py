"""Expected ions of chains with an end group: families of cleavages read off tables, steered by branches.

A family is one kind of ion that any backbone bond can give: the part that keeps the end group, the same with
a hydrogen moved onto it, the hydrocarbon part left after the end group has gone, the alkyl part. A table says
how much each bond gives, counted from the end group and from the far end; where a methyl sits beside the
bond, the branch steers. The methyls inside the ion shift its mass, so that positions show as gaps and shifts.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import Enum
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import EndGroup
from branchpos.ion_series import IonKind, SeriesBatch
from branchpos.masses import Formula

FloatArray = NDArray[np.float64]

TABLE = 16
"""Bonds counted from the family's own end that have an entry of their own; further ones fall by a slope."""
TAIL = 6
"""Bonds counted from the other end that are corrected one by one."""
POOL_SIZES = range(3, 9)
POOL_RESIDUES = (1, 0, -1, -2, -3)
"""Low hydrocarbon ions, CnH2n+1 to CnH2n-3, alike for all isomers."""
_ALPHA = 2
"""Carbon beside the functional group, whose methyl stays in the McLafferty ion and favours it."""
_USUAL_LENGTH = 14
"""Backbone carbons at which the tables are quoted; each family grows or falls by a rate from there."""
_CARBON_13 = 0.0108


class Keeps(Enum):
    """Which side of the bond keeps the charge, and with what."""

    HEAD = "the part with the end group"
    HEAD_WITHOUT = "the part with C1 after the end group has left"
    TAIL = "the alkyl part"


@dataclass(frozen=True, slots=True)
class Family:
    """One family of ions.

    Attributes
    ----------
    name : as in the parameter names.
    keeps : which part the ion is.
    hydrogens : hydrogens beyond the even-electron cation of simple cleavage (0, or 1 where one is moved).
    kind : how the ion comes about, which sets its error.
    start : log abundance believed before the fit at the first bonds, then beyond the last of them.
    smallest : smallest ion [carbons] that is not left to the pool.
    """

    name: str
    keeps: Keeps
    hydrogens: int
    kind: IonKind
    start: tuple[float, ...]
    smallest: int = 1


@dataclass(frozen=True, slots=True)
class ClassRules:
    """What a chain class adds to the common engine.

    Attributes
    ----------
    end_group : the class.
    families : ions of bond cleavage.
    losses : neutral losses from the molecular ion that no bond family covers: mass and log abundance.
    fixed : ions of the end group alone: mass and log abundance.
    pool : log abundance believed of the low hydrocarbon ions.
    molecular : log abundance believed of the molecular ion.
    fitted : false where no real spectra were at hand, so that the rules stand with wide uncertainty.
    """

    end_group: EndGroup
    families: tuple[Family, ...]
    losses: Mapping[int, float]
    fixed: Mapping[int, float]
    pool: float
    molecular: float
    fitted: bool = True

    def __hash__(self) -> int:
        return hash(self.end_group.name)


@dataclass(frozen=True, slots=True)
class Entry:
    """One parameter: its name, prior mean, and prior standard deviation."""

    name: str
    mean: float
    sd: float


@lru_cache(maxsize=64)
def entries(rules: ClassRules) -> tuple[Entry, ...]:
    """Return the parameters of a class in the order of its vectors."""
    wide = 1.5
    found = [
        Entry("molecular", rules.molecular, wide),
        Entry("molecular_size", 0.0, 0.1),
        Entry("molecular_branch", -0.3, 0.3),
        Entry("steer_site", 0.6, 0.4),
        Entry("steer_radical", 0.8, 0.4),
        Entry("steer_quaternary", 2.0, 0.7),
        Entry("alpha_methyl", 0.8, 0.5),
        Entry("gap", -1.5, 0.5),
    ]
    for family in rules.families:
        found += [Entry(f"{family.name}_{bond}", _start(family, bond), wide) for bond in range(1, TABLE + 1)]
        found += [Entry(f"{family.name}_end_{bond}", 0.0, 0.7) for bond in range(1, TAIL + 1)]
        found.append(Entry(f"{family.name}_slope", -0.02, 0.05))
        found.append(Entry(f"{family.name}_length", 0.0, 0.1))
    found += [Entry(f"loss_{mass}", level, wide) for mass, level in rules.losses.items()]
    found += [Entry(f"fixed_{mass}", level, wide) for mass, level in rules.fixed.items()]
    found += [
        Entry(f"pool_{residue}_{size}", rules.pool - 0.3 * (size - 3) - (2.5 if residue < -1 else 0.0), 1.0)
        for residue in POOL_RESIDUES
        for size in POOL_SIZES
    ]
    return tuple(found)


def _start(family: Family, bond: int) -> float:
    return family.start[min(bond, len(family.start)) - 1]


def prior_precision(rules: ClassRules) -> FloatArray:
    """Return the prior precision matrix: each entry near its mean, neighbours of a table near each other."""
    rows = entries(rules)
    precision = np.diag([row.sd**-2.0 for row in rows])
    place = {row.name: index for index, row in enumerate(rows)}
    for family in rules.families:
        for bond in range(len(family.start) + 1, TABLE):
            first, second = place[f"{family.name}_{bond}"], place[f"{family.name}_{bond + 1}"]
            precision[np.ix_([first, second], [first, second])] += np.array([[1, -1], [-1, 1]]) / 0.6**2
    return precision


def predict_headed(
    rules: ClassRules, values: FloatArray, backbone: int, positions: NDArray[np.int16]
) -> SeriesBatch:
    """Predict the ions of chains of one class that share a backbone and a number of methyls.

    Parameters
    ----------
    rules : the chain class.
    values : parameters in the order of ``entries(rules)``.
    backbone : carbons of the main chain, C1 included.
    positions : methyl positions, shape (chains, methyls).
    """
    named = dict(zip((row.name for row in entries(rules)), values.tolist(), strict=True))
    chains, methyls = positions.shape
    carbons = backbone + methyls
    on_carbon = np.zeros((chains, backbone + 2), dtype=np.int64)
    for column in range(methyls):
        on_carbon[np.arange(chains), positions[:, column]] += 1
    columns: list[_Column] = []
    for family in rules.families:
        columns += _family_columns(family, named, rules.end_group, backbone, on_carbon, carbons)
    columns += _shared_columns(rules, named, carbons, chains)
    return _assembled(rules.end_group, backbone, positions, columns)


@dataclass(frozen=True, slots=True, eq=False)
class _Column:
    """One ion of all chains: mass number, size, kind, abundance and steered part, each of shape (chains,)."""

    mass: int
    size: int
    kind: IonKind
    abundance: FloatArray
    steered: FloatArray


def _family_columns(
    family: Family,
    named: Mapping[str, float],
    end_group: EndGroup,
    backbone: int,
    on_carbon: NDArray[np.int64],
    carbons: int,
) -> list[_Column]:
    """Return one column for each size of a family's ion."""
    level = _bond_levels(family, named, backbone)
    inside = np.cumsum(on_carbon, axis=1)[:, 1:backbone]
    left, right = on_carbon[:, 1:backbone], on_carbon[:, 2 : backbone + 1]
    left_size = np.arange(1, backbone) + inside
    own, other, size = (
        (right, left, carbons - left_size) if family.keeps is Keeps.TAIL else (left, right, left_size)
    )
    push = named["steer_site"] * (own > 0) + named["steer_radical"] * (other > 0)
    push += named["steer_quaternary"] * ((own == 2) | (other == 2))
    if family.kind is IonKind.REARRANGED and family.keeps is Keeps.HEAD and backbone > _ALPHA:
        push[:, _ALPHA - 1] += named["alpha_methyl"] * (on_carbon[:, _ALPHA] > 0)
    plain = np.exp(level)[None, :] * np.ones_like(push)
    abundance = np.zeros((len(on_carbon), carbons + 1))
    steered = np.zeros_like(abundance)
    rows = np.arange(len(on_carbon))[:, None]
    abundance[rows, size] = plain * np.exp(push)
    steered[rows, size] = plain * np.maximum(np.exp(push) - 1, 0.0)
    missing = abundance[:, 2:-1] == 0
    abundance[:, 2:-1] += missing * np.exp(named["gap"]) * abundance[:, 1:-2]
    return [
        _Column(mass_of(family, end_group, s), s, family.kind, abundance[:, s], steered[:, s])
        for s in range(family.smallest, carbons)
    ]


def _bond_levels(family: Family, named: Mapping[str, float], backbone: int) -> FloatArray:
    """Return the log abundance that each bond gives in an unbranched chain, shape (backbone - 1,)."""
    bonds = np.arange(1, backbone)
    own_end, other_end = (
        (backbone - bonds, bonds) if family.keeps is Keeps.TAIL else (bonds, backbone - bonds)
    )
    table = np.array([named[f"{family.name}_{bond}"] for bond in range(1, TABLE + 1)])
    corrections = np.array([named[f"{family.name}_end_{bond}"] for bond in range(1, TAIL + 1)] + [0.0])
    level = table[np.minimum(own_end, TABLE) - 1]
    level = level + named[f"{family.name}_slope"] * np.maximum(own_end - TABLE, 0)
    length = named[f"{family.name}_length"] * (backbone - _USUAL_LENGTH)
    return np.asarray(level + length + corrections[np.minimum(other_end, TAIL + 1) - 1])


def composition_of(family: Family, end_group: EndGroup, size: int) -> Formula:
    """Return the composition of a family's ion of so many skeleton carbons.

    >>> from branchpos.end_group import END_GROUPS
    >>> from branchpos.predicting.classes.families import rearranged_head
    >>> str(composition_of(rearranged_head(0.0), END_GROUPS["methyl ester"], 2))
    'C3H6O2'
    """
    if family.keeps is Keeps.HEAD:
        return Formula(size, 2 * size + 1 + family.hydrogens) + end_group.added
    if family.keeps is Keeps.HEAD_WITHOUT:
        return Formula(size, 2 * size - 1 + family.hydrogens)
    return Formula(size, 2 * size + 1 - family.hydrogens)


@lru_cache(maxsize=4096)
def mass_of(family: Family, end_group: EndGroup, size: int) -> int:
    """Return the mass number of a family's ion of so many skeleton carbons."""
    return composition_of(family, end_group, size).nominal_mass


def _shared_columns(
    rules: ClassRules, named: Mapping[str, float], carbons: int, chains: int
) -> list[_Column]:
    """Return the ions that are alike for all isomers: losses, end-group ions, pool, molecular ion."""
    molecule = 14 * carbons + 2 + rules.end_group.added.nominal_mass
    log_molecular = named["molecular"] + named["molecular_size"] * (carbons - 16)
    ions = [(molecule, carbons, IonKind.MOLECULAR, log_molecular)]
    ions += [(molecule - mass, carbons, IonKind.MOLECULAR, named[f"loss_{mass}"]) for mass in rules.losses]
    ions += [(mass, 1, IonKind.SHARED, named[f"fixed_{mass}"]) for mass in rules.fixed]
    ions += [
        (14 * size + residue, size, IonKind.SHARED, named[f"pool_{residue}_{size}"])
        for residue in POOL_RESIDUES
        for size in POOL_SIZES
        if size < carbons
    ]
    one, none = np.ones(chains), np.zeros(chains)
    return [_Column(mass, size, kind, np.exp(level) * one, none) for mass, size, kind, level in ions]


def _assembled(
    end_group: EndGroup, backbone: int, positions: NDArray[np.int16], columns: list[_Column]
) -> SeriesBatch:
    """Sum ions of equal mass, carry carbon-13 up, and bring the whole to a sum of one."""
    masses = np.array(sorted({column.mass for column in columns if column.mass > 0}), dtype=np.intp)
    place = {int(mass): index for index, mass in enumerate(masses)}
    abundance = np.zeros((len(positions), masses.size))
    steered = np.zeros_like(abundance)
    leading = np.full(masses.size, -1.0)
    sizes, kinds = np.zeros(masses.size, dtype=np.intp), np.zeros(masses.size, dtype=np.intp)
    for column in columns:
        index = place.get(column.mass)
        if index is None:
            continue
        abundance[:, index] += column.abundance
        steered[:, index] += column.steered
        if (weight := float(column.abundance.mean())) > leading[index]:
            leading[index], sizes[index], kinds[index] = weight, column.size, column.kind
    below = np.array([place.get(int(mass) - 1, -1) for mass in masses])
    carried = np.where(below >= 0, _CARBON_13 * masses / 14, 0.0)
    abundance, steered = abundance + carried * abundance[:, below], steered + carried * steered[:, below]
    total = abundance.sum(axis=1, keepdims=True)
    return SeriesBatch(
        end_group=end_group,
        backbone=backbone,
        positions=positions,
        masses=masses,
        carbons=np.maximum(sizes, 1),
        kinds=kinds,
        abundance=(abundance / total).astype(np.float32),
        steered=(steered / np.maximum(abundance, 1e-30)).astype(np.float32),
        side_masses=np.empty(0, dtype=np.intp),
        side_abundance=np.empty(0),
    )
