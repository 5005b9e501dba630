"""Prior weights: how they are shared out, and what they hold to be rarer."""

from __future__ import annotations

import numpy as np
import pytest

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.enumerating import PRIORS, Prior, chain_positions, count_alkanes, regular_isoprenoids
from branchpos.enumerating.priors import group_weight


@pytest.fixture(params=sorted(PRIORS))
def prior(request: pytest.FixtureRequest) -> Prior:
    return PRIORS[request.param]


@pytest.mark.parametrize("name", ["alkane", "acid", "methyl ketone"])
@pytest.mark.parametrize("methyls", range(7))
def test_each_number_of_methyls_has_half_the_weight_of_one_fewer(
    prior: Prior, name: str, methyls: int
) -> None:
    """Enumerated weights sum to 2^-(k+1), though they were normalised without enumeration."""
    for backbone in range(3, 13):
        rows = chain_positions(backbone, methyls, END_GROUPS[name])
        if len(rows):
            total = np.exp(prior.log_prior(rows, backbone, END_GROUPS[name])).sum()
            assert total == pytest.approx(0.5 ** (methyls + 1), rel=1e-12)


def test_flat_shares_equally() -> None:
    assert group_weight(PRIORS["flat"], 30, 5) == count_alkanes(35, 5)
    rows = chain_positions(20, 3)
    assert np.ptp(PRIORS["flat"].log_prior(rows, 20)) == pytest.approx(0.0, abs=1e-12)


@pytest.mark.parametrize(
    ("rare", "common", "factor"),
    [
        ((5, 5), (5, 11), 50),  # geminal
        ((5, 6), (5, 11), 20),  # adjacent
        ((5, 12), (5, 11), 5),  # odd distance
        ((5, 7), (5, 11), 1),  # propionate units in a row
        ((5, 10), (5, 11), 1),  # tail-to-tail isoprenoid gap
        ((3, 7), (5, 11), 1),  # head-to-tail isoprenoid gap
    ],
)
def test_biogenic_factors(rare: tuple[int, int], common: tuple[int, int], factor: float) -> None:
    biogenic = PRIORS["biogenic"]
    ratio = biogenic.log_prior_of(Chain(25, common)) - biogenic.log_prior_of(Chain(25, rare))
    assert np.exp(ratio) == pytest.approx(factor)


def test_a_prior_does_not_depend_on_the_structures_beside_it(prior: Prior) -> None:
    rows = chain_positions(25, 2)
    alone = [prior.log_prior(rows[i : i + 1], 25)[0] for i in range(0, len(rows), 17)]
    np.testing.assert_allclose(prior.log_prior(rows, 25)[::17], alone, rtol=1e-13)


def test_isoprenoids_get_their_share_of_the_whole_group() -> None:
    """A few structures listed out of millions must not inherit the weight of the millions."""
    flat, squalane = PRIORS["flat"], Chain(24, (2, 6, 10, 15, 19, 23))
    assert squalane in regular_isoprenoids(30)
    assert np.exp(flat.log_prior_of(squalane)) == pytest.approx(0.5**7 / count_alkanes(30, 6))
    assert PRIORS["biogenic"].log_prior_of(squalane) > flat.log_prior_of(squalane)


def test_both_ends_see_the_same_prior(prior: Prior) -> None:
    rows = chain_positions(18, 3)
    mirrored = np.sort(19 - rows, axis=1)
    np.testing.assert_allclose(prior.log_prior(rows, 18), prior.log_prior(mirrored, 18), rtol=1e-12)


def test_no_structures_have_no_priors(prior: Prior) -> None:
    assert prior.log_prior(chain_positions(3, 5), 3).shape == (0,)


def test_priors_say_what_they_hold() -> None:
    assert all(str(prior).startswith(f"{name}: ") for name, prior in PRIORS.items())
    assert "judgement" in str(PRIORS["biogenic"])
