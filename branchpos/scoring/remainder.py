"""What a chain class leaves unexplained, and how well no chain at all explains the spectrum.

Isomers share the ions two hydrogens below each daughter ion and the carbon-13 peaks; every other mass number
should stay empty. A peak there is charged by its height. The rival is a compound that may show a peak of any
height at any mass number.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from branchpos.ion_series import IonKind, SeriesBatch
from branchpos.mass_channels import MassChannels
from branchpos.scoring.error_model import NOISE_OF_THRESHOLD, ErrorModel, log_below, log_density
from branchpos.scoring.likelihood import TILT_PIVOT

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

_SMALL = 0.005
"""Relative height up to which a stray peak is noise and says nothing on how heavy it may get (judgement, as
the next five)."""
_LARGEST_NOISE = 0.01
_LARGEST_IMPURITY_SHARE = 0.08
_IMPURITY_FALL = 2.0
_IMPURITY_FLOOR = -16.0
_ISOTOPE_MARGIN = 1.5
_SIDE_FLOOR = -6.5
_CARBON_13 = 0.0108
WHOLE = 0
"""Stands among the mass numbers for the unexplained share of the whole ion current."""
_UNEXPLAINED_MEAN = 0.025
"""Usual share of the ion current that a chain leaves unexplained: no known alkane leaves more than 0.152
(measured on the records that the fits rest on)."""
_ALKYL_PART = {
    39: 0.1, 41: 0.45, 42: 0.12, 43: 0.9, 53: 0.03, 54: 0.04, 55: 0.6, 56: 0.25, 57: 1.0, 67: 0.06, 68: 0.05,
    69: 0.35, 70: 0.2, 71: 0.55, 81: 0.05, 82: 0.05, 83: 0.25, 84: 0.15, 85: 0.35, 95: 0.04, 96: 0.04,
    97: 0.2, 98: 0.1, 99: 0.1, 109: 0.02, 110: 0.02, 111: 0.08, 112: 0.05, 113: 0.08,
}  # fmt: skip
"""Low ions of an alkyl part, midway between alkanes and 1-alkenes of the records that the fits rest on."""
_ALKYL_SCALE = 0.8


@dataclass(frozen=True, slots=True, eq=False)
class Remainder:
    """Log likelihood of the mass numbers that a batch was not scored on.

    Attributes
    ----------
    masses : mass numbers, shape (masses,); ``WHOLE`` stands for the ion current as a whole.
    by_mass : natural log likelihood of each, same shape.
    """

    masses: IntArray
    by_mass: FloatArray

    @property
    def total(self) -> float:
        """Summed log likelihood."""
        return float(self.by_mass.sum())


def score_remainder(
    channels: MassChannels, batch: SeriesBatch, effects: FloatArray, heaviest: int, errors: ErrorModel
) -> Remainder:
    """Score every recorded mass number up to ``heaviest`` that is not among the ions of a batch.

    Parameters
    ----------
    effects : log scale, tilt, contrast and doublet level of the best chain of the batch, shape (4,).
    heaviest : last mass number that any hypothesis of the comparison speaks of.
    """
    masses = np.setdiff1d(recorded_masses(channels, heaviest), batch.masses)
    excess = unexplained(channels, masses)
    side, places, members = np.intersect1d(masses, batch.side_masses, return_indices=True)
    empty = np.setdiff1d(np.arange(masses.size), places)
    by_mass = np.zeros(masses.size)
    by_mass[empty] = _stray(excess[empty], channels.threshold)
    if side.size:
        sizes = -(-side // 14)
        tilted = effects[0] + effects[1] * (sizes - TILT_PIVOT) / TILT_PIVOT
        expected = batch.side_abundance[members] * np.exp(tilted) + isotopes_below(channels, side)
        by_mass[places] = _side(channels, side, expected, errors.scales[IonKind.SHARED])
    whole = _unexplained_whole(channels, float(excess[empty].sum()), heaviest)
    return Remainder(np.append(masses, WHOLE), np.append(by_mass, whole))


def score_no_chain(channels: MassChannels, heaviest: int) -> Remainder:
    """Score every recorded mass number under a compound that the program has no model for.

    Where it suits the spectrum better, the compound has an alkyl part, which shows the low hydrocarbon ions
    that so many compounds share; they then speak for no chain.
    """
    masses = recorded_masses(channels, heaviest)
    anything = _anything(unexplained(channels, masses), channels.threshold)
    with_alkyl = anything.copy()
    _, places, members = np.intersect1d(masses, list(_ALKYL_PART), return_indices=True)
    if places.size:
        with_alkyl[places] = _alkyl_part(
            channels, masses[places], np.log(np.array(list(_ALKYL_PART.values()))[members])
        )
    return Remainder(masses, with_alkyl if with_alkyl.sum() > anything.sum() else anything)


def recorded_masses(channels: MassChannels, heaviest: int) -> IntArray:
    """Return the recorded, uncontaminated mass numbers from the lightest to the heaviest of interest."""
    masses = np.arange(max(channels.first, 39), int(min(channels.last, heaviest)) + 1)
    return masses[channels.at(masses).recorded]


def unexplained(channels: MassChannels, masses: IntArray) -> FloatArray:
    """Return what the peaks at these mass numbers hold beyond carbon-13 of the peak below and noise."""
    view = channels.at(masses)
    foreign = np.zeros(masses.size)
    inside = masses < channels.foreign.size
    foreign[inside] = channels.foreign[masses[inside]]
    excess = view.intensity - _ISOTOPE_MARGIN * isotopes_below(channels, masses)
    return np.where(excess >= NOISE_OF_THRESHOLD * channels.threshold, excess, 0.0) + foreign


def isotopes_below(channels: MassChannels, masses: IntArray) -> FloatArray:
    """Return the carbon-13 that the observed peaks one and two mass numbers below carry up."""
    share = _CARBON_13 * masses / 14
    return np.asarray(
        channels.at(masses - 1).intensity * share + channels.at(masses - 2).intensity * share**2 / 2
    )


def _alkyl_part(channels: MassChannels, masses: IntArray, log_levels: FloatArray) -> FloatArray:
    """Score the low hydrocarbon ions of an unknown compound at the height that suits them best."""
    view = channels.at(masses)
    logs = np.log(np.where(view.seen, view.intensity, channels.threshold))
    height = float(np.median((logs - log_levels)[view.seen])) if view.seen.any() else 0.0
    return _side(channels, masses, np.exp(height + log_levels), _ALKYL_SCALE)


def _stray(excess: FloatArray, threshold: float) -> FloatArray:
    """Score mass numbers that should be empty: noise at will, larger peaks few and falling with height."""
    level = _noise_level(threshold)
    small, large = _shares(excess, level)
    large = min(large, _LARGEST_IMPURITY_SHARE)
    fall = np.log(large * _IMPURITY_FALL) - _IMPURITY_FALL * np.log(np.maximum(excess / level, 1.0))
    high = np.maximum(fall, _IMPURITY_FLOOR)
    return _by_height(
        excess, level, np.log(1 - small - large), np.log(small) - _width(threshold, level), high
    )


def _anything(excess: FloatArray, threshold: float) -> FloatArray:
    """Score mass numbers where peaks of any height may stand."""
    level = _noise_level(threshold)
    small, large = _shares(excess, level)
    high = np.full(excess.shape, np.log(large) - _width(level, 1.0))
    return _by_height(
        excess, level, np.log(1 - small - large), np.log(small) - _width(threshold, level), high
    )


def _noise_level(threshold: float) -> float:
    """Return the height up to which a peak counts as noise, whatever the list was cut at."""
    return min(max(threshold, _SMALL), _LARGEST_NOISE)


def _shares(excess: FloatArray, level: float) -> tuple[float, float]:
    """Return the shares of mass numbers with small and with large peaks, never quite none."""
    count = excess.size + 2
    large = int(np.count_nonzero(excess > level))
    return (np.count_nonzero(excess) - large + 0.5) / count, (large + 0.5) / count


def _width(low: float, high: float) -> float:
    """Return the log of the log-range over which heights are spread evenly."""
    return float(np.log(max(np.log(high / low), 0.5)))


def _by_height(excess: FloatArray, level: float, empty: float, small: float, high: FloatArray) -> FloatArray:
    return np.asarray(np.where(excess == 0, empty, np.where(excess <= level, small, high)))


def _unexplained_whole(channels: MassChannels, unexplained_height: float, heaviest: int) -> float:
    """Score the unexplained share of the ion current: exponential, against any share alike."""
    masses = recorded_masses(channels, heaviest)
    inside = masses[masses < channels.intensity.size]
    whole = float((channels.intensity[inside] + channels.foreign[inside]).sum())
    share = unexplained_height / max(whole, 1e-12)
    return float(-np.log(_UNEXPLAINED_MEAN) - share / _UNEXPLAINED_MEAN)


def _side(channels: MassChannels, masses: IntArray, expected: FloatArray, scale: float) -> FloatArray:
    view = channels.at(masses)
    level = np.log(expected + NOISE_OF_THRESHOLD * channels.threshold)
    z = (np.log(np.where(view.seen, view.intensity, channels.threshold)) - level) / scale
    seen = np.logaddexp(log_density(z) - np.log(scale), _SIDE_FLOOR)
    unseen = np.log(view.omission + (1 - view.omission) * np.exp(log_below(z)))
    return np.where(view.seen, seen, unseen)
