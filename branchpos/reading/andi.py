"""ANDI/AIA netCDF: a run in the analytical data interchange format for mass spectrometry.

Source: ASTM E1947 and E2077 for the names of variables and attributes (from memory, and from files in
circulation).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from io import BytesIO

import numpy as np
from numpy.typing import NDArray

from branchpos.errors import FormatError, InputError, TruncatedError
from branchpos.reading.ionisation import ionisation_warnings
from branchpos.reading.numerals import counted
from branchpos.reading.run_assembly import RunDetails, ScanTable, assemble_run, profile_error
from branchpos.run import Run

FloatArray = NDArray[np.float64]
SingleArray = NDArray[np.float32]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

_NOT_RECORDED = -9999
"""What the format writes where a value is not known."""
_ANY_FAULT = (
    TypeError,
    ValueError,
    IndexError,
    KeyError,
    AttributeError,
    AssertionError,
    OverflowError,
    ZeroDivisionError,
    EOFError,
    MemoryError,
)
"""What the netCDF library raises on damaged or cut files, by the place where it stumbles."""
_EXPORT_AGAIN = "export the run again as ANDI netCDF (AIA)"


@dataclass(frozen=True, slots=True)
class _Dataset:
    """Variables and attributes as plain arrays and text; scale factors are not yet applied."""

    attributes: Mapping[str, str]
    variables: dict[str, NDArray[np.generic]]
    settings: Mapping[str, Mapping[str, object]]

    def real(self, name: str) -> FloatArray | None:
        """Return a variable in its unit, scale factor and offset applied; None where it is not there."""
        if name not in self.variables:
            return None
        values = self.variables[name].astype(np.float64).ravel()
        factor, offset = self._setting(name, "scale_factor", 1.0), self._setting(name, "add_offset", 0.0)
        return values if (factor, offset) == (1.0, 0.0) else values * factor + offset

    def whole(self, name: str) -> IntArray | None:
        """Return a variable of whole numbers; None where it is not there."""
        if name not in self.variables:
            return None
        values = self.variables[name].ravel()
        if not np.isfinite(values.astype(np.float64)).all():
            raise FormatError(f"{name} holds values that are no numbers", remedy=_EXPORT_AGAIN)
        return values.astype(np.int64)

    def _setting(self, name: str, key: str, default: float) -> float:
        given = self.settings.get(name, {}).get(key, default)
        value = float(np.asarray(given, dtype=np.float64).ravel()[0])
        if not np.isfinite(value) or (key == "scale_factor" and value == 0):
            raise FormatError(f"{key} of {name} is {value:g}", remedy=_EXPORT_AGAIN)
        return value


def read_chunks(chunks: Iterable[bytes], file: str = "") -> Run:
    """Read one run.

    Parameters
    ----------
    chunks : the bytes of the file, unpacked, in pieces of any size; an ``InputError`` where they stop early.
    file : the path as the user gave it.

    Raises
    ------
    TruncatedError : the file stops early; nothing in it tells which of its numbers are still in place.
    InputError : the file is damaged, is no mass spectrometric run, or holds profiles.
    """
    try:
        content = BytesIO()
        content.writelines(chunks)
        content.seek(0)
        return _assemble(_open(content), file)
    except InputError as fault:
        raise fault.located(file=file) from None


def _open(content: BytesIO) -> _Dataset:
    """Take variables and attributes out of the file, and let go of its bytes."""
    from scipy.io import netcdf_file

    try:
        # Left to itself the library maps the file into memory, and skips the offsets of packed numbers.
        with content, netcdf_file(content, mode="r", mmap=False, maskandscale=False) as data:
            # The library keeps attributes as attributes of its objects, and lists them only here.
            attributes = {name: _text(value) for name, value in vars(data)["_attributes"].items()}
            variables = {name: held.data for name, held in data.variables.items()}
            settings = {name: dict(vars(held)["_attributes"]) for name, held in data.variables.items()}
    except _ANY_FAULT as reason:
        raise TruncatedError(
            f"the netCDF data stop early or are damaged ({type(reason).__name__}: {reason}); as the numbers "
            "of all scans lie mixed, none can be saved",
            remedy="copy the file again, or export the run again",
        ) from None
    return _Dataset(attributes, variables, settings)


def _text(value: object) -> str:
    if isinstance(value, bytes):
        return value.decode("utf-8", errors="replace").strip("\0 ")
    return " ".join(f"{number:g}" for number in np.asarray(value, dtype=np.float64).ravel())


def _assemble(data: _Dataset, file: str) -> Run:
    if "continuum" in data.attributes.get("experiment_type", "").lower():
        raise profile_error("experiment type", file)
    mz, intensity = _points(data)
    if mz.size != intensity.size:
        raise FormatError(f"{mz.size} mass values but {intensity.size} intensities", remedy=_EXPORT_AGAIN)
    times = _times(data)
    starts, counts = _starts_and_counts(data, times.size, mz.size)
    numbers = _numbers(data, times.size)
    details = RunDetails(
        file=file,
        metadata={"format": "ANDI netCDF"} | {name: text for name, text in data.attributes.items() if text},
        windows=_windows(data),
        notes=_notes(data),
    )
    kept = _usable(times, starts, counts, numbers, mz.size, details)
    table = _gather(starts, counts, kept, mz, intensity, times, numbers)
    return assemble_run(table, details)


def _points(data: _Dataset) -> tuple[FloatArray, SingleArray]:
    """Return m/z and intensity of all points, and let go of what they are made from, most of the file."""
    mz = _needed(data, "mass_values")
    del data.variables["mass_values"]
    with np.errstate(over="ignore"):
        # What single precision cannot hold becomes infinite, and the scan is left out for it.
        intensity = _needed(data, "intensity_values").astype(np.float32)
    del data.variables["intensity_values"]
    return mz, intensity


def _needed(data: _Dataset, name: str) -> FloatArray:
    values = data.real(name)
    if values is None:
        raise FormatError(
            f"the netCDF file has no variable {name}: it is no mass spectrometric run", remedy=_EXPORT_AGAIN
        )
    return values


def _times(data: _Dataset) -> FloatArray:
    times = _needed(data, "scan_acquisition_time")
    unit = data.settings.get("scan_acquisition_time", {}).get("units", b"")
    minutes = _text(unit).lower().startswith("min") if isinstance(unit, bytes) else False
    return times * 60.0 if minutes else times


def _starts_and_counts(data: _Dataset, scans: int, points: int) -> tuple[IntArray, IntArray]:
    """Return where the points of each scan begin and how many they are; either follows from the other."""
    starts, counts = data.whole("scan_index"), data.whole("point_count")
    if counts is None and starts is not None:
        counts = np.diff(np.append(starts, points))
    if starts is None and counts is not None:
        starts = np.cumsum(np.maximum(counts, 0)) - np.maximum(counts, 0)
    if starts is None or counts is None:
        raise FormatError("neither scan_index nor point_count is there", remedy=_EXPORT_AGAIN)
    if not starts.size == counts.size == scans:
        raise FormatError(
            f"{scans} scan times, {starts.size} scan indices and {counts.size} point counts do not fit",
            remedy=_EXPORT_AGAIN,
        )
    return starts, counts


def _numbers(data: _Dataset, scans: int) -> IntArray:
    """Return scan numbers as recorded where all are, else counted from 1."""
    told = data.whole("actual_scan_number")
    if told is None or told.size != scans or (np.diff(told) <= 0).any() or (told < 0).any():
        return np.arange(1, scans + 1, dtype=np.int64)
    return told


def _windows(data: _Dataset) -> list[tuple[float, float]]:
    first, last = data.real("mass_range_min"), data.real("mass_range_max")
    if first is None or last is None or first.size != last.size:
        return []
    ends = np.stack([first, last], axis=1)
    known = np.isfinite(ends).all(axis=1) & (ends > 0).all(axis=1)
    return [(low, high) for low, high in np.unique(ends[known], axis=0).tolist()]


def _notes(data: _Dataset) -> list[str]:
    notes = ionisation_warnings(
        methods=[data.attributes.get("test_ionization_mode", "")],
        polarity=data.attributes.get("test_ionization_polarity", ""),
        energy=data.attributes.get("test_electron_energy", ""),
    )
    flags = data.whole("flag_count")
    flagged = np.zeros(0, np.int64) if flags is None else flags[flags > 0]
    if flagged.size:
        notes.append(
            f"{counted(int(flagged.sum()), 'point')} in {counted(flagged.size, 'scan')} flagged by the "
            "instrument (saturated, unresolved or the like); read like the others"
        )
    return notes


def _usable(
    times: FloatArray, starts: IntArray, counts: IntArray, numbers: IntArray, points: int, details: RunDetails
) -> BoolArray:
    """Mark the scans to read, shape (scans,), and name the others; a scan without points is one."""
    gap = (counts < 0) | ~np.isfinite(times) | (times <= _NOT_RECORDED)
    if gap.any():
        first = int(numbers[np.flatnonzero(gap)[0]])
        details.notes.append(
            f"{counted(int(gap.sum()), 'scan')} not recorded, from scan {first} on; left out"
        )
    beyond = ~gap & (counts > 0) & ((starts < 0) | (starts + counts > points))
    for at in np.flatnonzero(beyond).tolist():
        details.faults.append(
            FormatError(
                f"its points {starts[at]} to {starts[at] + counts[at]} lie outside the {points} of the file",
                place=f"scan {numbers[at]}",
                remedy="copy the file again, or export the run again",
            )
        )
    return ~gap & ~beyond


def _gather(
    starts: IntArray,
    counts: IntArray,
    kept: BoolArray,
    mz: FloatArray,
    intensity: SingleArray,
    times: FloatArray,
    numbers: IntArray,
) -> ScanTable:
    starts, counts = starts[kept], counts[kept]
    _refuse_shared_points(starts, counts, numbers[kept])
    offsets = np.zeros(counts.size + 1, np.int64)
    np.cumsum(counts, out=offsets[1:])
    if not np.array_equal(starts[counts > 0], offsets[:-1][counts > 0]):
        points = np.arange(offsets[-1]) + np.repeat(starts - offsets[:-1], counts)
        mz, intensity = mz[points], intensity[points]
    return ScanTable(numbers[kept], times[kept], offsets, mz[: offsets[-1]], intensity[: offsets[-1]])


def _refuse_shared_points(starts: IntArray, counts: IntArray, numbers: IntArray) -> None:
    """Refuse an index that gives the same points to two scans: one of them would be made of another's."""
    full = np.flatnonzero(counts > 0)
    order = full[np.argsort(starts[full], kind="stable")]
    shared = starts[order][1:] < (starts + counts)[order][:-1]
    if shared.any():
        at = int(np.flatnonzero(shared)[0])
        raise FormatError(
            f"scan {numbers[order[at]]} and scan {numbers[order[at + 1]]} claim the same points",
            place="scan_index",
            remedy=_EXPORT_AGAIN,
        )
