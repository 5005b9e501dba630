"""Likelihood of a measured retention index under predicted ones."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from branchpos.retention_index import RetentionIndex

FloatArray = NDArray[np.float64]

_WRONG_SHARE = 0.02
"""Chance that an index is misread or belongs to another peak (judgement)."""
_WRONG_SPREAD = 30.0
"""Scale [units] of the Cauchy distribution of a wrong index about the right one (judgement): a neighbouring
peak is likelier than one from another part of the run."""


def retention_z(measured: RetentionIndex, mean: FloatArray, sd: FloatArray) -> FloatArray:
    """Return measured minus predicted in joint standard deviations, shape of ``mean``."""
    return np.asarray((measured.value - mean) / np.hypot(sd, measured.sd))


def retention_log_likelihood(measured: RetentionIndex, mean: FloatArray, sd: FloatArray) -> FloatArray:
    """Return the log likelihood of the measured index [per unit], shape of ``mean``.

    Parameters
    ----------
    measured : the index with its standard deviation.
    mean, sd : predicted index and its standard deviation [units], any shape.
    """
    z = retention_z(measured, mean, sd)
    right = np.exp(-0.5 * z * z) / (np.hypot(sd, measured.sd) * np.sqrt(2 * np.pi))
    wrong = _WRONG_SPREAD / (np.pi * (_WRONG_SPREAD**2 + (measured.value - mean) ** 2))
    return np.asarray(np.log((1 - _WRONG_SHARE) * right + _WRONG_SHARE * wrong))
