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

BLEED_MASSES = (73, 147, 207, 221, 281, 295, 355, 429)
"""Siloxane ions of column bleed (common practice); they speak for no hypothesis."""
_SMALL = 0.005
"""Relative height up to which a stray peak is noise and says nothing on how heavy it may get (judgement, as
the next four)."""
_LARGEST_IMPURITY_SHARE = 0.08
_IMPURITY_FALL = 1.2
_IMPURITY_FLOOR = -9.0
_ISOTOPE_MARGIN = 1.5
_SIDE_FLOOR = -6.5
_CARBON_13 = 0.0108


@dataclass(frozen=True, slots=True, eq=False)
class Remainder:
    """Log likelihood of the mass numbers that a batch was not scored on.

    Attributes
    ----------
    masses : mass numbers, shape (masses,).
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
    masses = np.setdiff1d(recorded_masses(channels, heaviest), [*batch.masses.tolist(), *BLEED_MASSES])
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
    return Remainder(masses, by_mass)


def score_no_chain(channels: MassChannels, heaviest: int) -> Remainder:
    """Score every recorded mass number under a compound that the program has no model for."""
    masses = np.setdiff1d(recorded_masses(channels, heaviest), BLEED_MASSES)
    excess = unexplained(channels, masses)
    return Remainder(masses, _anything(excess, channels.threshold))


def recorded_masses(channels: MassChannels, heaviest: int) -> IntArray:
    """Return the recorded mass numbers from the lightest to the heaviest of interest."""
    return np.arange(max(channels.first, 39), int(min(channels.last, heaviest)) + 1)


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


def _stray(excess: FloatArray, threshold: float) -> FloatArray:
    """Score mass numbers that should be empty: noise at will, larger peaks few and falling with height."""
    level = max(threshold, _SMALL)
    small, large = _shares(excess, level)
    large = min(large, _LARGEST_IMPURITY_SHARE)
    fall = np.log(large * _IMPURITY_FALL) - _IMPURITY_FALL * np.log(np.maximum(excess / level, 1.0))
    high = np.maximum(fall, _IMPURITY_FLOOR)
    return _by_height(
        excess, level, np.log(1 - small - large), np.log(small) - _width(threshold, level), high
    )


def _anything(excess: FloatArray, threshold: float) -> FloatArray:
    """Score mass numbers where peaks of any height may stand."""
    level = max(threshold, _SMALL)
    small, large = _shares(excess, level)
    high = np.full(excess.shape, np.log(large) - _width(level, 1.0))
    return _by_height(
        excess, level, np.log(1 - small - large), np.log(small) - _width(threshold, level), high
    )


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


def _side(channels: MassChannels, masses: IntArray, expected: FloatArray, scale: float) -> FloatArray:
    view = channels.at(masses)
    level = np.log(expected + NOISE_OF_THRESHOLD * channels.threshold)
    z = (np.log(np.where(view.seen, view.intensity, channels.threshold)) - level) / scale
    seen = np.logaddexp(log_density(z) - np.log(scale), _SIDE_FLOOR)
    unseen = np.log(view.omission + (1 - view.omission) * np.exp(log_below(z)))
    return np.where(view.seen, seen, unseen)
