"""Isomers: each once, and what would tell the closest apart."""

from __future__ import annotations

from itertools import islice
from time import perf_counter

import pytest

from branchpos.enumerating import count_alkanes
from branchpos.errors import SettingsError
from branchpos.workflow.isomers import MOST_COMPARED, count_isomers, list_isomers


def test_each_structure_comes_once() -> None:
    chains = [one.chain for one in list_isomers(16, range(4))]
    assert len(chains) == len(set(chains)) == sum(count_alkanes(16, methyls) for methyls in range(4))


def test_a_pair_with_the_same_sizes_is_hard_to_tell() -> None:
    # 5,11- and 5,14-dimethylpentacosane break into ions of the same sizes and elute alike (science of the
    # trade: told apart by doublets only); 2,2-dimethylpentacosane is like no other.
    found = {one.chain.methyls: one.nearest for one in list_isomers(27, [2])}
    assert found[5, 11] is not None
    assert found[5, 11].chain.methyls == (5, 14)
    assert {ion.mz for ion in found[5, 11].ions} <= {182, 183, 224, 225}
    assert found[2, 2] is not None
    assert found[2, 2].bits > 3 * found[5, 11].bits


def test_nearest_is_another_structure_and_its_bits_add_up() -> None:
    for one in list_isomers(14, range(3)):
        assert one.nearest is not None
        assert one.nearest.chain != one.chain
        assert one.nearest.bits >= one.nearest.index_bits >= 0
        assert one.nearest.bits >= sum(ion.bits for ion in one.nearest.ions)


def test_five_thousand_structures_take_seconds() -> None:
    count = count_isomers(42, [3])
    assert 4000 < count <= MOST_COMPARED
    start = perf_counter()
    assert sum(one.nearest is not None for one in list_isomers(42, [3])) == count
    assert perf_counter() - start < 15


def test_millions_of_structures_stream() -> None:
    assert count_isomers(60, [6]) > 1_000_000
    first = list(islice(list_isomers(60, [6]), 5))
    assert all(one.nearest is None for one in first)
    assert all(one.retention_index.value > 5000 for one in first)


@pytest.mark.parametrize(
    ("carbons", "methyls", "chain_class"),
    [(3, [1], "alkane"), (20, [], "alkane"), (20, [7], "alkane"), (20, [1], "acid")],
)
def test_what_cannot_be_listed_is_refused(carbons: int, methyls: list[int], chain_class: str) -> None:
    with pytest.raises(SettingsError):
        list_isomers(carbons, methyls, chain_class)
