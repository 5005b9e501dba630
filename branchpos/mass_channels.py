"""A spectrum on whole mass numbers: what was seen, what stayed below the threshold, what was not recorded."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import EndGroup

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class MassChannels:
    """Intensities at every whole mass number from 0 to the heaviest peak.

    Attributes
    ----------
    intensity : relative to the base peak, shape (masses,); 0 where nothing was seen.
    doubtful : shape (masses,); true where the intensity may be a tenth of what was measured.
    contaminated : shape (masses,); true where another substance stands on the mass number, which then says
        nothing.
    foreign : intensity that accurate mass shows not to be a hydrocarbon ion, shape (masses,).
    threshold : smallest relative intensity that the recording kept.
    first, last : lightest and heaviest recorded mass number; absence outside says nothing.
    omission : chance that the list leaves out a peak whatever its height; large for hand-picked short lists.
    """

    intensity: FloatArray
    doubtful: BoolArray
    contaminated: BoolArray
    foreign: FloatArray
    threshold: float
    first: int
    last: float
    omission: float

    def for_class(self, end_group: EndGroup) -> MassChannels:
        """Return the channels as a class reads them: ions with an end group need not be hydrocarbons."""
        if end_group.added.o + end_group.added.n + end_group.added.si == 0 or not self.foreign.any():
            return self
        return replace(self, intensity=self.intensity + self.foreign, foreign=np.zeros_like(self.foreign))

    def with_omission(self, least: float) -> MassChannels:
        """Return the channels with at least this chance of omission."""
        return replace(self, omission=max(self.omission, least))

    @property
    def heaviest(self) -> int:
        """Heaviest mass number with a peak."""
        return int(np.flatnonzero(self.intensity + self.foreign)[-1])

    def at(self, masses: IntArray) -> ChannelView:
        """Return what was observed at the given mass numbers, shape (channels,)."""
        inside = np.clip(masses, 0, self.intensity.size - 1)
        within = masses < self.intensity.size
        intensity = np.where(within, self.intensity[inside], 0.0)
        return ChannelView(
            intensity=intensity,
            seen=intensity > 0,
            doubtful=within & self.doubtful[inside],
            recorded=(masses >= self.first) & (masses <= self.last) & ~(within & self.contaminated[inside]),
            threshold=self.threshold,
            omission=self.omission,
        )


@dataclass(frozen=True, slots=True, eq=False)
class ChannelView:
    """Observations at chosen mass numbers; all arrays of shape (channels,).

    Attributes
    ----------
    intensity : relative to the base peak, 0 where nothing was seen.
    seen, doubtful, recorded : states of each channel, as in ``MassChannels``.
    threshold, omission : as in ``MassChannels``.
    """

    intensity: FloatArray
    seen: BoolArray
    doubtful: BoolArray
    recorded: BoolArray
    threshold: float
    omission: float
