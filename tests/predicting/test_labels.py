"""Cleavages in words."""

from __future__ import annotations

import pytest

from branchpos.chain import Chain
from branchpos.predicting.labels import cleavage_labels, ion_label

_EXAMPLE = Chain(25, (5, 11))


def test_the_four_secondary_ions_name_their_bonds() -> None:
    """Worked out by hand: a cut beyond C5 or before it, beyond C11 or before it."""
    labels = cleavage_labels(_EXAMPLE)
    assert labels[6] == "C5|C6, charge on C5 (secondary)"
    assert labels[23] == "C4|C5, charge on C5 (secondary)"
    assert labels[13] == "C11|C12, charge on C11 (secondary)"
    assert labels[16] == "C10|C11, charge on C11 (secondary)"


@pytest.mark.parametrize("chain", [Chain(10), Chain(11, (5,)), _EXAMPLE, Chain(12, (5, 5))])
def test_the_sizes_named_are_those_that_one_cleavage_reaches(chain: Chain) -> None:
    """Counted here bond by bond: carbons on either side, methyls with their backbone carbon."""
    left = [bond + sum(place <= bond for place in chain.methyls) for bond in range(1, chain.backbone)]
    reached = {*left, *(chain.carbons - size for size in left)}
    if chain.is_branched:
        reached.add(chain.carbons - 1)
    assert set(cleavage_labels(chain)) == reached


def test_a_geminal_carbon_is_a_tertiary_site() -> None:
    assert "tertiary" in cleavage_labels(Chain(12, (5, 5)))[7]


def test_loss_of_a_branch_is_named_with_its_carbon() -> None:
    assert "loss of the methyl on C5, C11" in cleavage_labels(_EXAMPLE)[26]
    assert "methyl on" not in cleavage_labels(Chain(27, ()))[26]


def test_doublets_and_the_molecular_ion_are_told_apart() -> None:
    labels = cleavage_labels(_EXAMPLE)
    assert ion_label(_EXAMPLE, 6, 85, labels) == labels[6]
    assert ion_label(_EXAMPLE, 6, 84, labels) == f"{labels[6]}, with hydrogen transfer"
    assert ion_label(_EXAMPLE, 27, 380, labels) == "molecular ion"


def test_long_lists_are_cut_with_a_count() -> None:
    assert cleavage_labels(Chain(12, (2, 4, 9, 11)))[15].count("|") <= 3
