"""Light methylalkanes against handbook boiling points, which took no part in any fit.

Boiling points [K]: CRC Handbook of Chemistry and Physics, as held by the ``chemicals`` package. On methyl
silicone hydrocarbons elute nearly in the order of boiling points, so interpolation between n-alkanes gives an
index that is good to about 10 units (common practice; the handbook's 3-methyldecane lies 10.6 off).
"""

from __future__ import annotations

import chemicals
import numpy as np
import pytest

from branchpos.chain import Chain
from branchpos.predicting.retention import retention_index_of

ALKANES = {7: "heptane", 8: "octane", 9: "nonane", 10: "decane", 11: "undecane", 12: "dodecane"}
STEMS = {8: "octane", 9: "nonane", 10: "decane", 11: "undecane"}
SINGLE = [(b, p) for b in STEMS for p in (2, 3, 4, 5) if (b, p) not in {(8, 5), (10, 5), (11, 4), (11, 5)}]
"""Positions with a handbook boiling point; 5-methyloctane is 4-methyloctane."""


def boiling_point(name: str) -> float:
    return float(chemicals.Tb(chemicals.CAS_from_any(name), method="CRC_ORG"))


def interpolated_index(kelvin: float) -> float:
    return float(100 * np.interp(kelvin, [boiling_point(name) for name in ALKANES.values()], list(ALKANES)))


@pytest.mark.parametrize(("backbone", "position"), SINGLE)
def test_predictions_lie_near_interpolated_boiling_points(backbone: int, position: int) -> None:
    handbook = interpolated_index(boiling_point(f"{position}-methyl{STEMS[backbone]}"))
    assert retention_index_of(Chain(backbone, (position,))).value == pytest.approx(handbook, abs=11)


@pytest.mark.parametrize("backbone", [8, 9, 10, 11])
def test_predictions_rank_as_boiling_points_do(backbone: int) -> None:
    measured = [p for b, p in SINGLE if b == backbone]
    handbook = sorted(measured, key=lambda p: boiling_point(f"{p}-methyl{STEMS[backbone]}"))
    predicted = sorted(measured, key=lambda p: retention_index_of(Chain(backbone, (p,))).value)
    assert predicted == handbook


@pytest.mark.parametrize("positions", [(2, 2), (2, 3), (2, 4), (2, 5), (2, 6), (2, 7), (3, 4), (3, 6)])
def test_intervals_for_unfitted_neighbours_hold_the_handbook(positions: tuple[int, int]) -> None:
    name = f"{positions[0]},{positions[1]}-dimethyloctane"
    low, high = retention_index_of(Chain(8, positions)).interval(0.95)
    handbook = interpolated_index(boiling_point(name))
    assert low - 10 < handbook < high + 10
