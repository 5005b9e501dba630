"""An invented hydrocarbon fraction, drawn from the program's own model: to show it, never to judge it.

The scenario: surface wax of a beetle that does not exist. Yields are drawn once from their covariance and
kept for the whole fraction, as one instrument would; every ion errs as the fitted error scales say.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.ion_series import SeriesBatch
from branchpos.naming import parse_shorthand, systematic_name
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.alkenes import predict_alkene
from branchpos.predicting.parameters import YieldParameters
from branchpos.predicting.retention import retention_index_of
from branchpos.scoring.error_model import DEGREES_OF_FREEDOM, ErrorModel
from branchpos.scoring.likelihood import TILT_PIVOT
from branchpos.workflow.model import Model

FloatArray = NDArray[np.float64]

INVENTED = "invented data"
ORIGIN = "surface wax of a beetle that does not exist"
SEED = 20260412
FIRST_MASS, LAST_MASS = 40, 500
INDEX_SD = 1.0
"""Standard deviation [units] of the invented measurement of an index."""
_THRESHOLD = 0.005
"""Ions below this share of the base peak are left out of the files."""
_TILT_SD = 0.3
"""Spread of the mass discrimination of one invented instrument, natural log for each 10 carbons."""
_CARBON_13 = 0.0108
_CHAINS = (
    "2,6,10,14-tetraMeC16", "n-C23", "n-C25", "3-MeC25", "2-MeC26", "n-C27", "13-MeC27", "5,15-diMeC27",
    "7,11,15-triMeC27", "n-C29", "n-C31",
)  # fmt: skip
_ALKENE_CARBONS, _ALKENE_INDEX = 25, 2476.0
"""A pentacosene, some 25 units before its alkane on methyl silicone (common practice)."""
_CONTAMINANT = "a phthalate ester, as plasticisers shed"
_CONTAMINANT_INDEX = 2550.0
_CONTAMINANT_PEAKS = {
    41: 90, 43: 120, 55: 110, 57: 310, 70: 150, 71: 220, 76: 40, 83: 80, 104: 60, 112: 90, 113: 110,
    132: 25, 149: 1000, 150: 100, 167: 330, 168: 30, 279: 95, 280: 17,
}  # fmt: skip
"""Made up around m/z 149, 167 and 279, which such esters show (common practice)."""


@dataclass(frozen=True, slots=True)
class InventedPeak:
    """One peak of the invented fraction.

    Attributes
    ----------
    number : from 1, in the order of elution.
    truth : what it was made from.
    index : invented retention index [units].
    peaks : m/z and intensity, base peak 1000.
    """

    number: int
    truth: str
    index: float
    peaks: tuple[tuple[int, float], ...]

    @property
    def title(self) -> str:
        """Title of the spectrum."""
        return f"peak {self.number:02d} ({INVENTED})"

    def file_text(self) -> str:
        """Return the spectrum as text with ``key: value`` lines above m/z-intensity pairs."""
        lines = [
            f"Name: {self.title}",
            f"Remark: {INVENTED}: {ORIGIN}; drawn from the model of branchpos, no evidence of its accuracy",
            "Ionization: EI",
            f"Mass range: {FIRST_MASS}-{LAST_MASS}",
            f"Retention index: {self.index:.1f}",
            f"Num peaks: {len(self.peaks)}",
            *(f"{mz} {intensity:.1f}" for mz, intensity in self.peaks),
        ]
        return "\n".join(lines) + "\n"


def invent_fraction(model: Model, seed: int = SEED) -> list[InventedPeak]:
    """Invent the fraction, in the order of elution; the same for the same seed and model."""
    chance = np.random.default_rng(seed)
    found = sorted(_unordered(model, chance), key=lambda peak: peak.index)
    return [replace(peak, number=number) for number, peak in enumerate(found, start=1)]


def _unordered(model: Model, chance: np.random.Generator) -> Iterator[InventedPeak]:
    yields = replace(model.yields, values=_drawn_values(model.yields, chance))
    tilt = float(chance.normal(0, _TILT_SD))
    for name in _CHAINS:
        chain = parse_shorthand(name)
        batch = predict_alkanes(yields, chain.backbone, np.array([chain.methyls], dtype=np.int16))
        index = _drawn_index(chain, model, chance)
        yield InventedPeak(0, systematic_name(chain), index, _spectrum(batch, model.errors, tilt, chance))
    alkene = _spectrum(predict_alkene(_ALKENE_CARBONS), model.errors, tilt, chance)
    yield InventedPeak(0, f"an alkene of {_ALKENE_CARBONS} carbons", _ALKENE_INDEX, alkene)
    stray = tuple(
        (mz, round(height * float(np.exp(chance.normal(0, 0.1))), 1))
        for mz, height in _CONTAMINANT_PEAKS.items()
    )
    yield InventedPeak(0, _CONTAMINANT, _CONTAMINANT_INDEX, stray)


def _drawn_values(yields: YieldParameters, chance: np.random.Generator) -> FloatArray:
    """Draw parameters from their covariance; eigenvalues that rounding made negative count as none."""
    variances, directions = np.linalg.eigh(yields.covariance)
    spread = np.sqrt(np.maximum(variances, 0.0)) * chance.standard_normal(variances.size)
    return np.asarray(yields.values + directions @ spread)


def _drawn_index(chain: Chain, model: Model, chance: np.random.Generator) -> float:
    predicted = retention_index_of(chain, model.retention)
    return float(chance.normal(predicted.value, predicted.sd) + chance.normal(0, INDEX_SD))


def _spectrum(
    batch: SeriesBatch, errors: ErrorModel, tilt: float, chance: np.random.Generator
) -> tuple[tuple[int, float], ...]:
    """Draw one spectrum: ions with their errors, tilted, carbon-13 added, cut at the threshold."""
    scales = np.array(errors.scales)[batch.kinds]
    masses = np.concatenate([batch.masses, batch.side_masses])
    means = np.concatenate([batch.abundance[0].astype(float), batch.side_abundance])
    scales = np.concatenate([scales, np.full(batch.side_masses.size, errors.side_scale)])
    sizes = masses / 14
    logs = tilt * (sizes - TILT_PIVOT) / TILT_PIVOT + scales * chance.standard_t(
        DEGREES_OF_FREEDOM, masses.size
    )
    heights = np.zeros(int(masses.max()) + 2)
    heights[masses] = means * np.exp(logs)
    heights[1:] += _CARBON_13 * (np.arange(heights.size - 1) / 14) * heights[:-1]
    heights[:FIRST_MASS] = 0.0
    relative = heights / heights.max()
    kept = np.flatnonzero(relative >= _THRESHOLD)
    return tuple((int(mass), round(1000 * float(relative[mass]), 1)) for mass in kept)
