"""Numbers as people read them, and as JSON keeps them."""

from __future__ import annotations

from math import floor, isfinite, log10


def probability_text(probability: float) -> str:
    """Write a probability to three decimals, never as a false 0 or 1.

    >>> [probability_text(p) for p in (0.9534, 0.00021, 0.99987, 0.0)]
    ['0.953', '<0.001', '>0.999', '<0.001']
    """
    if probability < 0.0005:
        return "<0.001"
    return ">0.999" if probability >= 0.9995 else f"{probability:.3f}"


def percent_text(share: float) -> str:
    """Write an abundance relative to the base peak in percent, to two digits below ten.

    >>> [percent_text(share) for share in (1.0, 0.126, 0.0957, 0.00412, 0.0003)]
    ['100', '13', '9.6', '0.41', '0.03']
    """
    percent = 100 * share
    if percent >= 9.95:
        return f"{percent:.0f}"
    return f"{percent:.1f}" if percent >= 0.95 else f"{percent:.2f}"


def significant(number: float, digits: int = 6) -> float:
    """Round to so many significant digits.

    >>> significant(0.000123456789, 3), significant(2581.3456, 5), significant(0.0)
    (0.000123, 2581.3, 0.0)
    """
    number = float(number)
    if number == 0 or not isfinite(number):
        return number
    return round(number, digits - 1 - floor(log10(abs(number))))


def printable(text: str) -> str:
    r"""Return text from a file without line breaks and control characters, which could steer a terminal.

    >>> printable("peak\x1b[2J 14\n")
    'peak [2J 14'
    """
    return " ".join("".join(char if char.isprintable() else " " for char in text).split())
