"""Verdicts on the console: plain in a pipe, coloured on a terminal, honest about small numbers."""

from __future__ import annotations

from io import StringIO

import pytest

from branchpos.chain import Chain
from branchpos.reporting.console import plain_text, show_verdict, verdict_sheet
from branchpos.reporting.numbers import percent_text, probability_text, significant
from branchpos.verdict import RankedHypothesis, Status, Verdict


class Terminal(StringIO):
    def isatty(self) -> bool:
        return True


def verdict(hypotheses: int = 8, retention_z: float | None = None, title: str = "peak 14") -> Verdict:
    ranked = tuple(
        RankedHypothesis(Chain(25, (5, 6 + at)), 0.9 * 0.1**at, -40.0, retention_z)
        for at in range(hypotheses)
    )
    return Verdict(
        source="peak14.txt",
        title=title,
        status=Status.ASSIGNED,
        call=ranked[0].name,
        hypotheses=ranked,
        considered=144,
        none_of_these=0.0001,
        rivals=(("another compound", 0.0001),),
        level=0.95,
        credible_set=(ranked[0].name,),
        prior="flat",
        reasons=("first reason", "second reason"),
        warnings=("a doubt",),
    )


def test_plain_text_lists_five_sums_the_rest_and_names_the_rivals() -> None:
    lines = plain_text(verdict_sheet(verdict())).splitlines()
    assert lines[0] == "peak14.txt: peak 14"
    assert lines[1].strip() == "5,6-dimethylpentacosane (assigned)"
    assert sum("pentacosane  " in line for line in lines) == 5
    assert any("3 further" in line for line in lines)
    assert any("<0.001  none of these" in line for line in lines)
    assert lines[-2].split() == ["doubt", "a", "doubt"]


def test_everything_lists_all() -> None:
    text = plain_text(verdict_sheet(verdict(), everything=True))
    assert "further" not in text
    assert text.count("5,13-diMeC25") == 1


@pytest.mark.parametrize(("z", "shown"), [(0.3, "+0.3 sd"), (-2.04, "-2.0 sd")])
def test_the_index_residual_has_its_column(z: float, shown: str) -> None:
    text = plain_text(verdict_sheet(verdict(retention_z=z)))
    assert "index off by" in text
    assert shown in text


def test_a_pipe_gets_no_control_characters_even_from_a_hostile_title() -> None:
    out = StringIO()
    show_verdict(verdict(title="\x1b[2J\x07evil\r\nline"), stream=out)
    assert all(char.isprintable() or char == "\n" for char in out.getvalue())


def test_a_terminal_gets_bars_and_colour() -> None:
    out = Terminal()
    show_verdict(verdict(title="[bold]not markup[/bold]"), stream=out)
    assert "▅" in out.getvalue()
    assert "[bold]not markup[/bold]" in out.getvalue()


def test_probabilities_are_never_falsely_certain() -> None:
    assert probability_text(1.0) == ">0.999"
    assert probability_text(0.0) == "<0.001"
    assert probability_text(0.9994) == "0.999"


@pytest.mark.parametrize(
    ("number", "digits", "expected"), [(1234.5678, 6, 1234.57), (-0.00012345, 2, -0.00012)]
)
def test_significant_digits(number: float, digits: int, expected: float) -> None:
    assert significant(number, digits) == expected


def test_percent_keeps_two_digits_where_they_matter() -> None:
    assert [percent_text(share) for share in (0.995, 0.0994, 0.00949)] == ["100", "9.9", "0.95"]
