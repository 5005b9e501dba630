"""From the text of one binary array of mzML to numbers: base64, compression, number type.

Source: HUPO-PSI mzML 1.1 and its controlled vocabulary, whose accession numbers stand beside their meaning.
"""

from __future__ import annotations

import binascii
import zlib
from collections.abc import Callable, Iterable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from branchpos.errors import FormatError
from branchpos.reading.numerals import quoted
from branchpos.reading.numpress import decode_linear, decode_positive_integers, decode_short_logarithms

MZ_ARRAY, INTENSITY_ARRAY = "MS:1000514", "MS:1000515"

_LARGEST_ARRAY = 1 << 30
"""Bytes that one array may unpack to; no scan needs more. It bounds memory."""

_NUMBER_TYPES = {
    "MS:1000519": "<i4",
    "MS:1000521": "<f4",
    "MS:1000522": "<i8",
    "MS:1000523": "<f8",
}
Unpacked = NDArray[np.float64] | NDArray[np.float32] | NDArray[np.int32] | NDArray[np.int64]


class _Packing(NamedTuple):
    """Whether zlib is undone first, and what then turns bytes into numbers; None for plain numbers."""

    zlib: bool
    decode: Callable[[bytes], NDArray[np.float64]] | None


_PACKINGS = {
    "MS:1000576": _Packing(False, None),
    "MS:1000574": _Packing(True, None),
    "MS:1003088": _Packing(True, None),  # digits dropped before zlib: nothing more to undo
    "MS:1002312": _Packing(False, decode_linear),
    "MS:1002313": _Packing(False, decode_positive_integers),
    "MS:1002314": _Packing(False, decode_short_logarithms),
    "MS:1002746": _Packing(True, decode_linear),
    "MS:1002747": _Packing(True, decode_positive_integers),
    "MS:1002748": _Packing(True, decode_short_logarithms),
}
_OTHER_PACKINGS = frozenset(
    {"MS:1003089", "MS:1003090", *(f"MS:{number}" for number in range(1003780, 1003786))}
)
"""Differences and lines kept instead of values, and Zstandard: known, and not undone here."""
_HALF_FLOAT = "MS:1000520"
_REMEDY = "convert the run again with zlib or no compression, as 32 or 64 bit numbers"


def decode_array(text: str, terms: Iterable[str], length: int) -> Unpacked:
    """Decode one array.

    Parameters
    ----------
    text : the base64 text.
    terms : accession numbers that the file gives the array, those of its parameter groups included.
    length : number of values that the file announces.

    Returns
    -------
    The values, shape (length,), in a number type that holds them.

    Raises
    ------
    FormatError : the text is no base64, its compression is damaged or not known, or the length differs.

    >>> decode_array("AAAAAACATEAAAAAAAMBRQA==", ["MS:1000523", "MS:1000576"], 2).tolist()
    [57.0, 71.0]
    """
    known = frozenset(terms)
    packing = _packing(known)
    data = _from_base64(text)
    if packing.zlib:
        data = _inflate(data)
    values = packing.decode(data) if packing.decode else _plain_numbers(data, known)
    if values.size != length:
        raise FormatError(
            f"{values.size} values where the file announces {length}", remedy="convert the run again"
        )
    return values


def _packing(terms: frozenset[str]) -> _Packing:
    unknown = terms & _OTHER_PACKINGS
    if unknown:
        raise FormatError(f"compression {min(unknown)} is not read", remedy=_REMEDY)
    found = [packing for term, packing in _PACKINGS.items() if term in terms]
    if len(found) == 1:
        return found[0]
    if {packing.decode for packing in found} - {None} and len(found) == 2:
        # Early writers name zlib and the numeric packing as two terms.
        numeric = next(packing for packing in found if packing.decode)
        return _Packing(any(packing.zlib for packing in found), numeric.decode)
    words = "no compression is named" if not found else "compressions that exclude each other are named"
    raise FormatError(words, remedy=_REMEDY)


def _from_base64(text: str) -> bytes:
    compact = "".join(text.split())
    try:
        return binascii.a2b_base64(compact, strict_mode=True)
    except ValueError as reason:
        raise FormatError(
            f"the array is no base64 text ({reason}): it begins {quoted(compact[:60])}",
            remedy="copy the file again, or convert the run again",
        ) from None


def _inflate(data: bytes) -> bytes:
    if not data:
        return b""
    stream = zlib.decompressobj()
    try:
        whole = stream.decompress(data, _LARGEST_ARRAY)
    except zlib.error as reason:
        raise FormatError(f"the zlib data are damaged ({reason})", remedy="convert the run again") from None
    if not stream.eof:
        words = "are too large" if len(whole) == _LARGEST_ARRAY else "stop early"
        raise FormatError(f"the zlib data {words}", remedy="convert the run again")
    return whole


def _plain_numbers(data: bytes, terms: frozenset[str]) -> Unpacked:
    found = [form for term, form in _NUMBER_TYPES.items() if term in terms]
    if len(found) != 1:
        kind = (
            "16-bit floats are" if _HALF_FLOAT in terms else f"{len(found)} number types are named, not one:"
        )
        raise FormatError(f"{kind} not read", remedy=_REMEDY)
    form = np.dtype(found[0])
    if len(data) % form.itemsize:
        raise FormatError(
            f"{len(data)} bytes do not hold whole numbers of {form.itemsize} bytes",
            remedy="convert the run again",
        )
    values: Unpacked = np.frombuffer(data, form)
    return values
