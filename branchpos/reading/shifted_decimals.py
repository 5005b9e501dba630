"""Intensities whose decimal point slipped one place to the left when a record was typed.

In series of records printed with one decimal, some values carry two, and nearly all of those look like a
tenth of what was measured. MSBNK-Fac_Eng_Univ_Tokyo-JP007688 (tetradecane) has 9.77 at m/z 43 and 4.59 at
m/z 71, where JP006881 of the same compound has 99.65 and 53.03. Measured beside unmarked records of the
same skeleton (51 pairs of records, peaks under a tenth of the base peak): of 352 comparisons of a marked
peak 97 % lie below 0.32 of the other record's value, median 0.08; of 1,026 of an unmarked peak in the same
records 19 % do, median 0.8. In records of two decimals throughout, two-decimal values show no shift: median
1.05 of 1,650 where the reference table suspects one, 0.87 of 331 elsewhere. The pairs share records and
differ in instrument and electron energy.

A slipped value whose last digit was a zero shows one decimal and would go unmarked, as presumably in
JP007688: 1.5 at m/z 55, against 21.85 in JP006881. Whether a marked value slipped cannot be told from its
record alone: it is marked, not altered.
"""

from __future__ import annotations

from collections.abc import Sequence

from branchpos.reading.numerals import counted, decimals

_USUAL_DECIMALS = 1
_LARGEST_SHARE = 0.5
"""Where at least this share of values carries two decimals, two are the record's own way of printing."""
_ROUNDING = 1.005
"""A tenfold value may pass the base peak by rounding only: 100.0 where the base peak is typed 99.99."""


def doubtful_intensities(printed: Sequence[str]) -> list[bool]:
    """Mark values with more decimals than their record prints and that may be ten times too small.

    The base peak is set apart: it is commonly typed 99.99 or 100.00. A value above a tenth of the base peak
    is not marked, since ten times as much would pass the base peak.

    Parameters
    ----------
    printed : the intensities as the record prints them, each a number.

    Returns
    -------
    one flag a value.

    >>> doubtful_intensities(["44.3", "9.77", "4.1", "99.99"])
    [False, True, False, False]
    >>> doubtful_intensities(["44.31", "9.77", "4.1", "99.99"])
    [False, False, False, False]
    """
    values = [float(text) for text in printed]
    top = max(values, default=0.0)
    longer = [
        decimals(text) > _USUAL_DECIMALS and value < top for text, value in zip(printed, values, strict=True)
    ]
    others = sum(value < top for value in values)
    if sum(longer) >= _LARGEST_SHARE * max(others, 1):
        return [False] * len(values)
    return [mark and 10 * value <= _ROUNDING * top for mark, value in zip(longer, values, strict=True)]


def shift_warning(flags: Sequence[bool]) -> list[str]:
    """Say how many peaks are marked.

    >>> shift_warning([True, False, True])
    ['2 peaks may be ten times too small (a shifted decimal)']
    """
    number = sum(flags)
    return [f"{counted(number, 'peak')} may be ten times too small (a shifted decimal)"] if number else []
