"""How far an observed ion may lie from its prediction: heavy-tailed, multiplicative, with a floor.

The log of an abundance errs by Student's t with 4 degrees of freedom, whose distribution function has a
closed form, so that an unseen peak can be charged for the chance of falling below the threshold. Noise of
half the threshold is added to every expected abundance. The tails are so heavy, and no single ion can cost
more than the floor, that one bad peak does not flip a verdict.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cache
from math import log, sqrt
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from branchpos.reference_data import load_reference

FloatArray = NDArray[np.float64]

DEGREES_OF_FREEDOM = 4
SEEN_FLOOR = -12.0
"""Lowest log likelihood of one seen ion (judgement: a hundredfold error at the usual scale)."""
OMISSION_FALL = 0.5
"""Power of (threshold / expectation) by which the chance falls that a peak list leaves out a peak."""
NOISE_OF_THRESHOLD = 0.5
"""Additive noise as a share of the detection threshold."""
SHIFTED_SHARE = 0.7
"""Chance that an intensity which its file casts doubt on is a tenth of the truth (judgement)."""
TEN = log(10.0)

_LOG_DENSITY_AT_ZERO = log(3 / 8)


@dataclass(frozen=True, slots=True)
class ErrorModel:
    """Scales of the errors and of what differs from instrument to instrument.

    Attributes
    ----------
    scales : scale of the log error by ion kind: fragment, rearranged, molecular, shared by all isomers.
    tilt_sd : spread of the mass discrimination, natural log for each 10 carbons.
    contrast_sd : spread of the weight of branch-steered ions against the rest, natural log.
    doublet_sd : spread of the even/odd ratio of branch-steered ions, natural log.
    """

    scales: tuple[float, float, float, float]
    tilt_sd: float
    contrast_sd: float
    doublet_sd: float

    def widened(self, factor: float) -> ErrorModel:
        """Return the model with every error scale multiplied."""
        first, second, third, fourth = self.scales
        return replace(self, scales=(first * factor, second * factor, third * factor, fourth * factor))

    @property
    def side_scale(self) -> float:
        """Scale of the ions that all isomers share."""
        return self.scales[3]

    @property
    def effect_sds(self) -> FloatArray:
        """Spread of tilt, contrast and doublet level, shape (3,)."""
        return np.array([self.tilt_sd, self.contrast_sd, self.doublet_sd])


@dataclass(frozen=True, slots=True)
class Quality:
    """How well a spectrum was recorded, a thing to be inferred like any other.

    Attributes
    ----------
    prior : probability before the spectrum is seen (judgement).
    widening : factor on the error scales.
    omission : least chance that the peak list leaves out a peak whatever its height.
    """

    prior: float
    widening: float
    omission: float


SOUND = Quality(0.9, 1.0, 0.0)
POOR = Quality(0.1, 2.0, 0.15)
"""Peaks out of line or missing, for every hypothesis alike; ``SOUND`` is the usual case."""

STARTING_ERRORS = ErrorModel((0.30, 0.35, 0.8, 0.5), 0.3, 0.4, 0.25)
"""Error scales before any fit (judgement)."""


@cache
def fitted_errors(name: str = "alkane_yields.json") -> ErrorModel:
    """Read the shipped error model (``ReferenceDataError`` where it is missing)."""
    return errors_from_record(load_reference(name)["errors"])


def errors_from_record(record: Mapping[str, object]) -> ErrorModel:
    """Turn a JSON record, as ``errors_to_record`` makes it, into an error model."""
    numbers = {key: float(str(value)) for key, value in record.items()}
    return ErrorModel(
        (numbers["fragment"], numbers["rearranged"], numbers["molecular"], numbers["shared"]),
        numbers["tilt"],
        numbers["contrast"],
        numbers["doublet"],
    )


def errors_to_record(errors: ErrorModel) -> Mapping[str, float]:
    """Return the error model as a JSON-ready record, natural-log units."""
    names = ("fragment", "rearranged", "molecular", "shared", "tilt", "contrast", "doublet")
    values = (*errors.scales, errors.tilt_sd, errors.contrast_sd, errors.doublet_sd)
    return MappingProxyType(dict(zip(names, (round(v, 4) for v in values), strict=True)))


def log_density(z: FloatArray) -> FloatArray:
    """Return the log density of Student's t with 4 degrees of freedom.

    >>> log_density(np.zeros(1)).round(4).tolist()
    [-0.9808]
    """
    return np.asarray(_LOG_DENSITY_AT_ZERO - 2.5 * np.log1p(0.25 * z * z))


def log_below(z: FloatArray) -> FloatArray:
    """Return the log probability of falling below z, in closed form for 4 degrees of freedom.

    >>> np.exp(log_below(np.zeros(1))).round(4).tolist()
    [0.5]
    """
    u = z / np.sqrt(1 + 0.25 * z * z)
    return np.asarray(np.log(np.maximum(0.5 + 0.375 * u * (1 - u * u / 12), 1e-12)))


def robust_weight(z: FloatArray) -> FloatArray:
    """Return the weight that iteratively reweighted least squares gives a standardised residual."""
    return np.asarray((DEGREES_OF_FREEDOM + 1) / (DEGREES_OF_FREEDOM + z * z))


T_SCALE_TO_SD = sqrt(DEGREES_OF_FREEDOM / (DEGREES_OF_FREEDOM - 2))
"""Standard deviation of Student's t in units of its scale."""
