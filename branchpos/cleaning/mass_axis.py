"""Whole mass numbers for a spectrum whose mass axis wanders by up to a unit.

Old digitised spectra carry one decimal that cannot be trusted. Peaks keep their order, a cluster of peaks
holds consecutive mass numbers more often than not, and a chain shows its strongest peaks fourteen units
apart; the assignment that suits all three best is found by dynamic programming.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

STEADY = 0.75
"""Least length of the mean vector of mass offsets, taken as angles, for the axis to count as steady."""
_DEFECT = 6e-4
_REACH = (-1, 0, 1)
_OFFSET_SD, _GAP_SD = 0.6, 0.5
_SKIP_COST = 2.5
"""Cost of leaving out a mass number within a cluster (judgement, like the spreads above)."""
_CLUSTER_GAP = 2.2
_SERIES_GAIN = {13: 0.5, 0: 0.5, 1: 1.0, 2: 0.2}
"""Gain of standing on the alkyl series, by mass number modulo 14."""


def axis_is_steady(mz: FloatArray) -> bool:
    """Tell whether the decimals of all peaks agree once the usual mass defect is taken off.

    >>> axis_is_steady(np.array([57.1, 71.1, 85.1])), axis_is_steady(np.array([57.0, 72.4, 85.9]))
    (True, False)
    """
    if np.allclose(mz, np.round(mz)):
        return True
    angles = 2j * np.pi * mz * (1 - _DEFECT)
    return bool(np.abs(np.exp(angles).mean()) >= STEADY)


def align_masses(mz: FloatArray, relative: FloatArray) -> IntArray:
    """Return the best strictly rising mass numbers for peaks on an unsteady axis, shape (peaks,).

    Parameters
    ----------
    mz : m/z as recorded, rising, shape (peaks,).
    relative : intensities relative to the base peak.
    """
    options = np.round(mz * (1 - _DEFECT)).astype(np.intp)[:, None] + np.array(_REACH)
    costs = _own_costs(mz, relative, options)
    best, came_from = costs[0], []
    for peak in range(1, mz.size):
        through = best[:, None] + _step_costs(mz[peak] - mz[peak - 1], options[peak - 1], options[peak])
        came_from.append(through.argmin(axis=0))
        best = through.min(axis=0) + costs[peak]
    choice = [int(best.argmin())]
    for arrivals in reversed(came_from):
        choice.append(int(arrivals[choice[-1]]))
    return np.asarray(options[np.arange(mz.size), choice[::-1]])


def _own_costs(mz: FloatArray, relative: FloatArray, options: IntArray) -> FloatArray:
    offsets = mz[:, None] * (1 - _DEFECT) - options
    gain = np.array([_SERIES_GAIN.get(residue, 0.0) for residue in range(14)])[options % 14]
    return np.asarray(offsets**2 / (2 * _OFFSET_SD**2) - gain * (1 + 2 * np.sqrt(relative))[:, None])


def _step_costs(gap: float, before: IntArray, after: IntArray) -> FloatArray:
    """Return the cost of each pair of assignments of two neighbouring peaks, infinite unless they rise."""
    steps = after[None, :] - before[:, None]
    if gap < _CLUSTER_GAP:
        return np.where(steps < 1, np.inf, _SKIP_COST * (steps - 1.0))
    return np.where(steps < 1, np.inf, (steps - gap) ** 2 / (2 * _GAP_SD**2))
