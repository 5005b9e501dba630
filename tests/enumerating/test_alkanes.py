"""Enumeration as a stream, as an array and as a number."""

from __future__ import annotations

import tracemalloc
from itertools import islice, product

import numpy as np
import pytest

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.enumerating import (
    alkane_positions,
    chain_positions,
    count_alkanes,
    count_chains,
    enumerate_alkanes,
    enumerate_chains,
)


@pytest.mark.parametrize("name", ["alkane", "acid", "methyl ketone"])
@pytest.mark.parametrize("methyls", range(7))
def test_stream_array_and_count_agree(name: str, methyls: int) -> None:
    group = END_GROUPS[name]
    for backbone in range(1, 14):
        streamed = [chain.methyls for chain in enumerate_chains(backbone + methyls, methyls, group)]
        assert list(map(tuple, chain_positions(backbone, methyls, group).tolist())) == streamed
        assert count_chains(backbone + methyls, methyls, group) == len(streamed)


@pytest.mark.parametrize("name", ["alkane", "acid"])
def test_every_choice_of_positions_is_among_them_once(name: str) -> None:
    """Against the plainest method there is: try all tuples and let ``Chain`` canonicalise them."""
    group, backbone = END_GROUPS[name], 9
    tuples = product(range(2, backbone), repeat=4)
    plain = {Chain(backbone, t, group) for t in tuples if max(map(t.count, t)) <= 2}
    assert set(enumerate_chains(backbone + 4, 4, group)) == plain
    assert count_chains(backbone + 4, 4, group) == len(plain)


@pytest.mark.parametrize(("backbone", "methyls"), [(36, 4), (37, 3), (38, 2), (39, 1), (40, 0)])
def test_arrays_are_canonical_sorted_and_complete(backbone: int, methyls: int) -> None:
    rows = alkane_positions(backbone, methyls)
    assert rows.shape == (count_alkanes(backbone + methyls, methyls), methyls)
    assert rows.dtype == np.int16
    listed = list(map(tuple, rows.tolist()))
    assert listed == sorted(set(listed))
    assert all(row <= tuple(backbone + 1 - p for p in reversed(row)) for row in listed)


def test_the_stream_does_not_hold_what_it_has_yielded() -> None:
    """Millions of structures of C60 with 6 methyls start at once and are not kept."""
    assert count_alkanes(60, 6) > 10_000_000
    stream = enumerate_alkanes(60, 6)
    tracemalloc.start()
    for _ in islice(stream, 5_000):
        pass
    used = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert used < 200_000


@pytest.mark.parametrize(("carbons", "methyls"), [(0, 0), (2, 1), (3, 3), (4, 4)])
def test_chains_too_short_for_their_methyls_are_none(carbons: int, methyls: int) -> None:
    assert list(enumerate_alkanes(carbons, methyls)) == []
    assert count_alkanes(carbons, methyls) == 0
    assert alkane_positions(carbons - methyls, methyls).shape == (0, methyls)
