"""Which numbers of carbons a spectrum allows an alkane to have."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from branchpos.mass_channels import MassChannels

SMALLEST, LARGEST = 5, 60
"""Carbons of the smallest and largest alkane ever considered."""
_STRONG = 5.0
"""A peak this many thresholds high must be explained by the molecule."""
_LEAST = 0.003
"""And at least this high relative to the base peak."""
_MOLECULAR_EXCESS = 3.0
"""A molecular ion stands this far above the carbon-13 of the ion below it."""
_STRAY_SHARE = 0.05
"""Share of mass numbers between the series below which a spectrum counts as free of noise."""
_BEYOND = 16
_BEYOND_TWICE = 4
"""Carbons of the molecule beyond the heaviest strong ion, and beyond twice the heaviest ion of all: a chain
cut at 1 % shows little above its middle (measured on the unbranched records that the fit rests on)."""


def plausible_carbons(channels: MassChannels) -> range:
    """Return the numbers of carbons that the heaviest peaks leave possible.

    The molecule is at least as heavy as the heaviest strong peak on the alkane series, or the heaviest at all
    where the spectrum is free of noise. Where that peak has the mass and the isolation of a molecular ion,
    the size is known to one carbon; where it is a fragment, the molecule may be larger by the largest radical
    that a branch lets go.
    """
    masses = np.arange(channels.intensity.size)
    on_series = np.isin(masses % 14, (0, 1, 2)) & (masses >= 14 * 3) & ~channels.contaminated
    strong = np.flatnonzero(on_series & (channels.intensity >= max(_STRONG * channels.threshold, _LEAST)))
    any_peak = np.flatnonzero(on_series & (channels.intensity > 0))
    heaviest = int(strong[-1] if strong.size else any_peak[-1]) if any_peak.size else 14 * SMALLEST
    fewest = max(SMALLEST, (heaviest - 2 + 13) // 14)
    top = int(any_peak[-1]) if any_peak.size else heaviest
    trusted = top if top == heaviest or _is_clean(channels) else heaviest
    if _is_molecular(channels, trusted, any_peak):
        fewest = trusted // 14
        return range(min(fewest, LARGEST), min(fewest + 1, LARGEST) + 1)
    return range(min(fewest, LARGEST), min(_most(fewest, any_peak), LARGEST) + 1)


def _is_clean(channels: MassChannels) -> bool:
    """Tell whether the mass numbers far from the alkane series are all but empty."""
    masses = np.arange(channels.intensity.size)
    between = (masses >= 14 * 5) & (masses % 14 >= 4) & (masses % 14 <= 9)
    return bool(np.mean(channels.intensity[between] > 0) < _STRAY_SHARE) if between.any() else False


def _most(fewest: int, peaks: NDArray[np.intp]) -> int:
    heaviest = int(peaks[-1]) if peaks.size else 0
    return max(fewest + _BEYOND, 2 * (heaviest // 14) + _BEYOND_TWICE)


def _is_molecular(channels: MassChannels, mass: int, peaks: NDArray[np.intp]) -> bool:
    from_below = 0.0108 * mass / 14 * float(channels.intensity[mass - 1])
    tall = float(channels.intensity[mass]) > _MOLECULAR_EXCESS * from_below
    return mass % 14 == 2 and tall and not (peaks > mass + 3).any()
