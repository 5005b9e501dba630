"""MassBank record format 2: tagged lines, a peak table, and ``//`` at the end of each record.

Source: the MassBank project's description of its record format, version 2 (from memory), and the records
themselves.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from branchpos.errors import FormatError, InputError, SpectrumError, TruncatedError
from branchpos.reading.assembly import MOST_ROWS, Details, PeakRow, assemble
from branchpos.reading.ionisation import ionisation_warnings
from branchpos.reading.numerals import parse_number
from branchpos.reading.shifted_decimals import doubtful_intensities, shift_warning
from branchpos.spectrum import Spectrum

_TAG = re.compile(r"([A-Z]{2,}(?:[_$][A-Z_]+)?):(?:\s+(.*)|$)")
_OPENING = re.compile(r"(?:ACCESSION|RECORD_TITLE|(?:CH|AC|MS|PK)\$[A-Z_]+):")
_SUBTAGGED = frozenset(
    (
        "AC$MASS_SPECTROMETRY",
        "AC$CHROMATOGRAPHY",
        "MS$FOCUSED_ION",
        "MS$DATA_PROCESSING",
        "CH$LINK",
        "SP$LINK",
    )
)
_COLUMNS = ("m/z", "int.", "rel.int.")
_END = "//"


@dataclass(slots=True)
class _Record:
    """The lines of one record, sorted by tag; peak rows apart, each with its line number."""

    first_line: int
    fields: dict[str, list[str]] = field(default_factory=dict)
    rows: list[tuple[int, list[str]]] = field(default_factory=list)
    columns: tuple[str, ...] = _COLUMNS

    def text(self, tag: str) -> str:
        return "; ".join(self.fields.get(tag, ()))

    def analytical(self, *names: str) -> str:
        """Return the first of some subtags of the analytical conditions that is there."""
        tags = (f"AC${group}: {name}" for name in names for group in ("MASS_SPECTROMETRY", "CHROMATOGRAPHY"))
        return next((self.text(tag) for tag in tags if tag in self.fields), "")

    @property
    def place(self) -> str:
        name = self.text("ACCESSION").strip()
        return f"record {name[:60]} (line {self.first_line})" if name else f"record at line {self.first_line}"


def looks_like(lines: Sequence[str]) -> bool:
    """Tell from the head of a file whether it holds MassBank records."""
    return any(_OPENING.match(line) for line in lines)


def read_lines(lines: Sequence[str]) -> Iterator[Spectrum | InputError]:
    """Yield each record's spectrum, or what is wrong with it."""
    for first, last, closed in _spans(lines):
        try:
            record = _sort_lines(lines, first, last)
            if not closed:
                raise TruncatedError(
                    f"the record stops without {_END}, after {len(record.rows)} peak rows",
                    place=record.place,
                    remedy="fetch the record again",
                )
            yield _spectrum(record)
        except InputError as fault:
            yield fault.located(place=f"record at line {first + 1}")


def _spans(lines: Sequence[str]) -> Iterator[tuple[int, int, bool]]:
    """Yield (first line, line after the last, whether closed by its end mark) of each record, from 0."""
    first: int | None = None
    for at, line in enumerate(lines):
        if line.rstrip() == _END:
            if first is not None:
                yield first, at, True
            first = None
        elif first is None:
            first = at if line.strip() else None
        elif line.startswith("ACCESSION:"):
            yield first, at, False
            first = at
    if first is not None:
        yield first, len(lines), False


def _sort_lines(lines: Sequence[str], first: int, last: int) -> _Record:
    record, tag = _Record(first + 1), ""
    for at in range(first, last):
        line = lines[at]
        found = _TAG.match(line)
        if found:
            tag = _open_field(record, found.group(1), found.group(2) or "")
        elif tag == "PK$PEAK" and line.strip():
            record.rows.append((at + 1, line.split()))
        elif tag and line.startswith("  "):
            record.fields[tag].append(line.strip())
        elif line.strip():
            raise FormatError(
                f"{line.strip()[:40]!r} is neither a tag nor a row of a table",
                place=f"line {at + 1}",
                remedy="correct or remove the line",
            )
        if len(record.rows) > MOST_ROWS:
            break
    return record


def _open_field(record: _Record, tag: str, value: str) -> str:
    if tag == "PK$PEAK":
        record.columns = tuple(value.lower().split()) or _COLUMNS
    elif tag in _SUBTAGGED:
        subtag, _, rest = value.strip().partition(" ")
        tag, value = (f"{tag}: {subtag}", rest) if rest else (tag, value)
    record.fields.setdefault(tag, []).append(value.strip())
    return tag


def _spectrum(record: _Record) -> Spectrum:
    printed = _intensity_column(record)
    rows = [
        PeakRow(line, parse_number(cells[0], "m/z", line), parse_number(text, "intensity", line))
        for (line, cells), text in zip(record.rows, printed, strict=True)
    ]
    flags = doubtful_intensities(printed)
    details = Details(
        place=record.place,
        title=record.text("RECORD_TITLE"),
        metadata={tag: "; ".join(values) for tag, values in record.fields.items() if tag != "PK$PEAK"},
        retention_index=record.analytical("KOVATS_RTI", "RETENTION_INDEX"),
        mass_range=record.analytical("SCAN_RANGE_M/Z", "MASS_RANGE_M/Z"),
        stated_peaks=record.text("PK$NUM_PEAK"),
        notes=[*_condition_warnings(record), *shift_warning(flags)],
    )
    return assemble(rows, details, flags if any(flags) else None)


def _intensity_column(record: _Record) -> list[str]:
    """Return the intensities as printed, from the column that tells more values apart.

    MSBNK-MSSJ-MSJ00076 rounds ``int.`` to whole per cent of the base peak and keeps three digits in
    ``rel.int.``; the JP series does the opposite. Where neither is finer, ``int.`` is as measured.
    """
    columns = [at for at, name in enumerate(record.columns) if name in _COLUMNS[1:]]
    if not columns or record.columns[0] != _COLUMNS[0]:
        raise SpectrumError(
            f"the peak table has columns {' '.join(record.columns)[:60]!r}",
            place=record.place,
            remedy=f"the table needs {' '.join(_COLUMNS)}",
        )
    for line, cells in record.rows:
        if len(cells) != len(record.columns):
            raise FormatError(
                f"{len(cells)} values where the table has {len(record.columns)} columns",
                place=f"line {line}",
                remedy="correct or remove the row",
            )
        for at in columns:
            parse_number(cells[at], "intensity", line)
    candidates = [[cells[at] for _, cells in record.rows] for at in columns]
    return max(candidates, key=lambda texts: len({float(text) for text in texts}))


def _condition_warnings(record: _Record) -> list[str]:
    stage = record.analytical("MS_TYPE")
    notes = ionisation_warnings(
        methods=[record.analytical("IONIZATION")],
        polarity=record.analytical("ION_MODE"),
        energy=record.analytical("IONIZATION_ENERGY"),
        instrument=record.text("AC$INSTRUMENT_TYPE"),
    )
    if stage and stage != "MS":
        notes.append(f"not a full scan: MS_TYPE {stage[:20]}")
    return notes
