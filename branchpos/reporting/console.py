"""Verdicts and predictions on the console: coloured on a terminal, plain aligned text in a pipe."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TextIO

from branchpos.ion_series import IonSeries
from branchpos.naming import shorthand, systematic_name
from branchpos.reporting.numbers import percent_text, printable, probability_text
from branchpos.reporting.text_table import aligned
from branchpos.retention_index import RetentionIndex
from branchpos.verdict import RankedHypothesis, Verdict

_FEWEST_LISTED, _MOST_LISTED = 5, 12
"""Hypotheses shown: the credible set, at least the first and at most the second number of them."""
_BAR = 12
"""Length of the bar [characters] that stands for a probability of one."""


@dataclass(frozen=True, slots=True)
class Sheet:
    """One result as it is printed.

    Attributes
    ----------
    title, headline, standing : where it comes from; the result; what it amounts to.
    head, rows, right : a table, and its columns that stand flush right.
    shares : for each row a share of one, drawn as a bar on a terminal behind column ``bar_after``.
    remarks : label and text of the lines below the table.
    """

    title: str
    headline: str
    standing: str
    head: tuple[str, ...]
    rows: Sequence[tuple[str, ...]]
    right: frozenset[int]
    shares: tuple[float, ...]
    bar_after: int
    remarks: tuple[tuple[str, str], ...] = ()


def show_verdict(verdict: Verdict, everything: bool = False, stream: TextIO | None = None) -> None:
    """Print a verdict on a stream, standard output when not given."""
    show_sheet(verdict_sheet(verdict, everything), stream)


def show_prediction(series: IonSeries, index: RetentionIndex | None, stream: TextIO | None = None) -> None:
    """Print a prediction on a stream, standard output when not given."""
    show_sheet(prediction_sheet(series, index), stream)


def show_sheet(sheet: Sheet, stream: TextIO | None = None) -> None:
    """Print a sheet: with colour and bars on a terminal, else as plain text."""
    out = stream or sys.stdout
    if out.isatty():
        _show_on_terminal(sheet, out)
    else:
        out.write(plain_text(sheet))
    out.flush()


def verdict_sheet(verdict: Verdict, everything: bool = False) -> Sheet:
    """Lay a verdict out."""
    listed = _listed(verdict, everything)
    has_index = any(one.retention_z is not None for one in listed)
    rows = [_hypothesis_row(rank, one, has_index) for rank, one in enumerate(listed, start=1)]
    filling = ("",) * (len(rows[0]) - 3 if rows else 1)
    shares = [one.posterior for one in listed]
    if len(listed) < len(verdict.hypotheses):
        rest = verdict.hypotheses[len(listed) :]
        shares.append(sum(one.posterior for one in rest))
        rows.append(
            ("", probability_text(shares[-1]), f"{len(rest)} further; --all lists every one", *filling)
        )
    rows.append(("", probability_text(verdict.none_of_these), "none of these", *filling))
    head = ("rank", "probability", "name", "shorthand", *(["index off by"] if has_index else []))
    return Sheet(
        title=_title(verdict),
        headline=verdict.call,
        standing=verdict.status.value,
        head=head,
        rows=rows,
        right=frozenset((0, 1, 4)),
        shares=(*shares, verdict.none_of_these),
        bar_after=1,
        remarks=_remarks(verdict),
    )


def prediction_sheet(series: IonSeries, index: RetentionIndex | None) -> Sheet:
    """Lay a prediction out."""
    rows = [
        (
            str(ion.mz),
            str(ion.carbons),
            percent_text(ion.expected),
            f"{percent_text(ion.low)} to {percent_text(ion.high)}",
            ion.cleavage,
        )
        for ion in series.ions
    ]
    remarks = [("formula", f"{series.chain.formula}, {series.chain.formula.nominal_mass} u")]
    if index is not None:
        low, high = index.interval()
        remarks.append(("index", f"{index.value:.1f}, 95 % within {low:.1f} to {high:.1f}"))
    return Sheet(
        title="expected of",
        headline=systematic_name(series.chain),
        standing=shorthand(series.chain),
        head=("m/z", "carbons", "expected %", "95 % range", "cleavage"),
        rows=rows,
        right=frozenset((0, 1, 2, 3)),
        shares=tuple(ion.expected for ion in series.ions),
        bar_after=2,
        remarks=tuple(remarks),
    )


def plain_text(sheet: Sheet) -> str:
    """Return a sheet as plain text that ends with an empty line."""
    lines = [printable(sheet.title), f"  {sheet.headline} ({sheet.standing})", ""]
    lines += [f"  {line}" for line in aligned(sheet.head, sheet.rows, sheet.right)]
    width = max((len(label) for label, _ in sheet.remarks), default=0)
    lines += [""] if sheet.remarks else []
    lines += [f"  {label.ljust(width)}  {printable(text)}" for label, text in sheet.remarks]
    return "\n".join([*lines, "", ""])


def _listed(verdict: Verdict, everything: bool) -> Sequence[RankedHypothesis]:
    if everything:
        return verdict.hypotheses
    members = sum(one.name in set(verdict.credible_set) for one in verdict.hypotheses)
    return verdict.hypotheses[: min(max(members, _FEWEST_LISTED), _MOST_LISTED)]


def _hypothesis_row(rank: int, one: RankedHypothesis, has_index: bool) -> tuple[str, ...]:
    off = "" if one.retention_z is None else f"{one.retention_z:+.1f} sd"
    row = (str(rank), probability_text(one.posterior), one.name, shorthand(one.chain))
    return (*row, off) if has_index else row


def _title(verdict: Verdict) -> str:
    return ": ".join(part for part in (verdict.source, verdict.title) if part) or "spectrum"


def _remarks(verdict: Verdict) -> tuple[tuple[str, str], ...]:
    whys = [("why" if first == 0 else "", text) for first, text in enumerate(verdict.reasons)]
    doubts = [("doubt" if first == 0 else "", text) for first, text in enumerate(verdict.warnings)]
    return (*whys, *doubts)


def _show_on_terminal(sheet: Sheet, out: TextIO) -> None:
    from rich.console import Console, Group
    from rich.padding import Padding
    from rich.table import Table
    from rich.text import Text

    table = Table(box=None, padding=(0, 2, 0, 0), header_style="dim")
    for column, name in enumerate(sheet.head):
        table.add_column(name, justify="right" if column in sheet.right else "left")
        if column == sheet.bar_after:
            table.add_column("", width=_BAR)
    for number, row in enumerate(sheet.rows):
        cells = [Text(cell, style="bold" if number == 0 and sheet.head[0] == "rank" else "") for cell in row]
        cells.insert(sheet.bar_after + 1, Text(_bar(sheet.shares[number]), style="cyan"))
        table.add_row(*cells)
    remarks = Table.grid(padding=(0, 2, 0, 0))
    for label, text in sheet.remarks:
        remarks.add_row(Text(label, style="yellow" if label == "doubt" else "dim"), Text(printable(text)))
    headline = Text.assemble((sheet.headline, "bold"), "  ", (sheet.standing, "italic"))
    body = Group(headline, Text(), table, Text(), remarks, Text())
    console = Console(file=out, highlight=False)
    console.print(Text(printable(sheet.title), style="dim"), Padding(body, (0, 0, 0, 2)), sep="\n")


def _bar(share: float) -> str:
    """Draw a share of one; what is there at all gets at least a thin mark.

    >>> _bar(0.5), _bar(0.01), _bar(0.0001)
    ('▅▅▅▅▅▅', '▏', '')
    """
    cells = round(share * _BAR)
    return "▅" * min(cells, _BAR) if cells else "▏" * (share >= 0.0005)
