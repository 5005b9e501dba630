"""The plain stick spectrum."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

import numpy as np

from branchpos.reporting import palette
from branchpos.reporting.label_placing import LabelPlacer
from branchpos.spectrum import Spectrum

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_LABELLED = 6
"""Tallest peaks that are labelled besides those asked for."""


def draw_spectrum(
    axes: Axes, spectrum: Spectrum, mz_range: tuple[float, float] | None = None, named: Iterable[int] = ()
) -> None:
    """Draw a spectrum as sticks on given axes, intensities in percent of the base peak.

    Parameters
    ----------
    axes : where to draw.
    spectrum : the peaks.
    mz_range : ends of the m/z axis [Th]; all peaks when not given.
    named : whole mass numbers to label besides the tallest.
    """
    heights = 100 * spectrum.relative
    gaps = np.full(heights.size, np.nan)
    x = np.stack([spectrum.mz, spectrum.mz, gaps], axis=1).ravel()
    y = np.stack([np.zeros_like(heights), heights, gaps], axis=1).ravel()
    axes.plot(x, y, color=palette.INK, lw=0.9, solid_capstyle="butt")
    axes.set_xlim(mz_range or (float(spectrum.mz[0]) - 5, float(spectrum.mz[-1]) + 5))
    axes.set_ylim(0, 135)
    axes.set_yticks([0, 50, 100])
    axes.set_xlabel("m/z")
    axes.set_ylabel("% of base")
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    _write_masses(axes, spectrum, heights, set(named))


def _write_masses(axes: Axes, spectrum: Spectrum, heights: np.ndarray, named: set[int]) -> None:
    low, high = axes.get_xlim()
    inside = np.flatnonzero((spectrum.mz > low) & (spectrum.mz < high))
    placer = LabelPlacer(axes)
    for peak in inside:
        placer.keep_clear(float(spectrum.mz[peak]), float(heights[peak]), reach=1.0, foot=0.0)
    whole = np.rint(spectrum.mz - 6e-4 * spectrum.mz).astype(int)
    tallest = set(inside[np.argsort(-heights[inside], kind="stable")][:_LABELLED].tolist())
    for peak in inside[np.argsort(-heights[inside], kind="stable")]:
        if int(peak) in tallest or int(whole[peak]) in named:
            colour = palette.INK if int(whole[peak]) in named else palette.QUIET
            placer.place(
                float(spectrum.mz[peak]), float(heights[peak]), f"{whole[peak]}", fontsize=6.5, color=colour
            )
