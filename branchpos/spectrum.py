"""One mass spectrum: peaks, the level below which nothing was recorded, the recorded mass range."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from math import inf
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from branchpos.errors import SpectrumError

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

_ACCURATE_DECIMALS = 3
"""Decimals that accurate masses need; unit-mass data carry 0 to 2 (common practice)."""


@dataclass(frozen=True, slots=True, eq=False)
class Spectrum:
    """A centroided electron ionisation spectrum.

    Build one with ``Spectrum.from_peaks``, which checks and orders the numbers.

    Attributes
    ----------
    mz : m/z of the peaks [Th], shape (peaks,), strictly rising.
    intensity : their intensities, any linear unit, shape (peaks,), all positive.
    doubtful : shape (peaks,); true where the file itself casts doubt on the intensity, which may be a
        tenth of what was measured (a shifted decimal).
    threshold : smallest intensity that the recording kept, same unit as ``intensity``.
    first_mass, last_mass : recorded mass range [Th]; outside it, absence says nothing. Without word of
        the range it runs from the first peak upwards without end.
    accurate : true when m/z carries at least three decimals.
    title, source : the record's own title; the path as the user gave it, with the block inside it.
    metadata : every other field of the record, as text.
    retention_index : the record's own retention index, if it states one.
    warnings : what the reader noticed, in words.
    """

    mz: FloatArray
    intensity: FloatArray
    doubtful: BoolArray
    threshold: float
    first_mass: float
    last_mass: float
    accurate: bool = False
    title: str = ""
    source: str = ""
    metadata: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    retention_index: float | None = None
    warnings: tuple[str, ...] = ()

    @classmethod
    def from_peaks(
        cls,
        mz: ArrayLike,
        intensity: ArrayLike,
        *,
        doubtful: ArrayLike | None = None,
        threshold: float | None = None,
        first_mass: float | None = None,
        last_mass: float | None = None,
        title: str = "",
        source: str = "",
        metadata: Mapping[str, str] | None = None,
        retention_index: float | None = None,
        warnings: tuple[str, ...] = (),
    ) -> Spectrum:
        """Check and order peaks; drop zero intensities and sum rows of equal m/z, with a warning each.

        The threshold defaults to the smallest intensity present; the mass range begins at the first peak.

        Raises
        ------
        SpectrumError : no peaks, lengths that differ, values not finite, negative intensity, m/z below 1.

        >>> s = Spectrum.from_peaks([57, 43, 71], [100, 80, 0])
        >>> s.mz.tolist(), s.threshold, s.warnings
        ([43.0, 57.0], 80.0, ('1 peak of zero intensity left out',))
        """
        masses, heights = np.asarray(mz, dtype=float).ravel(), np.asarray(intensity, dtype=float).ravel()
        _check_peaks(masses, heights)
        flags = np.zeros(masses.size, bool) if doubtful is None else np.asarray(doubtful, bool).ravel()
        notes = list(warnings)
        kept = heights > 0
        if not kept.all():
            notes.append(f"{_count(int((~kept).sum()), 'peak')} of zero intensity left out")
            masses, heights, flags = masses[kept], heights[kept], flags[kept]
        if masses.size == 0:
            raise SpectrumError("no peak has an intensity above zero", remedy="check the intensity column")
        unique, group = np.unique(masses, return_inverse=True)
        if unique.size < masses.size:
            notes.append(f"{_count(masses.size - unique.size, 'peak')} of repeated m/z summed into the first")
        summed = np.asarray(np.bincount(group, weights=heights), dtype=float)
        return cls(
            mz=unique,
            intensity=summed,
            doubtful=np.bincount(group, weights=flags) > 0,
            threshold=float(summed.min() if threshold is None else threshold),
            first_mass=float(unique[0] if first_mass is None else first_mass),
            last_mass=inf if last_mass is None else float(last_mass),
            accurate=_needs_decimals(unique),
            title=title,
            source=source,
            metadata=MappingProxyType(dict(metadata or {})),
            retention_index=retention_index,
            warnings=tuple(notes),
        )

    @property
    def relative(self) -> FloatArray:
        """Intensities relative to the base peak, shape (peaks,)."""
        return self.intensity / float(self.intensity.max())

    @property
    def relative_threshold(self) -> float:
        """Detection threshold relative to the base peak."""
        return self.threshold / float(self.intensity.max())

    def with_warning(self, *notes: str) -> Spectrum:
        """Return the spectrum with further warnings."""
        return replace(self, warnings=(*self.warnings, *notes))

    def __repr__(self) -> str:
        return (
            f"<Spectrum {self.title or self.source or 'untitled'!s}: {self.mz.size} peaks, "
            f"m/z {self.mz[0]:g} to {self.mz[-1]:g}, base peak {self.mz[self.intensity.argmax()]:g}>"
        )


def _check_peaks(mz: FloatArray, intensity: FloatArray) -> None:
    if mz.size != intensity.size:
        raise SpectrumError(
            f"{mz.size} m/z values but {intensity.size} intensities", remedy="give one intensity for each m/z"
        )
    if mz.size == 0:
        raise SpectrumError("the spectrum has no peaks", remedy="check that the peak list was exported")
    for name, values, wrong in (
        ("m/z", mz, ~np.isfinite(mz) | (mz < 1)),
        ("intensity", intensity, ~np.isfinite(intensity) | (intensity < 0)),
    ):
        if wrong.any():
            at = int(np.flatnonzero(wrong)[0])
            raise SpectrumError(
                f"{name} is {values[at]:g}", place=f"peak {at + 1}", remedy="correct or remove the peak"
            )


def _needs_decimals(mz: FloatArray) -> bool:
    coarse = np.round(mz, _ACCURATE_DECIMALS - 1)
    return bool(np.mean(np.abs(mz - coarse) > 1e-6) > 0.3)


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"
