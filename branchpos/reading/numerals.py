"""Numbers as files print them, read strictly: not all that Python accepts is a number here."""

from __future__ import annotations

import re

from branchpos.errors import FormatError, SpectrumError

_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,4})?")
_NOT_FINITE = re.compile(r"[+-]?(?:nan|inf(?:inity)?|1\.#\w+)", re.IGNORECASE)
_LONGEST_QUOTE = 40


def is_number(text: str) -> bool:
    """Tell whether a piece of text is one decimal number.

    >>> is_number("57.07"), is_number("1e3"), is_number("1_000"), is_number("nan")
    (True, True, False, False)
    """
    return len(text) <= _LONGEST_QUOTE and _NUMBER.fullmatch(text) is not None


def is_numeric(text: str) -> bool:
    """Tell whether a piece of text stands for a number, finite or not.

    >>> is_numeric("nan"), is_numeric("-inf"), is_numeric("name")
    (True, True, False)
    """
    return is_number(text) or _NOT_FINITE.fullmatch(text) is not None


def parse_number(text: str, what: str, line: int) -> float:
    """Read one number.

    Parameters
    ----------
    text : the number as printed, without surrounding blanks.
    what : what the number is, for the message: "m/z", "intensity".
    line : line of the file, from 1.

    Raises
    ------
    SpectrumError : the text says that there is no finite number.
    FormatError : the text is no number.

    >>> parse_number("57.07", "m/z", 1)
    57.07
    """
    if is_number(text):
        return float(text)
    if _NOT_FINITE.fullmatch(text):
        raise SpectrumError(f"{what} is {text}", place=f"line {line}", remedy="correct or remove the peak")
    raise FormatError(
        f"{what} is {quoted(text)}, not a number", place=f"line {line}", remedy="correct or remove the line"
    )


def leading_number(text: str) -> float | None:
    """Return the number that a text begins with, as in ``1889.5 (DB-5)``.

    >>> leading_number("70 eV"), leading_number("about 70")
    (70.0, None)
    """
    found = _NUMBER.match(text.strip()[:_LONGEST_QUOTE])
    return float(found.group()) if found else None


def decimals(text: str) -> int:
    """Return how many decimals a number is printed with.

    >>> decimals("9.77"), decimals("10"), decimals("1.5e3")
    (2, 0, 1)
    """
    mantissa = re.split("[eE]", text)[0]
    return len(mantissa.partition(".")[2])


def quoted(text: str) -> str:
    """Quote a piece of a file for a message: in one line, and never long.

    >>> print(quoted("C" * 60))
    'CCCCCCCCCCCCCCCCCCCCCCCCCCCCCCCCCCCCC...'
    """
    return repr(text if len(text) <= _LONGEST_QUOTE else text[: _LONGEST_QUOTE - 3] + "...")


def counted(number: int, noun: str) -> str:
    """Write a number with its noun.

    >>> counted(1, "peak"), counted(3, "peak")
    ('1 peak', '3 peaks')
    """
    return f"{number} {noun}{'' if number == 1 else 's'}"
