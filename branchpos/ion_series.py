"""Ions that chains give: one by one for people, as arrays for the scoring of many chains at once."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.end_group import EndGroup
from branchpos.masses import Formula


class IonKind(IntEnum):
    """How an ion comes about; the error of a prediction depends on it."""

    FRAGMENT = 0
    """Even-electron ion of one simple cleavage (odd mass for an alkane)."""
    REARRANGED = 1
    """Its partner one hydrogen lighter: a hydrogen moved to the departing radical (even mass)."""
    MOLECULAR = 2
    SHARED = 3
    """Alike for all isomers: ions of the end group, low daughter ions."""


@dataclass(frozen=True, slots=True)
class Ion:
    """One expected ion of one chain.

    Attributes
    ----------
    mz : whole mass number.
    exact_mz : m/z of the light isotopologue [Th], None where the composition is not known.
    carbons : size of the ion in skeleton carbons.
    composition : elements of the ion, None where not known.
    kind : how it comes about.
    expected, low, high : abundance relative to the base peak and its 95 % interval.
    steered : share that comes from cleavage beside a branch, 0 to 1.
    cleavage : in words, the bonds whose cleavage gives it.
    """

    mz: int
    exact_mz: float | None
    carbons: int
    composition: Formula | None
    kind: IonKind
    expected: float
    low: float
    high: float
    steered: float
    cleavage: str


@dataclass(frozen=True, slots=True)
class IonSeries:
    """The ions of one chain, by rising m/z."""

    chain: Chain
    ions: tuple[Ion, ...]


@dataclass(frozen=True, slots=True, eq=False)
class SeriesBatch:
    """Expected ions of many chains of one class and backbone, as arrays.

    Attributes
    ----------
    end_group, backbone : what all the chains share.
    positions : methyl positions, shape (chains, methyls).
    masses, carbons, kinds : mass number, size and kind of each ion, shape (ions,).
    abundance : expected abundance, any unit common to the batch, shape (chains, ions).
    steered : share of it that comes from cleavage beside a branch, shape (chains, ions).
    side_masses, side_abundance : ions that are alike for all isomers, shape (side ions,); abundance in the
        unit of a chain whose ions sum to one.
    """

    end_group: EndGroup
    backbone: int
    positions: NDArray[np.int16]
    masses: NDArray[np.intp]
    carbons: NDArray[np.intp]
    kinds: NDArray[np.intp]
    abundance: NDArray[np.float32]
    steered: NDArray[np.float32]
    side_masses: NDArray[np.intp]
    side_abundance: NDArray[np.float64]

    def __len__(self) -> int:
        return len(self.positions)

    @property
    def skeleton_carbons(self) -> int:
        """Carbons of backbone and branches."""
        return self.backbone + int(self.positions.shape[1])

    def chain(self, row: int) -> Chain:
        """Return the chain of one row."""
        return Chain(self.backbone, tuple(self.positions[row].tolist()), self.end_group)

    def take(self, rows: NDArray[np.intp]) -> SeriesBatch:
        """Return the batch of some of the rows."""
        return SeriesBatch(
            self.end_group,
            self.backbone,
            self.positions[rows],
            self.masses,
            self.carbons,
            self.kinds,
            self.abundance[rows],
            self.steered[rows],
            self.side_masses,
            self.side_abundance,
        )
