"""The call and the credible set."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from branchpos.chain import Chain
from branchpos.deciding.call import NONE_OF_THESE, SURE, credible_set, decide
from branchpos.deciding.posterior import Posterior
from branchpos.hypothesis import Rival
from branchpos.verdict import Status

BRANCHED = [Chain(25, (5, place)) for place in range(6, 21)]
STRAIGHT = [Chain(carbons) for carbons in range(20, 30)]


def posterior(rest: float) -> Posterior:
    return Posterior((), {Rival.ALKENE: rest / 4, Rival.NO_CHAIN: 3 * rest / 4})


def call(chains: list[Chain], shares: list[float], level: float = 0.95):
    ranked = sorted(zip(chains, shares, strict=False), key=lambda one: -one[1])
    return decide(ranked, posterior(1 - sum(shares)), level)


@pytest.mark.parametrize(
    ("chains", "shares", "status"),
    [
        (BRANCHED, [0.93, 0.05, 0.01], Status.ASSIGNED),
        (BRANCHED, [SURE, 0.1], Status.ASSIGNED),
        (BRANCHED, [0.89, 0.1], Status.NARROWED),
        (BRANCHED, [0.4, 0.3, 0.25, 0.04], Status.NARROWED),
        (BRANCHED, [0.07] * 14, Status.OPEN),
        (BRANCHED, [0.5, 0.2], Status.OPEN),  # the rivals hold 0.3: no structure can be pinned down
        (BRANCHED, [0.3, 0.1], Status.NOT_A_CHAIN),
        (STRAIGHT, [0.95, 0.02], Status.UNBRANCHED),
        (STRAIGHT, [0.3, 0.3, 0.35], Status.UNBRANCHED),
        ([*BRANCHED[:1], *STRAIGHT], [0.5, 0.45], Status.NARROWED),
    ],
)
def test_statuses(chains: list[Chain], shares: list[float], status: Status) -> None:
    assert call(chains, shares).status is status


def test_an_assignment_is_the_name_of_the_structure() -> None:
    assert call([Chain(25, (5, 11))], [0.97]).text == "5,11-dimethylpentacosane"


def test_sizes_of_an_unbranched_chain_are_given_as_a_range_where_open() -> None:
    assert call([Chain(24), Chain(25)], [0.97, 0.02]).text == "tetracosane"
    assert call([Chain(24), Chain(25), Chain(27)], [0.4, 0.3, 0.28]).text == "n-alkane of 24 to 27 carbons"


def test_no_chain_is_called_by_its_likeliest_rival() -> None:
    assert call(BRANCHED, [0.2]).text == Rival.NO_CHAIN.value


probabilities = st.lists(st.floats(0.001, 1.0), min_size=2, max_size=len(BRANCHED) + 1)


@given(probabilities, st.floats(0.5, 0.99))
def test_the_credible_set_is_the_smallest_that_reaches_the_level(weights: list[float], level: float) -> None:
    """Checked by counting: the leading members reach the level, one fewer does not."""
    shares = [weight / sum(weights) for weight in weights]
    none, chains = shares[-1], sorted(shares[:-1], reverse=True)
    members = credible_set(list(zip(BRANCHED, chains, strict=False)), none, level)
    ordered = sorted(shares, reverse=True)
    assert sum(ordered[: len(members)]) >= level - 1e-9
    assert sum(ordered[: len(members) - 1]) < level + 1e-9
    assert len(set(members)) == len(members)


def test_none_of_these_is_a_member_where_it_is_needed() -> None:
    assert NONE_OF_THESE in call(BRANCHED, [0.5, 0.2]).credible_set
    assert NONE_OF_THESE not in call(BRANCHED, [0.9, 0.08]).credible_set
