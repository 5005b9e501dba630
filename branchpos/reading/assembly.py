"""From the peak rows of any format to one ``Spectrum``: faults located by line, oddities as warnings."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from branchpos.errors import SpectrumError
from branchpos.reading.numerals import counted, leading_number, quoted
from branchpos.spectrum import FloatArray, Spectrum

MOST_ROWS = 100_000
"""Rows that are taken for one spectrum of peaks; more are a profile or a run."""

_HIGHEST_MZ = 5_000.0
"""No GC-MS instrument records above this m/z [Th] (common practice)."""
_HIGHEST_INTENSITY = 1e30
_LOWEST_USEFUL_MZ = 50.0
_INDEX_RANGE = (100.0, 10_000.0)
"""Retention indices from methane's 100 to far beyond what elutes; others are times or placeholders."""
_RANGE = re.compile(r"([0-9]+(?:\.[0-9]+)?)\s*(?:-|–|to|\.\.)\s*([0-9]+(?:\.[0-9]+)?)")


class PeakRow(NamedTuple):
    """One peak and the line of the file, from 1, that it stands on."""

    line: int
    mz: float
    intensity: float


class Details(NamedTuple):
    """What a record says besides its peaks; every field may be missing."""

    place: str = ""
    title: str = ""
    metadata: Mapping[str, str] = {}
    retention_index: str = ""
    mass_range: str = ""
    stated_peaks: str = ""
    notes: Sequence[str] = ()


def assemble(rows: Sequence[PeakRow], details: Details, doubtful: Sequence[bool] | None = None) -> Spectrum:
    """Build the spectrum of one record; ``source`` is left at the place inside the file.

    The threshold is the smallest intensity that is not doubtful. A doubtful value may stand for one ten
    times larger, so taking it for the detection limit could claim that peaks were looked for far below the
    level at which any was recorded, and would make their absence count for more than it tells.

    Raises
    ------
    SpectrumError : no rows, too many, or a row whose numbers cannot be a peak; with its line.

    >>> s = assemble([PeakRow(4, 57.0, 100.0), PeakRow(5, 43.0, 80.0)], Details(title="C20"))
    >>> s.title, s.mz.tolist(), s.warnings
    ('C20', [43.0, 57.0], ('peaks not in the order of m/z; sorted',))
    """
    _require_rows(rows, details)
    mz = np.array([row.mz for row in rows])
    intensity = np.array([row.intensity for row in rows])
    _check_rows(rows, mz, intensity)
    index, notes = _retention_index(details.retention_index)
    bounds, range_notes = _mass_range(details.mass_range, mz[intensity > 0])
    spectrum = Spectrum.from_peaks(
        mz,
        intensity,
        doubtful=doubtful,
        threshold=_threshold(intensity, doubtful),
        first_mass=bounds[0],
        last_mass=bounds[1],
        title=details.title,
        source=details.place,
        metadata=details.metadata,
        retention_index=index,
        warnings=(*_count_warning(len(rows), details.stated_peaks), *details.notes, *notes, *range_notes),
    )
    return spectrum.with_warning(*_order_warning(mz), *_content_warnings(spectrum))


def _require_rows(rows: Sequence[PeakRow], details: Details) -> None:
    if not rows:
        raise SpectrumError(
            "the record has no peaks", place=details.place, remedy="check that the peak list was exported"
        )
    if len(rows) > MOST_ROWS:
        raise SpectrumError(
            f"more than {MOST_ROWS} rows for one spectrum",
            place=f"line {rows[0].line}",
            remedy="give centroided peaks of one scan, not a profile or a run",
        )


def _check_rows(rows: Sequence[PeakRow], mz: FloatArray, intensity: FloatArray) -> None:
    for name, values, wrong in (
        ("m/z", mz, ~np.isfinite(mz) | (mz < 1) | (mz > _HIGHEST_MZ)),
        (
            "intensity",
            intensity,
            ~np.isfinite(intensity) | (intensity < 0) | (intensity > _HIGHEST_INTENSITY),
        ),
    ):
        if wrong.any():
            at = int(np.flatnonzero(wrong)[0])
            limits = f"outside 1 to {_HIGHEST_MZ:g}" if name == "m/z" else "not a finite amount from 0 up"
            raise SpectrumError(
                f"{name} is {values[at]:g}, {limits}",
                place=f"line {rows[at].line}",
                remedy="correct or remove the peak, or check which column holds what",
            )
    if not (intensity > 0).any():
        raise SpectrumError(
            "no peak has an intensity above zero",
            place=f"line {rows[0].line}",
            remedy="check the intensity column",
        )


def _threshold(intensity: FloatArray, doubtful: Sequence[bool] | None) -> float | None:
    if doubtful is None:
        return None
    trusted = intensity[(intensity > 0) & ~np.asarray(doubtful, bool)]
    return float(trusted.min()) if trusted.size else None


def _retention_index(text: str) -> tuple[float | None, list[str]]:
    if not text.strip():
        return None, []
    value = leading_number(text)
    if value is None or not _INDEX_RANGE[0] <= value <= _INDEX_RANGE[1]:
        return None, [f"retention index {quoted(text.strip())} is not one on the n-alkane scale; left out"]
    return value, []


def _mass_range(text: str, mz: FloatArray) -> tuple[tuple[float | None, float | None], list[str]]:
    found = _RANGE.search(text[:200])
    if not found:
        return (None, None), []
    first, last = float(found.group(1)), float(found.group(2))
    # Peaks may be centred up to half a unit beyond the nominal ends of a scan.
    if not 1 <= first <= mz.min() + 0.5 or not mz.max() - 0.5 <= last <= _HIGHEST_MZ:
        return (None, None), [f"mass range {quoted(found.group())} does not hold all peaks; left out"]
    return (min(first, float(mz.min())), max(last, float(mz.max()))), []


def _count_warning(found: int, stated: str) -> list[str]:
    number = leading_number(stated)
    if number is None or number == found:
        return []
    return [f"{counted(found, 'peak row')} where the record announces {number:g}"]


def _order_warning(mz: FloatArray) -> list[str]:
    return ["peaks not in the order of m/z; sorted"] if (np.diff(mz) < 0).any() else []


def _content_warnings(spectrum: Spectrum) -> list[str]:
    notes = []
    if spectrum.mz.size == 1:
        notes.append("only one peak")
    if spectrum.mz[-1] <= _LOWEST_USEFUL_MZ:
        notes.append("no peak above m/z 50: nothing to place a branch on")
    return notes
