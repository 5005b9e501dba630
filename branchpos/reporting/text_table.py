"""Tables as aligned plain text, for pipes and files."""

from __future__ import annotations

from collections.abc import Sequence


def aligned(head: Sequence[str], rows: Sequence[Sequence[str]], right: frozenset[int]) -> list[str]:
    """Return one line a row, columns aligned, the head first.

    Parameters
    ----------
    head, rows : cells as text, all rows as long as the head.
    right : columns that stand flush right.

    >>> aligned(["rank", "name"], [["1", "decane"]], frozenset([0]))
    ['rank  name', '   1  decane']
    """
    widths = column_widths(head, rows)
    return [line_of(row, widths, right) for row in (head, *rows)]


def column_widths(head: Sequence[str], rows: Sequence[Sequence[str]]) -> list[int]:
    """Return the width of the widest cell of each column."""
    return [max(len(row[column]) for row in (head, *rows)) for column in range(len(head))]


def line_of(row: Sequence[str], widths: Sequence[int], right: frozenset[int]) -> str:
    """Return one line of a table with these column widths."""
    cells = [
        cell.rjust(width) if column in right else cell.ljust(width)
        for column, (cell, width) in enumerate(zip(row, widths, strict=True))
    ]
    return "  ".join(cells).rstrip()
