"""Numerical terms of chain names: how many carbons a stem means, and how many methyls a prefix means.

Source: IUPAC Recommendations 2013, P-14.2 (multiplicative prefixes) and P-31.1.4 (alkane stems).
"""

from __future__ import annotations

from functools import cache

from branchpos.errors import NamingError

LONGEST_NAMED = 100
"""Longest backbone with a name here (hectane)."""

_FIRST = ("meth", "eth", "prop", "but", "pent", "hex", "hept", "oct", "non", "dec", "undec")
_UNITS = ("", "hen", "do", "tri", "tetra", "penta", "hexa", "hepta", "octa", "nona")
_TENS = ("", "dec", "icos", *(f"{unit}cont" for unit in ("tria", *_UNITS[4:])))
_SPELT_OTHERWISE = {"eicos": 20, "heneicos": 21, "uneicos": 21, "hendec": 11}
_FEW = {1: "", 2: "di", 3: "tri", 4: "tetra"}


def _stem(carbons: int) -> str:
    """Build one stem from its units and tens; ``icos`` loses its first letter after a vowel."""
    if carbons <= len(_FIRST):
        return _FIRST[carbons - 1]
    if carbons == LONGEST_NAMED:
        return "hect"
    unit, tens = _UNITS[carbons % 10], _TENS[carbons // 10]
    return unit + (tens[1:] if tens == "icos" and unit[-1:] in ("a", "i", "o") else tens)


@cache
def stems() -> dict[str, int]:
    """Return every stem that can be read, with its number of carbons."""
    return {_stem(carbons): carbons for carbons in range(1, LONGEST_NAMED + 1)} | _SPELT_OTHERWISE


def stem(carbons: int) -> str:
    """Return the stem of a chain of so many carbons.

    Raises
    ------
    NamingError : there is no stem for this length.

    >>> [stem(n) for n in (1, 11, 20, 21, 23, 31, 40, 100)]
    ['meth', 'undec', 'icos', 'henicos', 'tricos', 'hentriacont', 'tetracont', 'hect']
    """
    if not 1 <= carbons <= LONGEST_NAMED:
        raise NamingError(
            f"no name for a chain of {carbons} carbons", remedy=f"names reach from 1 to {LONGEST_NAMED}"
        )
    return _stem(carbons)


def multiplier(count: int) -> str:
    """Return the prefix that says how many methyls there are.

    >>> [multiplier(k) for k in (1, 2, 3, 4, 5, 8, 11, 12, 20)]
    ['', 'di', 'tri', 'tetra', 'penta', 'octa', 'undeca', 'dodeca', 'icosa']
    """
    return _FEW[count] if count in _FEW else f"{stem(count)}a"


@cache
def multipliers() -> dict[str, int]:
    """Return every such prefix with its number."""
    return {multiplier(count): count for count in range(1, LONGEST_NAMED)}
