"""The distribution of errors, against scipy's."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import t as student

from branchpos.scoring.error_model import (
    DEGREES_OF_FREEDOM,
    POOR,
    SOUND,
    T_SCALE_TO_SD,
    errors_from_record,
    errors_to_record,
    fitted_errors,
    log_below,
    log_density,
    robust_weight,
)

Z = np.concatenate([-np.logspace(2, -3, 60), [0.0], np.logspace(-3, 2, 60)])


def test_density_is_students_t() -> None:
    np.testing.assert_allclose(log_density(Z), student(DEGREES_OF_FREEDOM).logpdf(Z), rtol=1e-12, atol=1e-12)


def test_distribution_function_is_students_t() -> None:
    """Down to 1e-7; below, the closed form loses digits, where an unseen ion costs too much anyway."""
    above = Z > -50
    expected = student(DEGREES_OF_FREEDOM).logcdf(Z[above])
    np.testing.assert_allclose(log_below(Z[above]), expected, rtol=1e-6, atol=1e-9)
    assert np.isfinite(log_below(np.array([-1e6, -1e12, 1e12]))).all()


@given(st.floats(-30, 30), st.floats(0.001, 5))
def test_falling_below_grows_likelier_upwards(z: float, step: float) -> None:
    low, high = log_below(np.array([z, z + step]))
    assert low <= high <= 1e-12


def test_the_spread_is_that_of_students_t() -> None:
    assert pytest.approx(student(DEGREES_OF_FREEDOM).std()) == T_SCALE_TO_SD


def test_robust_weight_is_the_slope_of_the_density_over_z() -> None:
    """Iteratively reweighted least squares: w(z) = -(d log p/dz)/z; the derivative taken numerically."""
    z, step = np.array([0.3, 1.0, 4.0, 20.0]), 1e-5
    slope = (log_density(z + step) - log_density(z - step)) / (2 * step)
    np.testing.assert_allclose(robust_weight(z), -slope / z, rtol=1e-5)


def test_widening_multiplies_every_scale_and_nothing_else() -> None:
    errors = fitted_errors()
    wide = errors.widened(2.0)
    np.testing.assert_allclose(np.array(wide.scales), 2 * np.array(errors.scales))
    assert np.array_equal(wide.effect_sds, errors.effect_sds)


def test_errors_survive_a_round_trip() -> None:
    errors = fitted_errors()
    assert errors_to_record(errors_from_record(errors_to_record(errors))) == errors_to_record(errors)


def test_the_two_qualities_are_exhaustive() -> None:
    assert SOUND.prior + POOR.prior == pytest.approx(1.0)
    assert POOR.widening > SOUND.widening
