"""From the scans of any run format to one ``Run``: scans that cannot be used are left out and named."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from branchpos.errors import FormatError, InputError, SpectrumError
from branchpos.reading.numerals import counted
from branchpos.run import Run

FloatArray = NDArray[np.float64]
SingleArray = NDArray[np.float32]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

_ROUNDING = 0.5
"""m/z [Th] by which peaks may be centred beyond the nominal ends of a scan."""
_NAMED = 3
"""Faults that are spelt out; the others are counted."""
_PROFILE_SPACING = 0.1
"""m/z [Th] between neighbours below which points trace a profile: peaks of one scan that is centroided stand
near whole numbers, and only a few share one (judgement)."""
_LOOKED_AT = 100
"""Scans, spread over the run, whose spacing is looked at."""


@dataclass(frozen=True, slots=True)
class ScanTable:
    """Scans as a reader found them, unchecked.

    Attributes
    ----------
    numbers, times : scan number and retention time [s] of each scan, shape (scans,).
    offsets : where the points of each scan begin, and where the last ones end, shape (scans + 1,).
    mz, intensity : the points [Th, any linear unit], shape (points,).
    """

    numbers: IntArray
    times: FloatArray
    offsets: IntArray
    mz: FloatArray
    intensity: SingleArray

    def without(self, dropped: BoolArray) -> ScanTable:
        """Return the table without the scans marked, shape (scans,)."""
        counts = np.diff(self.offsets)
        points = np.repeat(~dropped, counts)
        kept = counts[~dropped]
        return ScanTable(
            self.numbers[~dropped],
            self.times[~dropped],
            np.concatenate([np.zeros(1, np.int64), np.cumsum(kept)]),
            self.mz[points],
            self.intensity[points],
        )


@dataclass(slots=True)
class RunDetails:
    """What a reader learns beside the numbers.

    Attributes
    ----------
    windows : lightest and heaviest m/z [Th] that a scan recorded, for each scan that says so.
    faults : scans left out because they are damaged, each with its place.
    cut : where and why the file ends before the run does; empty where it does not.
    """

    file: str = ""
    metadata: Mapping[str, str] = field(default_factory=dict)
    windows: Sequence[tuple[float, float]] = ()
    notes: list[str] = field(default_factory=list)
    faults: list[InputError] = field(default_factory=list)
    cut: str = ""


class ScanCollector:
    """Scans taken one by one while a file streams past."""

    def __init__(self) -> None:
        self._numbers: list[int] = []
        self._times: list[float] = []
        self._mz: list[FloatArray] = []
        self._intensity: list[SingleArray] = []

    def __len__(self) -> int:
        """Return the number of scans taken."""
        return len(self._numbers)

    def add(self, number: int, time: float, mz: NDArray[np.generic], intensity: NDArray[np.generic]) -> None:
        """Take one scan; m/z and intensity have the same shape, (points,)."""
        self._numbers.append(number)
        self._times.append(time)
        self._mz.append(np.asarray(mz, dtype=np.float64))
        with np.errstate(over="ignore"):
            # What single precision cannot hold becomes infinite, and the scan is left out for it.
            self._intensity.append(np.asarray(intensity, dtype=np.float32))

    def table(self) -> ScanTable:
        """Lay all scans end to end."""
        offsets = np.zeros(len(self) + 1, np.int64)
        np.cumsum([points.size for points in self._mz], out=offsets[1:])
        mz = np.concatenate([np.zeros(0), *self._mz])
        self._mz = []
        intensity = np.concatenate([np.zeros(0, np.float32), *self._intensity])
        self._intensity = []
        numbers = np.array(self._numbers, dtype=np.int64)
        return ScanTable(numbers, np.array(self._times, dtype=np.float64), offsets, mz, intensity)


def assemble_run(table: ScanTable, details: RunDetails) -> Run:
    """Check scans, order their points, and say what is missing.

    Raises
    ------
    InputError : no point is left, the points trace profiles, or retention times do not rise.
    """
    bad, point_faults = _bad_points(table)
    faults = [*details.faults, *point_faults]
    if point_faults:
        table = table.without(bad)
    if table.mz.size == 0:
        raise _nothing_left(details, faults)
    refuse_profiles(table, details.file)
    table, notes = _in_order(table)
    bounds, range_notes = _mass_range(details.windows, table)
    lost = _lost(table, details.cut, faults)
    return Run.from_arrays(
        table.times,
        table.offsets,
        table.mz,
        table.intensity,
        scan_numbers=table.numbers,
        first_mass=bounds[0],
        last_mass=bounds[1],
        source=details.file,
        metadata=details.metadata,
        warnings=(*([f"incomplete run: {lost}"] if lost else []), *details.notes, *notes, *range_notes),
        lost=lost,
    )


def profile_error(place: str, file: str = "") -> FormatError:
    """Return the refusal of a scan whose points trace a profile instead of being peaks."""
    return FormatError(
        "the scan is a profile, not centroided peaks",
        file=file,
        place=place,
        remedy="have the converter or the instrument's software pick the peaks of all scans; export again",
    )


def refuse_profiles(table: ScanTable, file: str) -> None:
    """Refuse a run of profiles whatever the file calls it.

    Raises
    ------
    FormatError : half of all neighbouring points stand closer than peaks can.
    """
    full = np.flatnonzero(np.diff(table.offsets) > 1)
    looked_at = full[:: max(full.size // _LOOKED_AT, 1)]
    spacings = [np.abs(np.diff(table.mz[table.offsets[at] : table.offsets[at + 1]])) for at in looked_at]
    if spacings and float(np.median(np.concatenate(spacings))) < _PROFILE_SPACING:
        raise profile_error(f"scan {table.numbers[full[0]]}", file)


def _bad_points(table: ScanTable) -> tuple[BoolArray, list[InputError]]:
    """Mark scans with a point that cannot be one, shape (scans,), and say for each what the first such is."""
    wrong = ~np.isfinite(table.mz) | (table.mz <= 0) | ~np.isfinite(table.intensity) | (table.intensity < 0)
    points = np.flatnonzero(wrong)
    scans, first = np.unique(np.searchsorted(table.offsets, points, side="right") - 1, return_index=True)
    marked = np.zeros(table.numbers.size, bool)
    marked[scans] = True
    return marked, [
        SpectrumError(
            f"intensity {table.intensity[point]:g} at m/z {table.mz[point]:g}",
            place=f"scan {table.numbers[scan]}",
            remedy="export the run again, as recorded, with nothing subtracted",
        )
        for scan, point in zip(scans, points[first], strict=True)
    ]


def _nothing_left(details: RunDetails, faults: Sequence[InputError]) -> InputError:
    if faults:
        return faults[0].located(file=details.file)
    where = f" before {details.cut}" if details.cut else ""
    return FormatError(
        f"the file holds no whole scan with points{where}",
        file=details.file,
        remedy="copy the file again, or export it again",
    )


def _in_order(table: ScanTable) -> tuple[ScanTable, list[str]]:
    """Sort the points inside each scan by m/z where they are not."""
    falling = np.zeros(table.mz.size, bool)
    falling[1:] = table.mz[1:] < table.mz[:-1]
    falling[table.offsets[:-1][table.offsets[:-1] < table.mz.size]] = False
    if not falling.any():
        return table, []
    scans = np.repeat(np.arange(table.numbers.size), np.diff(table.offsets))
    order = np.lexsort((table.mz, scans))
    touched = np.unique(scans[falling]).size
    ordered = ScanTable(table.numbers, table.times, table.offsets, table.mz[order], table.intensity[order])
    return ordered, [f"points not in the order of m/z in {counted(touched, 'scan')}; sorted"]


def _mass_range(
    windows: Sequence[tuple[float, float]], table: ScanTable
) -> tuple[tuple[float | None, float | None], list[str]]:
    """Return the range that every scan recorded, as far as the file states one that can be true."""
    if not windows:
        return (None, None), []
    ends = np.array(windows, dtype=np.float64)
    first, last = float(ends[:, 0].max()), float(ends[:, 1].min())
    told, notes = f"m/z {first:g} to {last:g}", []
    if np.ptp(ends, axis=0).max() > 0:
        widest = f"m/z {ends[:, 0].min():g} to {ends[:, 1].max():g}"
        notes = [f"scans recorded different mass ranges within {widest}; common to all of them is {told}"]
    elif ((table.mz < first - _ROUNDING) | (table.mz > last + _ROUNDING)).any():
        return (None, None), [f"the stated mass range {told} does not hold all points; left out"]
    if not 0 < first < last:
        return (None, None), [*notes, f"a mass range {told} cannot be; left out"]
    return (first, last), notes


def _lost(table: ScanTable, cut: str, faults: Sequence[InputError]) -> str:
    parts = []
    if cut:
        parts.append(
            f"{cut}; {counted(table.numbers.size, 'whole scan')} kept, the last at {table.times[-1]:g} s"
        )
    if faults:
        named = "; ".join(f"{fault.place}: {fault.problem}" for fault in faults[:_NAMED])
        more = f"; and {len(faults) - _NAMED} more" if len(faults) > _NAMED else ""
        parts.append(f"{counted(len(faults), 'damaged scan')} left out ({named}{more})")
    return "; ".join(parts)
