"""mzML 1.1: a run read while its XML streams past, so that memory follows the numbers, not their text.

Source: HUPO-PSI mzML 1.1.0 and its controlled vocabulary, whose accession numbers stand beside their meaning.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping
from functools import lru_cache
from math import isfinite
from typing import NamedTuple
from xml.etree import ElementTree as ET

import numpy as np

from branchpos.errors import FormatError, InputError, TruncatedError
from branchpos.reading.ionisation import ionisation_warnings
from branchpos.reading.mzml_arrays import INTENSITY_ARRAY, MZ_ARRAY, Unpacked, decode_array
from branchpos.reading.numerals import leading_number, quoted
from branchpos.reading.run_assembly import RunDetails, ScanCollector, assemble_run, profile_error
from branchpos.run import Run

Terms = dict[str, Mapping[str, str]]
"""The controlled terms of an element by accession number, each with its name, value and unit."""

_LEVEL, _FIRST_LEVEL, _HIGHER_LEVEL = "MS:1000511", "MS:1000579", "MS:1000580"
_PROFILE, _CENTROID = "MS:1000128", "MS:1000127"
_NEGATIVE = "MS:1000129"
_START_TIME = "MS:1000016"
_WINDOW_FROM, _WINDOW_TO = "MS:1000501", "MS:1000500"
_SECONDS = {
    "UO:0000010": 1.0,
    "UO:0000028": 0.001,
    "UO:0000031": 60.0,
    "MS:1000039": 1.0,
    "MS:1000038": 60.0,
    "second": 1.0,
    "minute": 60.0,
}
"""Seconds in each unit of time, by accession number of today and of the first edition, and by name."""
_SCAN_NUMBER = re.compile(r"(?:^|\s)scan(?:Id)?=(\d{1,15})(?:\s|$)")
_LENGTH = re.compile(r"\d{1,10}")


class _Scan(NamedTuple):
    """What stands about one scan outside its arrays."""

    number: int
    place: str
    terms: Terms
    element: ET.Element


class _Reader:
    """What is gathered on the way through the file."""

    def __init__(self, file: str) -> None:
        self.scans = ScanCollector()
        self.groups: dict[str, list[Mapping[str, str]]] = {}
        self.metadata: dict[str, str] = {"format": "mzML"}
        self.details = RunDetails(file=file, metadata=self.metadata)
        self.windows: list[tuple[float, float]] = []
        self.sources: list[str] = []
        self.skipped: dict[str, int] = {}
        self.negative = 0
        self.announced: int | None = None
        self.seen = 0
        self.list_ended = False

    def take(self, event: str, element: ET.Element) -> None:
        """Take the start tag or the whole of an element; let go of what nothing refers to any more."""
        name = _name(element.tag)
        if event == "start":
            if name in ("spectrumList", "run"):
                self._begin(name, element)
        elif name in _TAKEN:
            _TAKEN[name](self, element)
            if name in _LET_GO:
                element.clear()

    def _begin(self, name: str, element: ET.Element) -> None:
        count = element.get("count", "")
        if name == "run":
            self.metadata |= {f"run {key}": value for key, value in element.attrib.items() if value}
        elif _LENGTH.fullmatch(count):
            self.announced = int(count)

    def _take_nothing(self, element: ET.Element) -> None:
        """Pass over an element that is only there to be let go of."""

    def _end_list(self, element: ET.Element) -> None:
        self.list_ended = True

    def _take_source_file(self, element: ET.Element) -> None:
        self.metadata.setdefault("source file", element.get("name", ""))

    def _take_group(self, element: ET.Element) -> None:
        self.groups[element.get("id", "")] = [term.attrib for term in _children(element, "cvParam")]

    def _take_instrument(self, element: ET.Element) -> None:
        for name, term in ((term.get("name", ""), term) for term in self.terms(element).values()):
            self.metadata.setdefault("instrument", f"{name} {term.get('value', '')}".strip())
        for part in element.iter():
            if _name(part.tag) == "source":
                self.sources += [
                    term.get("name", "")
                    for term in self.terms(part).values()
                    if "ioni" in term.get("name", "")
                ]

    def terms(self, element: ET.Element) -> Terms:
        """Return the terms of an element, those of the parameter groups it refers to included."""
        found: Terms = {}
        for child in element:
            name = _name(child.tag)
            if name == "cvParam":
                found[child.get("accession", "")] = child.attrib
            elif name == "referenceableParamGroupRef":
                for term in self.groups.get(child.get("ref", ""), ()):
                    found.setdefault(term.get("accession", ""), term)
        return found

    def _take_spectrum(self, element: ET.Element) -> None:
        self.seen += 1
        name = element.get("id", "")
        told = _SCAN_NUMBER.search(name)
        number = int(told.group(1)) if told else self.seen
        place = f"scan {number}" if told or not name else f"scan {number} ({quoted(name)})"
        scan = _Scan(number, place, self.terms(element), element)
        kind = _kind(scan.terms)
        if kind:
            self.skipped[kind] = self.skipped.get(kind, 0) + 1
            return
        if _PROFILE in scan.terms:
            raise profile_error(place)
        try:
            self._take_scan(scan)
        except InputError as fault:
            self.details.faults.append(fault.located(place=place))

    def _take_scan(self, scan: _Scan) -> None:
        events = [
            part for holder in _children(scan.element, "scanList") for part in _children(holder, "scan")
        ]
        time = _start_time([self.terms(event) for event in events])
        arrays = self._arrays(scan.element)
        mz, intensity = (arrays.get(kind, np.zeros(0)) for kind in (MZ_ARRAY, INTENSITY_ARRAY))
        if mz.size != intensity.size:
            raise FormatError(
                f"{mz.size} m/z values but {intensity.size} intensities", remedy="convert the run again"
            )
        self.scans.add(scan.number, time, mz, intensity)
        self.negative += _NEGATIVE in scan.terms
        for event in events:
            for holder in _children(event, "scanWindowList"):
                self._take_windows(holder)

    def _arrays(self, spectrum: ET.Element) -> dict[str, Unpacked]:
        """Decode the arrays of m/z and intensity; others (charge, noise) are passed over."""
        arrays: dict[str, Unpacked] = {}
        announced = _length(spectrum.get("defaultArrayLength", "0"))
        lists = _children(spectrum, "binaryDataArrayList")
        for holder in (array for one in lists for array in _children(one, "binaryDataArray")):
            terms = self.terms(holder)
            kind = next((one for one in (MZ_ARRAY, INTENSITY_ARRAY) if one in terms), None)
            if kind is None:
                continue
            length = _length(holder.get("arrayLength", str(announced)))
            text = "".join(one.text or "" for one in _children(holder, "binary"))
            arrays[kind] = decode_array(text, terms, length) if text.strip() or length else np.zeros(0)
        if announced and len(arrays) < 2:
            raise FormatError("an array of m/z or intensity is missing", remedy="convert the run again")
        return arrays

    def _take_windows(self, holder: ET.Element) -> None:
        for window in _children(holder, "scanWindow"):
            terms = self.terms(window)
            first, last = (
                leading_number(terms[term].get("value", "")) if term in terms else None
                for term in (_WINDOW_FROM, _WINDOW_TO)
            )
            if first is not None and last is not None:
                self.windows.append((first, last))


_TAKEN: Mapping[str, Callable[[_Reader, ET.Element], None]] = {
    "spectrum": _Reader._take_spectrum,
    "spectrumList": _Reader._end_list,
    "referenceableParamGroup": _Reader._take_group,
    "instrumentConfiguration": _Reader._take_instrument,
    "sourceFile": _Reader._take_source_file,
    "chromatogram": _Reader._take_nothing,
    "offset": _Reader._take_nothing,
}
_LET_GO = ("spectrum", "chromatogram", "offset")


def read_chunks(chunks: Iterable[bytes], file: str = "") -> Run:
    """Read one run.

    Parameters
    ----------
    chunks : the bytes of the file, unpacked, in pieces of any size; an ``InputError`` where they stop early.
    file : the path as the user gave it.

    Raises
    ------
    InputError : no scan of the first level can be read, or scans are profiles.
    """
    reader = _Reader(file)
    try:
        _follow(chunks, reader.take)
    except (TruncatedError, _BrokenError) as stop:
        _note_stop(reader, stop)
    except InputError as fault:
        raise fault.located(file=file) from None
    return _finish(reader)


class _BrokenError(FormatError):
    """The XML cannot be followed any further."""


def _follow(chunks: Iterable[bytes], take: Callable[[str, ET.Element], None]) -> None:
    """Hand over start and end of every element; every whole one before the place where the file breaks."""
    parser: ET.XMLPullParser[ET.Element] = ET.XMLPullParser(("start", "end"))
    stop: FormatError | None = None
    try:
        for chunk in chunks:
            _feed(parser, chunk)
            _hand_over(parser, take)
    except TruncatedError as reason:
        stop = reason
    try:
        parser.close()
    except ET.ParseError as reason:
        line, column = reason.position
        stop = stop or TruncatedError(f"the XML stops at line {line}, column {column + 1}")
    # The parser may hold back what it has not been sure of until now.
    _hand_over(parser, take)
    if stop:
        raise stop


def _feed(parser: ET.XMLPullParser[ET.Element], chunk: bytes) -> None:
    try:
        parser.feed(chunk)
    except (ValueError, LookupError) as reason:
        raise _BrokenError(f"the XML cannot be decoded: {reason}") from None


def _hand_over(parser: ET.XMLPullParser[ET.Element], take: Callable[[str, ET.Element], None]) -> None:
    try:
        for event in parser.read_events():
            element = event[-1]
            if isinstance(element, ET.Element):
                take(event[0], element)
    except ET.ParseError as reason:
        raise _BrokenError(f"the XML is broken: {reason}") from None


def _note_stop(reader: _Reader, stop: FormatError) -> None:
    """Tell a loss from a cut behind the last scan, which costs nothing."""
    if reader.list_ended:
        reader.details.notes.append(f"{stop.problem}, behind the last scan; no scan is missing")
    else:
        reader.details.cut = stop.problem


def _finish(reader: _Reader) -> Run:
    details = reader.details
    details.windows = reader.windows
    if len(reader.scans) == 0 and not details.faults and not details.cut:
        raise _no_scan(reader)
    announced = reader.announced
    if announced is not None and reader.seen < announced:
        words = f"{reader.seen} of {announced} spectra announced"
        details.cut = f"{details.cut}; {words}" if details.cut else f"the file holds only {words}"
    elif announced is not None and reader.seen > announced:
        details.notes.append(f"{reader.seen} spectra where the file announces {announced}; all were read")
    details.notes += [f"{count} of {kind} left out" for kind, count in reader.skipped.items()]
    polarity = "negative" if reader.negative else ""
    details.notes += ionisation_warnings(methods=dict.fromkeys(reader.sources), polarity=polarity)
    return assemble_run(reader.scans.table(), details)


def _no_scan(reader: _Reader) -> FormatError:
    others = ", ".join(f"{count} of {kind}" for kind, count in reader.skipped.items())
    return FormatError(
        f"the file holds no scan of the first level{f', only {others}' if others else ''}",
        file=reader.details.file,
        remedy="convert the run again with its full scans",
    )


def _kind(terms: Terms) -> str:
    """Name a spectrum that is no full scan; nothing for one that is."""
    level = leading_number(terms[_LEVEL].get("value", "")) if _LEVEL in terms else None
    if level is not None and level > 1:
        return f"level {level:g} (fragments of chosen ions)"
    if level is None and _HIGHER_LEVEL in terms:
        return "a higher level (fragments of chosen ions)"
    if level is None and _FIRST_LEVEL not in terms and not terms.keys() & {_PROFILE, _CENTROID}:
        return "another kind, no mass spectra"
    return ""


def _start_time(events: list[Terms]) -> float:
    term = next((event[_START_TIME] for event in events if _START_TIME in event), None)
    if term is None:
        raise FormatError("the scan has no start time", remedy="convert the run again with retention times")
    value = leading_number(term.get("value", ""))
    if value is None or not isfinite(value):
        raise FormatError(
            f"the start time is {quoted(term.get('value', ''))}, not a number", remedy="convert the run again"
        )
    unit = _SECONDS.get(term.get("unitAccession", ""), _SECONDS.get(term.get("unitName", "")))
    if unit is None:
        told = quoted(term.get("unitName", "") or term.get("unitAccession", ""))
        raise FormatError(
            f"the start time {value:g} is in {told}, neither seconds nor minutes",
            remedy="convert the run again with units of time",
        )
    return value * unit


def _length(text: str) -> int:
    if not _LENGTH.fullmatch(text):
        raise FormatError(f"an array length is {quoted(text)}, not a number", remedy="convert the run again")
    return int(text)


@lru_cache(maxsize=256)
def _name(tag: str) -> str:
    """Return the name of an element without its namespace."""
    return tag.rpartition("}")[2]


def _children(element: ET.Element, name: str) -> list[ET.Element]:
    return [child for child in element if _name(child.tag) == name]
