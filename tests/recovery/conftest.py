"""Invented spectra of alkanes whose structure is known, with the faults that real ones have."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from branchpos.chain import Chain
from branchpos.ion_series import IonKind
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.scoring.error_model import DEGREES_OF_FREEDOM
from branchpos.spectrum import Spectrum
from branchpos.workflow.model import Model, shipped_model

Simulate = Callable[[Chain, np.random.Generator], Spectrum]

_FIRST_MASS = 40
_TILT_SD = 0.5
_DETECTION = (-3.0, -2.0)
"""Decimal logarithms of the lowest and highest detection threshold drawn."""


def draw_chain(methyls: int, rng: np.random.Generator) -> Chain:
    """Draw an alkane of 20 to 36 carbons with methyls on different carbons."""
    backbone = int(rng.integers(20, 37)) - methyls
    return Chain(backbone, tuple(rng.choice(np.arange(2, backbone), methyls, replace=False).tolist()))


def simulated(chain: Chain, rng: np.random.Generator, model: Model) -> Spectrum:
    """Return a spectrum drawn from the model: its own parameters, errors, instrument, threshold.

    Parameters come from their covariance, the log error of each ion from Student's t, tilt, contrast and
    doublet level from the spreads between instruments; every second spectrum keeps nothing near the
    molecular ion.
    """
    values = rng.multivariate_normal(model.yields.values, model.yields.covariance, method="cholesky")
    rows = np.array([chain.methyls], dtype=np.int16).reshape(1, -1)
    batch = predict_alkanes(replace(model.yields, values=values), chain.backbone, rows)
    tilt, contrast, doublet = rng.normal(0.0, [_TILT_SD, *model.errors.effect_sds[1:]])
    gain = np.exp(contrast + doublet * (batch.kinds == IonKind.REARRANGED))
    spread = np.array(model.errors.scales)[batch.kinds] * rng.standard_t(
        DEGREES_OF_FREEDOM, batch.masses.size
    )
    ions = batch.abundance[0] * (1 + batch.steered[0] * (gain - 1)) * np.exp(spread)
    side = batch.side_abundance * np.exp(0.5 * rng.standard_t(DEGREES_OF_FREEDOM, batch.side_masses.size))
    masses = np.concatenate([batch.masses, batch.side_masses])
    heights = np.concatenate([ions, side]) * np.exp(tilt * (masses / 14 - 10) / 10)
    threshold = 10 ** rng.uniform(*_DETECTION)
    heights = heights / heights.max() + np.abs(rng.normal(0.0, 0.3 * threshold, masses.size))
    last = 14 * chain.carbons - 20 if rng.random() < 0.5 else 14 * chain.carbons + 10
    kept = (heights >= threshold) & (masses >= _FIRST_MASS) & (masses < last)
    return Spectrum.from_peaks(masses[kept], heights[kept], threshold=threshold, first_mass=_FIRST_MASS)


@pytest.fixture(scope="session")
def simulate() -> Simulate:
    model = shipped_model()
    return lambda chain, rng: simulated(chain, rng, model)


@pytest.fixture(scope="session")
def planted(simulate: Simulate) -> dict[int, list[tuple[Chain, Spectrum]]]:
    """Return, by number of methyls, chains with a spectrum each."""
    rng = np.random.default_rng(20261201)
    found: dict[int, list[tuple[Chain, Spectrum]]] = {}
    for methyls in range(1, 5):
        chains = [draw_chain(methyls, rng) for _ in range(16)]
        found[methyls] = [(chain, simulate(chain, rng)) for chain in chains]
    return found
