"""Isoprenoid alkanes with more methyls than the general enumeration reaches.

Working definition: the methyls follow one another at gaps of 4 (isoprene units joined head to tail), except
for at most one gap of 5 (tail to tail, as in squalane) or 3 (head to head, as in biphytane); the first methyl
sits on position 2 to 5 counted from its own end, and so does the last, which covers members that have lost
carbons at an end.
"""

from __future__ import annotations

from collections.abc import Iterator
from itertools import accumulate, product

from branchpos.chain import Chain

FEWEST_METHYLS, MOST_METHYLS = 5, 8
"""Up to four methyls are enumerated in full; eight are the carotenoid and biphytane skeletons (C40)."""

_REGULAR = 4
_IRREGULAR = (5, 3)
_END_POSITIONS = range(2, 6)


def regular_isoprenoids(carbons: int) -> list[Chain]:
    """Return the isoprenoid alkanes of so many carbons with 5 to 8 methyls, each once, in rising order.

    >>> Chain(20, (2, 6, 10, 14, 18)) in regular_isoprenoids(25)
    True
    >>> Chain(24, (2, 6, 10, 15, 19, 23)) in regular_isoprenoids(30)
    True
    """
    counts = range(FEWEST_METHYLS, MOST_METHYLS + 1)
    found = {chain for methyls in counts for chain in _members(carbons - methyls, methyls)}
    return sorted(found, key=lambda chain: (len(chain.methyls), chain.methyls))


def _members(backbone: int, methyls: int) -> Iterator[Chain]:
    """Yield every chain of the family with this backbone and number of methyls; mirror images come twice."""
    for first, last, gaps in product(_END_POSITIONS, _END_POSITIONS, _gap_patterns(methyls - 1)):
        if first + sum(gaps) + last - 1 == backbone:
            yield Chain(backbone, tuple(accumulate(gaps, initial=first)))


def _gap_patterns(gaps: int) -> Iterator[tuple[int, ...]]:
    """Yield the regular gaps and those with one irregular join."""
    regular = (_REGULAR,) * gaps
    yield regular
    for place, gap in product(range(gaps), _IRREGULAR):
        yield (*regular[:place], gap, *regular[place + 1 :])
