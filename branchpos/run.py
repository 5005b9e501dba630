"""One GC-MS run: mass spectra recorded one after another along retention time."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from math import inf
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from branchpos.errors import SpectrumError

FloatArray = NDArray[np.float64]
SingleArray = NDArray[np.float32]
IntArray = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Run:
    """Scans along retention time, their points laid end to end.

    The points of scan ``i`` are those from ``offsets[i]`` to ``offsets[i + 1]``; a scan may have none.
    Build one with ``Run.from_arrays``.

    Attributes
    ----------
    times : retention time of each scan [s], shape (scans,), strictly rising.
    offsets : where the points of each scan begin, and where the last ones end, shape (scans + 1,).
    mz : m/z of all points [Th], shape (points,), never falling inside a scan.
    intensity : their intensities, any linear unit, shape (points,), none negative.
    scan_numbers : the numbers that the file gives the scans, shape (scans,).
    centroided : true when points are peaks, false when they trace the profile of peaks.
    first_mass, last_mass : mass range [Th] that every scan recorded; outside it, absence says nothing.
        Without word of the range it runs from the lightest point upwards without end.
    source : the path as the user gave it.
    metadata : what the file says about the run, as text.
    warnings : what the reader noticed, in words.
    complete : false where scans of the run are missing.
    lost : which scans are missing, and why, in words; empty for a complete run.
    """

    times: FloatArray
    offsets: IntArray
    mz: FloatArray
    intensity: SingleArray
    scan_numbers: IntArray
    centroided: bool = True
    first_mass: float = 0.0
    last_mass: float = inf
    source: str = ""
    metadata: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    warnings: tuple[str, ...] = ()
    complete: bool = True
    lost: str = ""

    def __post_init__(self) -> None:
        """Check that the arrays fit each other and hold what a run can hold."""
        _check_lengths(self)
        _check_times(self)
        _check_points(self)
        if self.complete == bool(self.lost):
            raise SpectrumError("a run is complete when nothing is lost, and only then", file=self.source)

    @classmethod
    def from_arrays(
        cls,
        times: ArrayLike,
        offsets: ArrayLike,
        mz: ArrayLike,
        intensity: ArrayLike,
        *,
        scan_numbers: ArrayLike | None = None,
        centroided: bool = True,
        first_mass: float | None = None,
        last_mass: float | None = None,
        source: str = "",
        metadata: Mapping[str, str] | None = None,
        warnings: tuple[str, ...] = (),
        lost: str = "",
    ) -> Run:
        """Bring arrays to the types of a run, number scans from 1 where no numbers are given, and check.

        Raises
        ------
        SpectrumError : no scan, lengths that do not fit, times that do not rise, values not finite, negative
            intensity, m/z falling inside a scan; with the scan.

        >>> run = Run.from_arrays([1.0, 2.0], [0, 2, 3], [57, 71, 57], [10, 5, 20])
        >>> run, run.total_ion_current().tolist()
        (<Run untitled: 2 scans, 1 to 2 s, 3 points>, [15.0, 20.0])
        """
        seconds, masses = np.asarray(times, dtype=np.float64), np.asarray(mz, dtype=np.float64)
        numbers = np.arange(1, seconds.size + 1) if scan_numbers is None else scan_numbers
        lightest = float(masses.min()) if masses.size else 0.0
        return cls(
            times=seconds,
            offsets=np.asarray(offsets, dtype=np.int64),
            mz=masses,
            intensity=np.asarray(intensity, dtype=np.float32),
            scan_numbers=np.asarray(numbers, dtype=np.int64),
            centroided=centroided,
            first_mass=lightest if first_mass is None else float(first_mass),
            last_mass=inf if last_mass is None else float(last_mass),
            source=source,
            metadata=MappingProxyType(dict(metadata or {})),
            warnings=warnings,
            complete=not lost,
            lost=lost,
        )

    def __len__(self) -> int:
        """Return the number of scans."""
        return int(self.times.size)

    def scan(self, index: int) -> tuple[FloatArray, SingleArray]:
        """Return m/z and intensity of one scan, each of shape (points of the scan,), counted from 0.

        Raises
        ------
        IndexError : no scan has this index.
        """
        if not -len(self) <= index < len(self):
            raise IndexError(f"scan {index} of a run of {len(self)}; counted from 0")
        at = index % len(self)
        inside = slice(int(self.offsets[at]), int(self.offsets[at + 1]))
        return self.mz[inside], self.intensity[inside]

    def total_ion_current(self) -> FloatArray:
        """Sum the intensities of each scan, shape (scans,)."""
        return self._summed(np.arange(self.mz.size))

    def ion_trace(self, mass: float, half_width: float = 0.5) -> FloatArray:
        """Sum each scan's intensities from ``mass - half_width`` up to, not at, ``mass + half_width``.

        Parameters
        ----------
        mass, half_width : middle and half the width of the window [Th].

        Returns
        -------
        The trace along retention time, shape (scans,); 0 where a scan has no point in the window. Windows
        side by side count each point once.
        """
        inside = (self.mz >= mass - half_width) & (self.mz < mass + half_width)
        return self._summed(np.flatnonzero(inside))

    def matrix(self, edges: ArrayLike) -> FloatArray:
        """Sum intensities in windows of m/z side by side, shape (scans, edges - 1).

        Parameters
        ----------
        edges : rising m/z [Th]; a point at an edge falls in the window above it. Where whole mass numbers end
            depends on the mass defect of the substances sought, so it is for the caller to say.
        """
        bounds = np.asarray(edges, dtype=np.float64)
        windows = bounds.size - 1
        column = np.searchsorted(bounds, self.mz, side="right") - 1
        points = np.flatnonzero((column >= 0) & (column < windows))
        cells = self._scan_of(points) * windows + column[points]
        summed = np.bincount(cells, weights=self.intensity[points], minlength=len(self) * windows)
        return np.asarray(summed, dtype=np.float64).reshape(len(self), windows)

    def with_warning(self, *notes: str) -> Run:
        """Return the run with further warnings."""
        return replace(self, warnings=(*self.warnings, *notes))

    def _summed(self, points: NDArray[np.intp]) -> FloatArray:
        summed = np.bincount(self._scan_of(points), weights=self.intensity[points], minlength=len(self))
        return np.asarray(summed, dtype=np.float64)

    def _scan_of(self, points: NDArray[np.intp]) -> NDArray[np.intp]:
        return np.searchsorted(self.offsets, points, side="right") - 1

    def __repr__(self) -> str:
        cut = "" if self.complete else ", incomplete"
        return (
            f"<Run {self.source or 'untitled'}: {len(self)} scans, "
            f"{self.times[0]:g} to {self.times[-1]:g} s, {self.mz.size} points{cut}>"
        )


def _check_lengths(run: Run) -> None:
    scans = run.times.size
    if scans == 0:
        raise SpectrumError("the run has no scans", file=run.source, remedy="check that scans were exported")
    whole = run.offsets.size == scans + 1 and run.scan_numbers.size == scans
    if not whole or run.mz.size != run.intensity.size:
        raise SpectrumError(
            f"{scans} times, {run.scan_numbers.size} scan numbers, {run.offsets.size} offsets, {run.mz.size} "
            f"m/z values and {run.intensity.size} intensities do not fit each other",
            file=run.source,
            remedy="give a number for each time, one offset more, and an intensity for each m/z",
        )
    if run.offsets[0] != 0 or run.offsets[-1] != run.mz.size or (np.diff(run.offsets) < 0).any():
        raise SpectrumError(
            f"offsets from {run.offsets[0]} to {run.offsets[-1]} do not part {run.mz.size} points into scans",
            file=run.source,
            remedy="let them rise from 0 to the number of points",
        )


def _check_times(run: Run) -> None:
    unknown = ~np.isfinite(run.times)
    if unknown.any():
        raise _fault(
            run, int(np.flatnonzero(unknown)[0]), "the retention time is not known", "export it again"
        )
    still = np.diff(run.times) <= 0
    if still.any():
        at = int(np.flatnonzero(still)[0]) + 1
        raise _fault(
            run,
            at,
            f"retention time {run.times[at]:g} s does not follow {run.times[at - 1]:g} s of the scan before",
            "export one run a file, its scans in order of time, and the times with all their decimals",
        )


def _check_points(run: Run) -> None:
    falling = np.zeros(run.mz.size, dtype=bool)
    falling[1:] = run.mz[1:] < run.mz[:-1]
    falling[run.offsets[:-1][run.offsets[:-1] < run.mz.size]] = False
    for problem, wrong in (
        ("m/z is {:g}", ~np.isfinite(run.mz) | (run.mz <= 0)),
        ("intensity {1:g} at m/z {0:g}", ~np.isfinite(run.intensity) | (run.intensity < 0)),
        ("m/z {:g} stands below the one before it", falling),
    ):
        if wrong.any():
            at = int(np.flatnonzero(wrong)[0])
            scan = int(np.searchsorted(run.offsets, at, side="right")) - 1
            words = problem.format(run.mz[at], run.intensity[at])
            raise _fault(run, scan, words, "correct or leave out the scan")


def _fault(run: Run, scan: int, problem: str, remedy: str) -> SpectrumError:
    return SpectrumError(problem, file=run.source, place=f"scan {run.scan_numbers[scan]}", remedy=remedy)
