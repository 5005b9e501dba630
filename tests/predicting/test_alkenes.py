"""The alkene rival: recognised, never placed."""

from __future__ import annotations

import numpy as np
import pytest

from branchpos.ion_series import IonKind
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.alkenes import predict_alkene
from branchpos.predicting.parameters import fitted_parameters


@pytest.mark.parametrize("carbons", [10, 20, 35, 60])
def test_the_series_is_two_hydrogens_below_the_alkyl_one(carbons: int) -> None:
    """41, 55, 69, 83, 97 ... are CnH2n-1 (common practice); the molecular ion is CnH2n."""
    batch = predict_alkene(carbons)
    level = dict(zip(batch.masses.tolist(), batch.abundance[0].tolist(), strict=True))
    assert {55, 69, 83, 97} <= set(level)
    assert level[83] > level[85] and level[97] > level[99] and level[111] > level[113]
    assert batch.masses[batch.kinds == IonKind.MOLECULAR].tolist() == [14 * carbons]


@pytest.mark.parametrize("carbons", [10, 20, 35])
def test_abundances_are_shares(carbons: int) -> None:
    batch = predict_alkene(carbons)
    assert batch.abundance.sum() == pytest.approx(1.0, rel=1e-5)
    assert (batch.abundance > 0).all()
    assert len(set(batch.masses.tolist())) == batch.masses.size


def test_an_alkane_shows_the_opposite_balance() -> None:
    batch = predict_alkanes(fitted_parameters(), 20, np.empty((1, 0), dtype=np.int16))
    level = dict(zip(batch.masses.tolist(), batch.abundance[0].tolist(), strict=True))
    assert level[85] > 3 * level[84]
