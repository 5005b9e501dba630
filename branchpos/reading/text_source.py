"""From the bytes of a file to lines of text: gzip, encodings, line ends, files that are no text."""

from __future__ import annotations

import codecs
import zlib
from dataclasses import dataclass
from pathlib import Path

from branchpos.errors import FormatError, InputError

LARGEST_FILE = 32_000_000
"""Bytes of text that are read at most; some 15,000 spectra. It bounds time and memory."""

LONGEST_LINE = 200_000
"""Characters of a line that are read at most; no spectrum needs longer ones. It bounds time."""

_GZIP = b"\x1f\x8b"
_BYTE_ORDER_MARKS = (
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)
_CONTROL_CHARACTERS = frozenset(map(chr, range(32))) - frozenset("\t\n\r\f\x0b\x1a\x1b")
_OTHER_KINDS = (
    (b"CDF\x01", "a GC-MS run in netCDF", "give it to `branchpos screen`"),
    (b"CDF\x02", "a GC-MS run in netCDF", "give it to `branchpos screen`"),
    (b"\x89HDF", "an HDF5 file", "export the spectrum as text"),
    (b"PK\x03\x04", "a zip archive or a spreadsheet", "unpack it, or export the sheet as delimited text"),
    (b"\xd0\xcf\x11\xe0", "an old office document", "export the sheet as delimited text"),
    (b"%PDF-", "a PDF document", "export the spectrum as text"),
    (b"\x89PNG", "a picture", "export the spectrum as text"),
    (b"\xff\xd8\xff", "a picture", "export the spectrum as text"),
    (b"SQLite format 3\0", "a database", "export the spectrum as text"),
)


@dataclass(frozen=True, slots=True)
class SourceText:
    """The text of a file.

    Attributes
    ----------
    file : the path as the user gave it.
    lines : the lines without their ends; line 1 of the file is ``lines[0]``.
    cut : true when the compressed data stop early, so that the last line or block may be missing its end.
    """

    file: str
    lines: list[str]
    cut: bool = False


def load_text(path: str | Path) -> SourceText:
    """Read a text file, plain or compressed with gzip.

    UTF-8 and UTF-16 with a byte-order mark, UTF-8 without one, and Latin-1 where the bytes are not UTF-8.
    Line ends may be LF, CR LF or CR.

    Raises
    ------
    InputError : the file cannot be opened.
    FormatError : the file is empty, not text, too large, or its compressed data are damaged.
    """
    file = str(path)
    data, cut = _read_bytes(file), False
    try:
        if data.startswith(_GZIP):
            data, cut = _decompress(data)
        _require_size(data)
        _refuse_other_kinds(data)
        text = _decode(data, cut)
        _refuse_binary(text)
    except InputError as fault:
        raise fault.located(file=file) from None
    lines = text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
    _require_line_length(lines, file)
    return SourceText(file, lines[:-1] if cut else lines, cut)


def _read_bytes(file: str) -> bytes:
    try:
        with Path(file).open("rb") as stream:
            data = stream.read(LARGEST_FILE + 1)
    except (OSError, ValueError) as reason:
        words = getattr(reason, "strerror", None) or str(reason)
        raise InputError(f"cannot be opened: {words}", file=file, remedy="check the path") from reason
    if not data:
        raise FormatError("the file is empty", file=file, remedy="export the spectrum again")
    return data


def _require_size(data: bytes) -> None:
    if len(data) > LARGEST_FILE:
        raise FormatError(
            f"the file holds more than {LARGEST_FILE // 1_000_000} MB, the most that is read as spectra",
            remedy="split it, or give a whole GC-MS run to `branchpos screen`",
        )
    if not data.strip(b"\0 \t\r\n"):
        raise FormatError("the file holds nothing but blanks", remedy="export the spectrum again")


def _require_line_length(lines: list[str], file: str) -> None:
    longest = max(range(len(lines)), key=lambda at: len(lines[at]))
    if len(lines[longest]) > LONGEST_LINE:
        raise FormatError(
            f"the line holds {len(lines[longest])} characters, more than the {LONGEST_LINE} that are read",
            file=file,
            place=f"line {longest + 1}",
            remedy="break it into one peak a line",
        )


def _decompress(data: bytes) -> tuple[bytes, bool]:
    """Return what gzip data hold, one member after another, and whether they stop early.

    No more than ``LARGEST_FILE`` + 1 bytes are ever expanded.
    """
    whole = bytearray()
    while data.startswith(_GZIP):
        member = zlib.decompressobj(wbits=31)
        try:
            whole += member.decompress(data, LARGEST_FILE + 1 - len(whole))
        except zlib.error as reason:
            raise FormatError(
                "the gzip data are damaged", remedy="copy the file again, or unpack it yourself"
            ) from reason
        if len(whole) > LARGEST_FILE:
            break
        if not member.eof:
            return _whole_or_nothing(bytes(whole)), True
        data = member.unused_data
    return bytes(whole), False


def _whole_or_nothing(data: bytes) -> bytes:
    if not data:
        raise FormatError("the gzip data stop before any text", remedy="copy the file again")
    return data


def _refuse_other_kinds(data: bytes) -> None:
    for magic, kind, remedy in _OTHER_KINDS:
        if data.startswith(magic):
            raise FormatError(f"the file is {kind}, not a spectrum in text form", remedy=remedy)


def _decode(data: bytes, cut: bool) -> str:
    for mark, encoding in _BYTE_ORDER_MARKS:
        if data.startswith(mark):
            return data.decode(encoding, errors="replace")
    try:
        # Data that stop early may stop inside a character; that alone does not make them Latin-1.
        return codecs.getincrementaldecoder("utf-8")().decode(data, final=not cut)
    except UnicodeDecodeError:
        return data.decode("latin-1")


def _refuse_binary(text: str) -> None:
    head = text[:65_536]
    if "\0" in text or sum(character in _CONTROL_CHARACTERS for character in head) > len(head) / 100:
        raise FormatError("the file is binary, not text", remedy="export the spectrum as text")
