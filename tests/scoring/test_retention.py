"""Likelihood of a retention index."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import norm

from branchpos.retention_index import RetentionIndex
from branchpos.scoring.retention import retention_log_likelihood, retention_z


def test_residuals_count_both_uncertainties() -> None:
    z = retention_z(RetentionIndex(2580.0, sd=3.0), np.array([2575.0]), np.array([4.0]))
    assert z == pytest.approx([1.0])


def test_near_the_prediction_it_is_a_normal_density() -> None:
    """Against scipy's, but for the 2 % kept for a wrong index."""
    mean = np.linspace(2576, 2584, 9)
    found = retention_log_likelihood(RetentionIndex(2580.0, sd=1.0), mean, np.full(9, 2.0))
    expected = np.log(0.98) + norm(mean, np.sqrt(5)).logpdf(2580.0)
    np.testing.assert_allclose(found, expected, atol=0.02)


def test_a_wrong_index_costs_by_how_wrong_it_is_but_never_rules_alone() -> None:
    """A neighbouring peak's index costs some 8 nats, one from another part of the run some more."""
    right, beside, elsewhere = retention_log_likelihood(
        RetentionIndex(2580.0, sd=1.0), np.array([2580.0, 2560.0, 1060.0]), np.ones(3)
    )
    assert 5 < right - beside < 10
    assert 12 < right - elsewhere < 20
    assert norm(1060.0, np.sqrt(2)).logpdf(2580.0) < -1e5  # what a normal error alone would charge
