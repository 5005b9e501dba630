"""A retention index carries its trust and refuses nonsense."""

from __future__ import annotations

import math

import pytest

from branchpos.errors import SettingsError
from branchpos.retention_index import RetentionIndex


@pytest.mark.parametrize("value", [0.0, -100.0, math.nan, math.inf])
def test_value_must_be_a_positive_number(value: float) -> None:
    with pytest.raises(SettingsError, match="retention index is"):
        RetentionIndex(value, sd=1.0)


@pytest.mark.parametrize("sd", [0.0, -1.0, math.nan, math.inf])
def test_sd_must_be_above_zero(sd: float) -> None:
    with pytest.raises(SettingsError, match="standard deviation"):
        RetentionIndex(2581.0, sd=sd)


@pytest.mark.parametrize("level", [0.0, 1.0, -0.5, 95.0, math.nan])
def test_interval_level_is_a_share(level: float) -> None:
    with pytest.raises(SettingsError, match="between 0 and 1"):
        RetentionIndex(2581.0, sd=1.0).interval(level)


def test_intervals_of_the_normal_distribution() -> None:
    # Quantiles of the standard normal distribution, common tables: 1.6449 and 2.5758.
    index = RetentionIndex(1000.0, sd=10.0)
    assert index.interval(0.90) == pytest.approx((1000 - 16.449, 1000 + 16.449), abs=0.01)
    assert index.interval(0.99) == pytest.approx((1000 - 25.758, 1000 + 25.758), abs=0.01)
