"""The formats that spectra are read from, and which of them a file is in, told by its content."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from typing import NamedTuple

from branchpos.errors import FormatError, InputError
from branchpos.reading import jcamp_dx, key_value_text, massbank, peak_list
from branchpos.reading.numerals import quoted
from branchpos.reading.text_source import SourceText
from branchpos.spectrum import Spectrum

_HEAD_LINES = 1_000
_HEAD_CHARACTERS = 65_536


class Format(NamedTuple):
    """One format: its name, how it is recognised, how it is read, and whether its blocks have an end mark."""

    name: str
    looks_like: Callable[[Sequence[str]], bool]
    read_lines: Callable[[Sequence[str]], Iterator[Spectrum | InputError]]
    has_end_mark: bool


FORMATS = (
    Format("MassBank record", massbank.looks_like, massbank.read_lines, True),
    Format("JCAMP-DX", jcamp_dx.looks_like, jcamp_dx.read_lines, True),
    Format("text with keys", key_value_text.looks_like, key_value_text.read_lines, False),
    Format("peak list", peak_list.looks_like, peak_list.read_lines, False),
)
"""Tried in this order, the most telling first. A new format is one file and one line here."""

_OTHER_TEXTS = (
    ("<mzml", "a GC-MS run in mzML", "give it to `branchpos screen`"),
    ("<indexedmzml", "a GC-MS run in mzML", "give it to `branchpos screen`"),
    ("<!doctype", "a web page", "save the spectrum itself"),
    ("<html", "a web page", "save the spectrum itself"),
    ("<?xml", "an XML file", "export the spectrum as text"),
    ("{", "a JSON file", "export the spectrum as text"),
    ("[", "a JSON file", "export the spectrum as text"),
)


def recognise(source: SourceText) -> Format:
    """Return the format that a file's head is in.

    Raises
    ------
    FormatError : no format fits.
    """
    head = _head(source.lines)
    _refuse_other_texts(head, source.file)
    for candidate in FORMATS:
        if candidate.looks_like(head):
            return candidate
    first = next((line.strip() for line in head if line.strip()), "")
    raise FormatError(
        f"no format fits a file that begins {quoted(first)}",
        file=source.file,
        remedy=f"give one of: {', '.join(known.name for known in FORMATS)}",
    )


def _head(lines: Sequence[str]) -> list[str]:
    head, length = [], 0
    for line in lines[:_HEAD_LINES]:
        head.append(line[:_HEAD_CHARACTERS])
        length += len(line)
        if length > _HEAD_CHARACTERS:
            break
    return head


def _refuse_other_texts(head: Sequence[str], file: str) -> None:
    start = "\n".join(head[:20]).lstrip()[:2000].lower()
    if not start.startswith(("<", "{", "[")):
        return
    for mark, kind, remedy in _OTHER_TEXTS:
        if start.startswith(mark) or (mark.startswith("<") and mark in start):
            raise FormatError(f"the file is {kind}, not a spectrum", file=file, remedy=remedy)
