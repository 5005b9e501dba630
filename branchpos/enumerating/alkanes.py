"""Every methyl-branched chain once: as a stream, as an array, and as a number.

A structure is a multiset of positions from ``first_free`` to ``backbone - 1``, each taken at most twice
(geminal). Where the chain can be numbered from either end, the numbering with the lower locants stands for
both.
"""

from __future__ import annotations

from collections.abc import Iterator
from itertools import combinations_with_replacement
from math import comb

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.end_group import ALKANE, EndGroup


def enumerate_chains(carbons: int, methyls: int, end_group: EndGroup = ALKANE) -> Iterator[Chain]:
    """Stream every chain of a class once, in rising order of positions, in constant memory.

    Parameters
    ----------
    carbons : carbons of the skeleton, branches included, without those of the end group.
    methyls : how many methyl branches.

    >>> [chain.methyls for chain in enumerate_chains(8, 2)]
    [(2, 2), (2, 3), (2, 4), (2, 5), (3, 3), (3, 4)]
    """
    backbone = carbons - methyls
    if backbone < 1:
        return
    for row in combinations_with_replacement(range(end_group.first_free, backbone), methyls):
        thrice = any(a == c for a, c in zip(row, row[2:], strict=False))
        mirror = tuple(backbone + 1 - p for p in reversed(row))
        if not thrice and (not end_group.symmetric or row <= mirror):
            yield Chain(backbone, row, end_group)


def enumerate_alkanes(carbons: int, methyls: int) -> Iterator[Chain]:
    """Stream every alkane of so many carbons and methyl branches once.

    >>> [sum(1 for _ in enumerate_alkanes(8, k)) for k in range(5)]
    [1, 3, 6, 4, 1]
    """
    return enumerate_chains(carbons, methyls)


def chain_positions(backbone: int, methyls: int, end_group: EndGroup = ALKANE) -> NDArray[np.int16]:
    """Return the positions of every chain of a class, one structure a row.

    Rows grow by one methyl at a time; a row never gets a position beyond the mirror image of its first, since
    its mirror image would then be the lower one. Only rows whose ends mirror each other need a look at the
    inside.

    Returns
    -------
    array of shape (structures, methyls), rows and the order of rows rising.

    >>> chain_positions(6, 2).tolist()
    [[2, 2], [2, 3], [2, 4], [2, 5], [3, 3], [3, 4]]
    """
    if backbone < 1:
        return np.empty((0, methyls), dtype=np.int16)
    rows = np.empty((1, 0), dtype=np.int16)
    for _ in range(methyls):
        rows = _with_one_more(rows, backbone, end_group)
    return _lower_numbering(rows, backbone) if end_group.symmetric else rows


def alkane_positions(backbone: int, methyls: int) -> NDArray[np.int16]:
    """Return the positions of every alkane; see ``chain_positions``.

    >>> alkane_positions(7, 1).tolist()
    [[2], [3], [4]]
    """
    return chain_positions(backbone, methyls)


def _with_one_more(rows: NDArray[np.int16], backbone: int, end_group: EndGroup) -> NDArray[np.int16]:
    """Append to each row every position that may follow; shape (S, k) to (S', k + 1)."""
    count, placed = rows.shape
    lowest = rows[:, -1].astype(np.intp) if placed else np.full(count, end_group.first_free, dtype=np.intp)
    if placed > 1:
        lowest += rows[:, -1] == rows[:, -2]
    highest = np.full(count, backbone - 1, dtype=np.intp)
    if end_group.symmetric:
        highest = backbone + 1 - rows[:, 0].astype(np.intp) if placed else np.full(count, (backbone + 1) // 2)
    choices = np.maximum(highest - lowest + 1, 0)
    parent = np.repeat(np.arange(count), choices)
    step = np.arange(choices.sum()) - np.repeat(np.cumsum(choices) - choices, choices)
    grown = np.empty((len(parent), placed + 1), dtype=np.int16)
    grown[:, :placed] = rows[parent]
    grown[:, placed] = lowest[parent] + step
    return grown


def _lower_numbering(rows: NDArray[np.int16], backbone: int) -> NDArray[np.int16]:
    """Keep the rows that do not come after their mirror image."""
    keep = np.ones(len(rows), dtype=np.bool_)
    undecided = np.arange(len(rows))
    for column in range((rows.shape[1] + 1) // 2):
        here = rows[undecided, column]
        mirrored = backbone + 1 - rows[undecided, -1 - column]
        keep[undecided[here > mirrored]] = False
        undecided = undecided[here == mirrored]
    return rows[keep]


def count_chains(carbons: int, methyls: int, end_group: EndGroup = ALKANE) -> int:
    """Return how many structures ``enumerate_chains`` yields, without enumerating them.

    Choosing each of m positions at most twice is the coefficient of x^k in (1 + x + x^2)^m. Mirror images are
    merged by Burnside's lemma: half the sum of all choices and of those that are their own mirror image,
    (1 + x^2 + x^4)^(m // 2) times (1 + x + x^2) for a middle position.

    >>> count_chains(27, 2), count_chains(40, 4)
    (144, 32521)
    """
    backbone = carbons - methyls
    if backbone < 1:
        return 0
    places = max(backbone - end_group.first_free, 0)
    everything = _at_most_twice(places, methyls)
    if not end_group.symmetric:
        return everything
    pairs, middle = divmod(places, 2)
    symmetric = sum(
        _at_most_twice(pairs, (methyls - centre) // 2)
        for centre in range(2 * middle + 1)
        if centre <= methyls and (methyls - centre) % 2 == 0
    )
    return (everything + symmetric) // 2


def _at_most_twice(places: int, chosen: int) -> int:
    """Return the coefficient of x^chosen in (1 + x + x^2)^places."""
    return sum(
        comb(places, twice) * comb(places - twice, chosen - 2 * twice)
        for twice in range(min(places, chosen // 2) + 1)
    )


def count_alkanes(carbons: int, methyls: int) -> int:
    """Return how many alkanes ``enumerate_alkanes`` yields.

    >>> [count_alkanes(8, k) for k in range(5)]
    [1, 3, 6, 4, 1]
    """
    return count_chains(carbons, methyls)
