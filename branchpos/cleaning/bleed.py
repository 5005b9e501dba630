"""Column bleed: siloxane ions, some of which share a mass number with ions of chains."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

_MARKER = 207
"""Strongest ion of column bleed, hexamethylcyclotrisiloxane less a methyl (common practice)."""
_NEIGHBOURS = (-2, -1, 3, 4)
"""Mass numbers beside the marker and its isotopes."""
_PROMINENCE = 3.0
BLEED_MASSES = (73, 147, 207, 208, 209, 221, 281, 282, 283, 295, 296, 355, 356, 429)
"""Siloxane ions of bleed with the isotopes of the strongest (common practice); 281 and 295 fall on the alkyl
series."""


def shows_bleed(intensity: NDArray[np.float64]) -> bool:
    """Tell whether the ion of column bleed stands out of its neighbours.

    Parameters
    ----------
    intensity : by whole mass number, shape (masses,).

    >>> spectrum = np.zeros(400)
    >>> spectrum[207] = 0.05
    >>> shows_bleed(spectrum)
    True
    """
    if intensity.size <= _MARKER + max(_NEIGHBOURS) or intensity[_MARKER] <= 0:
        return False
    around = max(float(intensity[_MARKER + step]) for step in _NEIGHBOURS)
    return bool(intensity[_MARKER] > _PROMINENCE * around)
