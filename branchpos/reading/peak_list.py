"""Delimited peak lists: one peak a row, with or without a row of column names, decimal point or comma."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from typing import NamedTuple

import numpy as np

from branchpos.errors import FormatError, InputError, SpectrumError
from branchpos.reading.assembly import MOST_ROWS, Details, PeakRow, assemble
from branchpos.reading.ionisation import ionisation_warnings
from branchpos.reading.numerals import is_numeric, parse_number, quoted
from branchpos.spectrum import FloatArray, Spectrum

_DELIMITERS = (";", "\t", ",", None)
"""Tried in this order; ``None`` stands for any run of blanks."""
_MZ_NAMES = frozenset(
    {"mz", "moverz", "mass", "masses", "massu", "massda", "amu", "mass2charge", "masstocharge"}
)
_INTENSITY_NAMES = frozenset(
    {"intensity", "intensities", "intens", "int", "i", "relativeintensity", "relintensity", "relint"}
    | {"abundance", "abundances", "abund", "relativeabundance", "relabundance", "height", "area"}
    | {"count", "counts", "signal", "response", "current", "ioncurrent"}
)
_COMMENT = "#"
_SAMPLE = 20
_FEW_ROWS = 5
_PROFILE_ROWS = 10
_WIDEST_PROFILE_STEP = 0.95
"""Peaks lie about one unit apart; evenly spaced points closer than that are a profile or a time axis."""


class _Layout(NamedTuple):
    """How the rows are cut, and which cell is what."""

    delimiter: str | None
    decimal_comma: bool
    mz: int
    intensity: int
    header: tuple[str, ...]

    def cells(self, line: str) -> list[str]:
        return _cut(line, self.delimiter)

    def number(self, cell: str, line: int) -> str:
        if not self.decimal_comma:
            return cell
        if "." in cell:
            raise FormatError(
                f"{quoted(cell)} stands in a list with both a decimal comma and a decimal point",
                place=f"line {line}",
                remedy="use one of the two throughout",
            )
        return cell.replace(",", ".")


def looks_like(lines: Sequence[str]) -> bool:
    """Tell from the head of a file whether rows of two or more numbers follow at most one row of names."""
    rows = [line for line in lines if not _is_remark(line)][: _SAMPLE + 1]
    return any(_fitting_delimiters(rows[skipped:]) for skipped in (0, 1))


def read_lines(lines: Sequence[str]) -> Iterator[Spectrum | InputError]:
    """Yield the one spectrum of a peak list, or what is wrong with it."""
    try:
        rows, layout = _read_rows(lines)
        mz = np.array([row.mz for row in rows])
        if not layout.header:
            _check_unnamed(mz, np.array([row.intensity for row in rows]), rows[0].line)
        _check_spacing(mz, rows[0].line)
        remarks = [line.strip(" \t#") for line in lines if line.lstrip().startswith(_COMMENT)]
        metadata = {"remarks": "; ".join(remarks)} if remarks else {}
        notes = [note for remark in remarks for note in ionisation_warnings(instrument=remark)]
        yield assemble(rows, Details(metadata=metadata, notes=notes))
    except InputError as fault:
        yield fault


def names_mz(cell: str) -> bool:
    """Tell whether a column name means m/z.

    >>> names_mz("m/z"), names_mz("Mass (u)"), names_mz("time")
    (True, True, False)
    """
    return _plain(cell) in _MZ_NAMES


def names_intensity(cell: str) -> bool:
    """Tell whether a column name means intensity.

    >>> names_intensity("Rel. Int."), names_intensity("m/z")
    (True, False)
    """
    return _plain(cell) in _INTENSITY_NAMES


def _plain(cell: str) -> str:
    words = (
        re.sub(r"\[.*?\]|\(.*?\)|%", "", cell.lower()) if not cell.lower().startswith("(") else cell.lower()
    )
    return re.sub(r"[^a-z0-9]", "", words)


def _cut(line: str, delimiter: str | None) -> list[str]:
    return [cell.strip() for cell in line.strip(" ").replace('"', "").split(delimiter)]


def _is_remark(line: str) -> bool:
    return not line.strip() or line.lstrip().startswith(_COMMENT)


def _numeric_with_comma(cell: str) -> bool:
    return is_numeric(cell.replace(",", ".", 1))


def _fitting_delimiters(rows: Sequence[str]) -> list[str | None]:
    """Return the delimiters that cut at least half of the first rows into two or more numbers.

    Half suffices, since one bad row must not hide the format.
    """
    sample = rows[:_SAMPLE]
    return [mark for mark in _DELIMITERS if 2 * _rows_cut_by(mark, sample) >= max(len(sample), 1)]


def _rows_cut_by(delimiter: str | None, rows: Sequence[str]) -> int:
    test = is_numeric if delimiter == "," else _numeric_with_comma
    cut = [_cut(row, delimiter)[:20] for row in rows]
    return sum(sum(map(test, cells)) >= 2 and not any(map(_holds_several, cells)) for cells in cut)


def _holds_several(cell: str) -> bool:
    """Tell whether a cell still holds several numbers: ``07 100`` of ``57,07 100,5`` cut at commas."""
    parts = cell.split()
    return len(parts) > 1 and all(map(_numeric_with_comma, parts))


def _read_rows(lines: Sequence[str]) -> tuple[list[PeakRow], _Layout]:
    layout: _Layout | None = None
    rows: list[PeakRow] = []
    for number, line in enumerate(lines, start=1):
        if _is_remark(line):
            continue
        if layout is None:
            layout = _find_layout(lines, number)
            if layout.header:
                continue
        rows.append(_row(layout, line, number))
        if len(rows) > MOST_ROWS:
            break
    if layout is None or not rows:
        raise SpectrumError("no row of numbers", remedy="give one m/z and one intensity a row")
    return rows, layout


def _find_layout(lines: Sequence[str], number: int) -> _Layout:
    """Tell the layout from the first row that is no remark, at line ``number``, and some rows below it."""
    sample = [line for line in lines[number - 1 : number + 4 * _SAMPLE] if not _is_remark(line)]
    named = not any(_rows_cut_by(mark, sample[:1]) for mark in _DELIMITERS)
    data = sample[1:] if named else sample
    fitting = _fitting_delimiters(data)
    if not fitting:
        raise FormatError(
            f"no delimiter cuts {quoted(sample[0].strip())} and the rows below into numbers",
            place=f"line {number}",
            remedy="use comma, semicolon, tab or blanks between m/z and intensity",
        )
    delimiter = fitting[0]
    decimal_comma = delimiter != "," and any("," in row for row in data)
    if named:
        return _named_layout(_cut(sample[0], delimiter), delimiter, decimal_comma, number)
    if delimiter == "," and any(map(_may_hide_decimals, data)):
        raise FormatError(
            f"the commas of {quoted(data[0].strip())} may be decimal commas",
            place=f"line {number}",
            remedy="part the columns by semicolons or tabs, or name them in a first row",
        )
    return _Layout(delimiter, decimal_comma, 0, 1, ())


def _may_hide_decimals(row: str) -> bool:
    """Tell whether a row cut at commas could be two numbers with decimal commas: ``57,07,100,5``."""
    cells = _cut(row, ",")
    return len(cells) > 2 and all(map(str.isdigit, cells)) and (len(cells) == 4 or cells[1][:1] == "0")


def _named_layout(header: list[str], delimiter: str | None, decimal_comma: bool, number: int) -> _Layout:
    positions = []
    for what, names in (("m/z", names_mz), ("intensity", names_intensity)):
        at = [index for index, cell in enumerate(header) if names(cell)]
        if not at:
            raise FormatError(
                f"no column is named {what} among {quoted(', '.join(header))}",
                place=f"line {number}",
                remedy="name the columns m/z and intensity",
            )
        positions.append(at[0])
    return _Layout(delimiter, decimal_comma, positions[0], positions[1], tuple(header))


def _row(layout: _Layout, line: str, number: int) -> PeakRow:
    cells = layout.cells(line)
    if len(cells) <= max(layout.mz, layout.intensity):
        raise FormatError(
            f"{quoted(line.strip())} has no {'intensity' if layout.intensity >= len(cells) else 'm/z'}",
            place=f"line {number}",
            remedy="give one m/z and one intensity a row",
        )
    mz, height = (layout.number(cells[at], number) for at in (layout.mz, layout.intensity))
    return PeakRow(number, parse_number(mz, "m/z", number), parse_number(height, "intensity", number))


def _check_unnamed(mz: FloatArray, intensity: FloatArray, line: int) -> None:
    """Refuse columns that, without names, do not look like m/z and then intensity."""
    if mz.size < _FEW_ROWS:
        return
    if np.array_equal(mz, np.arange(1, mz.size + 1)):
        problem = f"the first column counts from 1 to {mz.size}: row numbers, not m/z"
    elif (np.diff(intensity) > 0).all() and not (np.diff(mz) > 0).all():
        problem = "the second column rises from row to row as m/z does, the first does not"
    else:
        return
    raise SpectrumError(
        problem, place=f"line {line}", remedy="put m/z first, or name the columns in a first row"
    )


def _check_spacing(mz: FloatArray, line: int) -> None:
    steps = np.diff(mz)
    if mz.size < _PROFILE_ROWS or not np.isfinite(steps).all():
        return
    if 0 < steps.max() < _WIDEST_PROFILE_STEP and np.ptp(steps) <= 0.05 * steps.max():
        raise SpectrumError(
            f"the m/z column rises evenly by about {steps.mean():.3g}: a profile or a time axis, not peaks",
            place=f"line {line}",
            remedy="give centroided peaks, with m/z in the first column or in a column of that name",
        )
