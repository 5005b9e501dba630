"""Reading a whole GC-MS run: the file is recognised by its content, and unpacked while it is read."""

from __future__ import annotations

import zlib
from collections.abc import Callable, Iterable, Iterator
from itertools import chain
from pathlib import Path
from typing import NamedTuple

from branchpos.errors import FormatError, InputError, TruncatedError
from branchpos.reading import andi, jcamp_runs, mzml
from branchpos.reading.jcamp_dx import looks_like as looks_like_jcamp
from branchpos.reading.numerals import quoted
from branchpos.run import Run

_CHUNK = 1 << 16
_HEAD = 1 << 16
_UNPACKED = 1 << 13
"""Bytes unpacked at a time: so many are lost before a place where compressed data are damaged."""
_GZIP = b"\x1f\x8b"
_AS_MZML = "export or convert the run as mzML or ANDI netCDF (AIA)"


class RunFormat(NamedTuple):
    """One format of runs: its name, how it is recognised by its head, and how it is read."""

    name: str
    looks_like: Callable[[bytes], bool]
    read_chunks: Callable[[Iterable[bytes], str], Run]


def _is_netcdf(head: bytes) -> bool:
    return head.startswith((b"CDF\x01", b"CDF\x02"))


def _is_mzml(head: bytes) -> bool:
    text = _text(head).lstrip("\ufeff \t\r\n")
    return text.startswith("<") and any(mark in text for mark in ("<mzML", "<indexedmzML"))


def _is_jcamp(head: bytes) -> bool:
    return looks_like_jcamp(_text(head).splitlines())


RUN_FORMATS = (
    RunFormat("ANDI netCDF", _is_netcdf, andi.read_chunks),
    RunFormat("mzML", _is_mzml, mzml.read_chunks),
    RunFormat("JCAMP-DX with n-tuples", _is_jcamp, jcamp_runs.read_chunks),
)
"""Tried in this order. A new format of runs is one file and one line here."""

_OTHER_KINDS = (
    (b"\x89HDF", "netCDF-4 or another HDF5 file", "save it in the classic netCDF format, or export as mzML"),
    (b"CDF\x05", "netCDF with 64-bit data", "save it in the classic netCDF format, or export as mzML"),
    (b"PK\x03\x04", "a zip archive", "unpack it and give the run inside"),
    (b"SQLite format 3\0", "a database", "give the run itself, as mzML or ANDI netCDF"),
    (b"<mzXML", "a run in mzXML", "convert it to mzML"),
    (b"<mzData", "a run in mzData", "convert it to mzML"),
)


def read_run(path: str | Path) -> Run:
    """Read a GC-MS run from mzML, ANDI netCDF or JCAMP-DX, plain or compressed with gzip.

    A file that stops early gives the scans that are whole; the run then says what is lost.

    Raises
    ------
    InputError : the file cannot be opened, or no scan of it can be used.
    FormatError : the file is in no format of runs that is read, or its scans are profiles.
    TruncatedError : the file stops early and its format leaves no scan whole.
    """
    file = str(path)
    try:
        chunks = _chunks(file)
        head, rest = _take_head(chunks)
        form = _recognise(head)
        return form.read_chunks(rest, file)
    except InputError as fault:
        raise fault.located(file=file) from None


def _recognise(head: bytes) -> RunFormat:
    if not head.strip(b"\0 \t\r\n"):
        raise FormatError("the file is empty", remedy="copy or export the run again")
    for mark, kind, remedy in _OTHER_KINDS:
        if head.startswith(mark) or (mark.startswith(b"<") and mark in head[:2000]):
            raise FormatError(f"the file is {kind}, which is not read", remedy=remedy)
    for form in RUN_FORMATS:
        if form.looks_like(head):
            return form
    first = next((line.strip() for line in _text(head).splitlines() if line.strip()), "")
    raise FormatError(
        f"no format of runs fits a file that begins {quoted(first)}",
        remedy=f"{_AS_MZML}; give a single spectrum to `branchpos locate`",
    )


def _text(head: bytes) -> str:
    if head.startswith((b"\xff\xfe", b"\xfe\xff")):
        return head.decode("utf-16", errors="replace")
    return head.decode("latin-1").removeprefix("\u00ef\u00bb\u00bf")


def _take_head(chunks: Iterator[bytes]) -> tuple[bytes, Iterator[bytes]]:
    """Return the first bytes of a file, and all of its bytes again.

    Where the data stop inside the head, the second tells so in its place.

    Raises
    ------
    TruncatedError : compressed data stop before their first byte.
    """
    taken: list[bytes] = []
    stop: list[TruncatedError] = []
    try:
        while sum(map(len, taken)) < _HEAD and (chunk := next(chunks, b"")):
            taken.append(chunk)
    except TruncatedError as reason:
        stop.append(reason)
    if stop and not taken:
        raise stop[0]
    return b"".join(taken), chain(taken, _stopping(stop), chunks)


def _stopping(stop: list[TruncatedError]) -> Iterator[bytes]:
    for reason in stop:
        raise reason
    yield from ()


def _chunks(file: str) -> Iterator[bytes]:
    """Yield the bytes of a file, unpacked where it is compressed.

    Raises
    ------
    InputError : the file cannot be read.
    TruncatedError : compressed data stop early or are damaged, after all that could be unpacked.
    """
    try:
        with Path(file).open("rb") as stream:
            pieces = iter(lambda: stream.read(_CHUNK), b"")
            first = next(pieces, b"")
            whole = chain([first], pieces)
            yield from _unpack(whole) if first.startswith(_GZIP) else whole
    except (OSError, ValueError) as reason:
        words = getattr(reason, "strerror", None) or str(reason)
        remedy = f"a folder of the instrument's own format is not read: {_AS_MZML}"
        raise InputError(
            f"cannot be read: {words}", remedy=remedy if Path(file).is_dir() else "check the path"
        ) from reason


def _unpack(pieces: Iterator[bytes]) -> Iterator[bytes]:
    """Unpack gzip data, one member after another."""
    member = zlib.decompressobj(wbits=31)
    read = 0
    for piece in pieces:
        read += len(piece)
        waiting = piece
        while waiting:
            if member.eof:
                if not waiting.strip(b"\0"):
                    break
                member = zlib.decompressobj(wbits=31)
            try:
                unpacked = member.decompress(waiting, _UNPACKED)
            except zlib.error as reason:
                raise TruncatedError(
                    f"the gzip data are damaged before byte {read} ({reason})", remedy="copy the file again"
                ) from None
            if unpacked:
                yield unpacked
            waiting = member.unused_data if member.eof else member.unconsumed_tail
    if not member.eof:
        raise TruncatedError(f"the gzip data stop early, at byte {read}", remedy="copy the file again")
