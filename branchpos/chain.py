"""One methyl-branched chain: backbone, methyl positions, end group; canonical form; formula."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass, field

from branchpos.end_group import ALKANE, EndGroup
from branchpos.errors import NamingError
from branchpos.masses import Formula

_METHYLS_PER_CARBON = 2


@dataclass(frozen=True, slots=True, order=True)
class Chain:
    """A saturated chain with methyl branches.

    Construction checks and canonicalises: positions are sorted, and an alkane takes the numbering with the
    lowest locants (IUPAC Recommendations 2013, P-31.1.4), so that equal molecules compare equal.

    Attributes
    ----------
    backbone : carbons of the main chain, C1 included.
    methyls : positions of the methyl branches, rising; a position given twice is geminal.
    end_group : the chain class.

    Raises
    ------
    NamingError : a position lies outside the chain, or a carbon carries more than two methyls.

    >>> Chain(25, (15, 21)).methyls
    (5, 11)
    >>> str(Chain(25, (5, 11)).formula), Chain(25, (5, 11)).carbons
    ('C27H56', 27)
    """

    backbone: int
    methyls: tuple[int, ...] = ()
    end_group: EndGroup = field(default=ALKANE, compare=True)

    def __post_init__(self) -> None:
        methyls = canonical_methyls(self.backbone, self.methyls, self.end_group)
        object.__setattr__(self, "methyls", methyls)

    @property
    def carbons(self) -> int:
        """Carbons of the skeleton: backbone and methyl branches, without those the end group adds."""
        return self.backbone + len(self.methyls)

    @property
    def formula(self) -> Formula:
        """Elemental composition of the neutral molecule."""
        return Formula(self.carbons, 2 * self.carbons + 2) + self.end_group.added

    @property
    def is_branched(self) -> bool:
        """True when the chain carries at least one methyl branch."""
        return bool(self.methyls)


def canonical_methyls(backbone: int, methyls: Iterable[int], end_group: EndGroup = ALKANE) -> tuple[int, ...]:
    """Sort and check methyl positions, and take the lower of both numberings where the chain allows both.

    Positions 1 and ``backbone`` would lengthen the chain, so they are refused.

    >>> canonical_methyls(20, [18, 15, 11, 7, 3])
    (3, 6, 10, 14, 18)
    """
    positions = tuple(sorted(int(p) for p in methyls))
    if backbone < 1:
        raise NamingError(f"a backbone of {backbone} carbons", remedy="give at least 1 carbon")
    for position, count in Counter(positions).items():
        if not end_group.first_free <= position < backbone:
            raise NamingError(
                f"no methyl can sit on position {position} of a {backbone}-carbon {end_group.name} chain",
                remedy=f"use positions {end_group.first_free} to {backbone - 1}",
            )
        if count > _METHYLS_PER_CARBON:
            raise NamingError(
                f"{count} methyls on position {position}", remedy="a chain carbon carries at most two"
            )
    if not end_group.symmetric:
        return positions
    return min(positions, tuple(sorted(backbone + 1 - p for p in positions)))
