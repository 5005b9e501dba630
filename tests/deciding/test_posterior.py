"""Posterior probabilities."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import softmax

from branchpos.deciding.posterior import normalise
from branchpos.hypothesis import Rival

logs = st.floats(-800, 800)


@given(st.lists(st.lists(logs, min_size=1, max_size=6), min_size=1, max_size=4), logs, logs)
def test_probabilities_are_the_softmax_of_the_logs(
    batches: list[list[float]], alkene: float, nothing: float
) -> None:
    """Against scipy.special.softmax; sums to one over chains and rivals together."""
    rivals = {Rival.ALKENE: alkene, Rival.NO_CHAIN: nothing}
    found = normalise([np.array(batch) for batch in batches], rivals)
    expected = softmax([*(value for batch in batches for value in batch), alkene, nothing])
    np.testing.assert_allclose(
        [*np.concatenate(found.chains), *found.rivals.values()], expected, rtol=1e-9, atol=1e-300
    )
    assert found.none_of_these == pytest.approx(expected[-2:].sum())


def test_a_common_factor_changes_nothing() -> None:
    one = normalise([np.array([-3.0, -4.0])], {Rival.NO_CHAIN: -5.0})
    other = normalise([np.array([-3.0, -4.0]) - 1e4], {Rival.NO_CHAIN: -5.0 - 1e4})
    np.testing.assert_allclose(other.chains[0], one.chains[0], rtol=1e-9)
