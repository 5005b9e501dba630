"""Decoders of the three numeric packings of mzML that are known together as MS-Numpress.

Source: Teleman, Dowsey, Gonzalez-Galarza, Perkins, Pratt, Röst, Malmström, Malmström, Jones, Deutsch and
Levander, Mol. Cell. Proteomics 13 (2014) 1537. Big-endian scaling factors and the order of half-bytes are
those of files in circulation; the tests read what an independent encoder wrote.
"""

from __future__ import annotations

import struct

import numpy as np
from numpy.typing import NDArray

from branchpos.errors import FormatError

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_FACTOR_BYTES = 8
_REMEDY = "convert the run again, without numeric compression"
_LENGTHS = bytes(8 - head if head <= 8 else 16 - head for head in range(16))
"""Half-bytes that follow a head: 0 to 8 leading zeros, or 1 to 7 leading ones, are left out."""


def decode_linear(data: bytes) -> FloatArray:
    """Decode values stored as steps off the straight line through the two before, shape (values,).

    Raises
    ------
    FormatError : the data break the packing.

    >>> decode_linear(bytes.fromhex("40f86a0000000000" "40420f00" "80841e00" "80")).tolist()
    [10.0, 20.0, 30.0]
    """
    factor = _factor(data)
    body = data[_FACTOR_BYTES:]
    if len(body) < 4:
        return _empty_or_fault(body)
    if len(body) < 8:
        if len(body) != 4:
            raise _fault(f"{len(body)} bytes where one or two first values of 4 bytes belong")
        return np.frombuffer(body, "<i4").astype(np.float64) / factor
    first, second = struct.unpack("<ii", body[:8])
    bends = _unpack_numbers(body[8:])
    steps = second - first + np.concatenate([np.zeros(1, np.int64), np.cumsum(bends)])
    whole = first + np.concatenate([np.zeros(1, np.int64), np.cumsum(steps)])
    values: FloatArray = whole / factor
    return values


def decode_positive_integers(data: bytes) -> FloatArray:
    """Decode rounded counts, shape (values,).

    Raises
    ------
    FormatError : the data break the packing.
    """
    return (_unpack_numbers(data) & 0xFFFFFFFF).astype(np.float64)


def decode_short_logarithms(data: bytes) -> FloatArray:
    """Decode logarithms of 1 + value kept in 16 bits, shape (values,).

    Raises
    ------
    FormatError : the data break the packing.
    """
    factor = _factor(data)
    body = data[_FACTOR_BYTES:]
    if len(body) % 2:
        raise _fault(f"{len(body)} bytes where each value takes 2")
    with np.errstate(over="ignore"):
        values: FloatArray = np.expm1(np.frombuffer(body, "<u2") / factor)
    return values


def _factor(data: bytes) -> float:
    if len(data) < _FACTOR_BYTES:
        raise _fault(f"{len(data)} bytes where the scaling factor alone takes {_FACTOR_BYTES}")
    factor = float(struct.unpack(">d", data[:_FACTOR_BYTES])[0])
    if not (np.isfinite(factor) and factor > 0):
        raise _fault(f"the scaling factor is {factor:g}")
    return factor


def _empty_or_fault(body: bytes) -> FloatArray:
    if body:
        raise _fault(f"{len(body)} bytes where the first value takes 4")
    return np.zeros(0)


def _unpack_numbers(data: bytes) -> IntArray:
    """Unpack signed 32-bit integers of one head and 0 to 8 half-bytes each, lowest half-byte first."""
    packed = np.frombuffer(data, np.uint8)
    nibbles = np.empty(2 * packed.size, np.uint8)
    nibbles[0::2], nibbles[1::2] = packed >> 4, packed & 0xF
    heads = np.array(_head_positions(nibbles.tobytes()), dtype=np.int64)
    kinds = nibbles[heads].astype(np.int64)
    lengths = np.frombuffer(_LENGTHS, np.uint8)[kinds].astype(np.int64)
    values = np.zeros(heads.size, np.int64)
    for place in range(8):
        longer = lengths > place
        values[longer] |= nibbles[heads[longer] + 1 + place].astype(np.int64) << (4 * place)
    negative = (kinds > 8) | (values >= 1 << 31)
    values[negative] -= np.int64(1) << np.where(kinds > 8, 4 * lengths, 32)[negative]
    return values


def _head_positions(nibbles: bytes) -> list[int]:
    """Follow the heads through the half-bytes: where one stands is known only from the one before.

    A last half-byte may be there to fill its byte.
    """
    lengths = nibbles.translate(_LENGTHS + bytes(240))
    end, at = len(nibbles), 0
    found: list[int] = []
    while at < end:
        found.append(at)
        at += 1 + lengths[at]
    if at > end:
        last = found.pop()
        if last != end - 1 or nibbles[last] != 0:
            raise _fault("the data end inside a number")
    return found


def _fault(problem: str) -> FormatError:
    return FormatError(f"packed numbers are damaged: {problem}", remedy=_REMEDY)
