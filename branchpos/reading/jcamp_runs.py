"""JCAMP-DX runs: the pages of an n-tuple block, one mass spectrum a page, each with its retention time.

Source: Lampen, Hillig, Davies and Linscheid, Appl. Spectrosc. 48 (1994) 1545, for mass spectra in pages.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from branchpos.errors import FormatError, InputError, TruncatedError
from branchpos.reading.ionisation import ionisation_warnings
from branchpos.reading.jcamp_blocks import normalise_label
from branchpos.reading.numerals import counted, is_numeric, leading_number, quoted
from branchpos.reading.run_assembly import RunDetails, ScanCollector, assemble_run, profile_error
from branchpos.reading.text_source import LONGEST_LINE
from branchpos.run import Run

_LABEL = re.compile(r"\s*##([^=]{0,80})=(.*)", re.DOTALL)
_TABLES = ("DATATABLE", "PEAKTABLE", "XYDATA", "XYPOINTS")
_PAIRS = re.compile(r"\s*\(\s*(?:XY\s*\.\.\s*XY|XI\s*\.\.\s*XI)\s*\)\s*(?:,\s*(\w+)\s*$)?", re.IGNORECASE)
_PAGE_TIME = re.compile(r"(?:^|,)\s*(?:T|RT|TIME|RETENTION\s*TIME)\s*=\s*([^,]*)", re.IGNORECASE)
_CLOCK = re.compile(r"(\d{1,4}):(\d{1,2}(?:\.\d*)?)")
_TIME_LABELS = ("RETENTIONTIME", ".RETENTIONTIME", "$RETENTIONTIME")
_SCAN_LABELS = ("SCANNUMBER", ".SCANNUMBER", "$SCANNUMBER")
_PAGE_LABELS = ("PAGE", "NPOINTS", *_TIME_LABELS, *_SCAN_LABELS)
_MISSING_VALUE = re.compile(r"[,;]\s*[,;]|^\s*[,;]|,\s*$")
_SEPARATORS = str.maketrans(",;", "  ")


class _Entry(NamedTuple):
    """One labelled record: its line, normalised label, text behind ``=``, and the lines that follow."""

    line: int
    label: str
    value: str
    body: list[str]


class _Reader:
    """What is gathered on the way through the file."""

    def __init__(self, file: str) -> None:
        self.scans = ScanCollector()
        self.header: dict[str, str] = {}
        self.page: dict[str, str] = {}
        self.details = RunDetails(file=file)
        self.open_blocks = 0
        self.ended = False
        self.pages = 0
        self.unit_stated = True

    def take(self, entry: _Entry) -> None:
        """Take one whole labelled record."""
        if entry.label in ("TITLE", "END"):
            self.open_blocks += 1 if entry.label == "TITLE" else -1
            self.ended = self.open_blocks <= 0
            if not self.pages:
                # What an outer block says about itself does not hold for the run inside.
                self.header.clear()
        if entry.label in ("END", "ENDNTUPLES"):
            self.page = {}
        elif entry.label in _TABLES:
            self._take_table(entry)
        elif entry.label in _PAGE_LABELS:
            if entry.label == "PAGE":
                self.page = {}
            self.page[entry.label] = entry.value
        elif entry.value:
            self.header.setdefault(entry.label, entry.value)

    def _take_table(self, entry: _Entry) -> None:
        self.pages += 1
        told = leading_number(next((self.page[label] for label in _SCAN_LABELS if label in self.page), ""))
        number = int(told) if told is not None and 0 <= told < 1e15 else self.pages
        try:
            time = self._time()
            mz, intensity = _points(entry, self._factors())
            stated = leading_number(self.page.get("NPOINTS", ""))
            if stated is not None and stated != mz.size:
                raise FormatError(
                    f"{counted(mz.size, 'pair')} where the page announces {stated:g}",
                    remedy="export the run again",
                )
            self.scans.add(number, time, mz, intensity)
        except _ProfileError:
            raise profile_error(f"page {self.pages}, line {entry.line}") from None
        except InputError as fault:
            place = f"page {self.pages}, {fault.place or f'line {entry.line}'}"
            self.details.faults.append(type(fault)(fault.problem, place=place, remedy=fault.remedy))
        self.page = {}

    def _time(self) -> float:
        """Return the retention time of the page [s]."""
        found = _PAGE_TIME.search(self.page.get("PAGE", ""))
        text = next((self.page[label] for label in _TIME_LABELS if label in self.page), "")
        text = (found.group(1) if found else text).strip()
        clock = _CLOCK.fullmatch(text)
        if clock:
            return 60.0 * float(clock.group(1)) + float(clock.group(2))
        value = leading_number(text)
        if value is None:
            told = f"retention time is {quoted(text)}" if text else "the page has no retention time"
            raise FormatError(told, remedy="export each scan as ##PAGE= T=<retention time>")
        return value * self._unit(text)

    def _unit(self, text: str) -> float:
        """Return the seconds in the unit of a time: stated beside it, or for the variable, else 1."""
        words = text.lower().lstrip("+-.0123456789e ") or self._of_symbol("UNITS", "T").lower()
        if words.startswith("min"):
            return 60.0
        self.unit_stated = self.unit_stated and words.startswith("s")
        return 1.0

    def _of_symbol(self, label: str, symbol: str) -> str:
        """Return what a list of the n-tuple block holds for one of its variables."""
        symbols = [name.strip().upper() for name in self.header.get("SYMBOL", "").split(",")]
        given = [text.strip() for text in self.header.get(label, "").split(",")]
        return dict(zip(symbols, given, strict=False)).get(symbol, "")

    def _factors(self) -> tuple[float, float]:
        """Return what m/z and intensity as printed are multiplied with."""
        x = leading_number(self._of_symbol("FACTOR", "X") or self.header.get("XFACTOR", ""))
        y = leading_number(
            self._of_symbol("FACTOR", "Y") or self._of_symbol("FACTOR", "I") or self.header.get("YFACTOR", "")
        )
        return (1.0 if x is None else x, 1.0 if y is None else y)


class _ProfileError(FormatError):
    """The table says that it is a profile."""


def read_chunks(chunks: Iterable[bytes], file: str = "") -> Run:
    """Read one run.

    Parameters
    ----------
    chunks : the bytes of the file, unpacked, in pieces of any size; an ``InputError`` where they stop early.
    file : the path as the user gave it.

    Raises
    ------
    InputError : no page can be read, or pages are profiles.
    """
    reader = _Reader(file)
    try:
        stop = _follow(chunks, reader)
        if stop and not reader.ended:
            reader.details.cut = stop
        elif stop:
            reader.details.notes.append(f"{stop}, behind the last page; no scan is missing")
        return _finish(reader)
    except InputError as fault:
        raise fault.located(file=file) from None


def _follow(chunks: Iterable[bytes], reader: _Reader) -> str:
    """Hand over every whole record, and say why the file stops early, if it does.

    A record is whole when the next one begins: the last number before a cut may have lost its end.
    """
    entry: _Entry | None = None
    number = 0
    try:
        for number, line in enumerate(_lines(chunks), start=1):
            text = line.partition("$$")[0]
            found = _LABEL.match(text) if "##" in text else None
            if found:
                if entry is not None:
                    reader.take(entry)
                entry = _Entry(number, normalise_label(found.group(1)), found.group(2).strip(), [])
            elif entry is not None:
                entry.body.append(text)
    except TruncatedError as stop:
        return f"{stop.problem} at line {number + 1}"
    if entry is not None and entry.label == "END":
        reader.take(entry)
    return "" if reader.ended else f"the text stops at line {number} without ##END="


def _lines(chunks: Iterable[bytes]) -> Iterator[str]:
    """Yield whole lines; the last one even without an end, unless the data are cut there."""
    rest = b""
    for chunk in chunks:
        pieces = (rest + chunk).splitlines(keepends=True)
        # A carriage return at the border may be half of a line end.
        rest = pieces.pop() if pieces else b""
        if len(rest) > LONGEST_LINE:
            raise FormatError(
                f"a line holds more than {LONGEST_LINE} characters", remedy="break it into one peak a line"
            )
        for piece in pieces:
            yield _decode(piece)
    if rest:
        yield _decode(rest)


def _decode(line: bytes) -> str:
    try:
        return line.decode("utf-8")
    except UnicodeDecodeError:
        return line.decode("latin-1")


def _points(entry: _Entry, factors: tuple[float, float]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    form = _PAIRS.match(entry.value)
    if form is None:
        raise FormatError(
            f"the table is of the form {quoted(entry.value)}", remedy="export the peaks as (XY..XY), PEAKS"
        )
    if (form.group(1) or "").upper().startswith("PROFILE"):
        raise _ProfileError("the table is a profile")
    lines = [entry.value[form.end() :], *entry.body]
    text = " ".join(lines)
    try:
        values = np.array([float(cell) for cell in text.translate(_SEPARATORS).split()])
    except ValueError:
        raise _bad_line(entry, lines) from None
    if values.size % 2 or "_" in text or any(_MISSING_VALUE.search(line) for line in lines):
        raise _bad_line(entry, lines)
    return values[0::2] * factors[0], values[1::2] * factors[1]


def _bad_line(entry: _Entry, lines: list[str]) -> FormatError:
    """Find the first line that is no list of pairs."""
    for number, line in enumerate(lines, start=entry.line):
        cells = line.translate(_SEPARATORS).split()
        odd = len(cells) % 2 or _MISSING_VALUE.search(line)
        if odd or not all(map(is_numeric, cells)):
            return FormatError(
                f"{quoted(line.strip())} is no list of m/z and intensity",
                place=f"line {number}",
                remedy="export the run again",
            )
    return FormatError("the page is no list of m/z and intensity", remedy="export the run again")


def _finish(reader: _Reader) -> Run:
    details, header = reader.details, reader.header
    if reader.pages == 0 and not details.cut:
        raise FormatError(
            "no block holds scans in pages", remedy="give a block of DATA CLASS NTUPLES with ##PAGE= T=<time>"
        )
    if "MASS" not in header.get("DATATYPE", "MASS").upper():
        raise FormatError(
            f"the data type is {quoted(header['DATATYPE'])}", remedy="give a run of DATA TYPE MASS SPECTRUM"
        )
    details.metadata = {"format": "JCAMP-DX"} | header
    if not reader.unit_stated:
        details.notes.append("the unit of the retention times is not stated; taken as seconds")
    details.notes += ionisation_warnings(
        methods=[header.get(".IONIZATIONMODE", "")], energy=header.get(".IONIZATIONENERGY", "")
    )
    return assemble_run(reader.scans.table(), details)
