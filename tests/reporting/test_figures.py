"""Figures: texts keep clear of each other, marks tell the truth, files repeat byte for byte."""

from __future__ import annotations

from itertools import combinations, pairwise
from pathlib import Path

import pytest
from matplotlib.figure import Figure
from matplotlib.text import Text

import branchpos as bp
from branchpos.chain import Chain
from branchpos.reporting import palette
from branchpos.reporting.figures import (
    draw_chain,
    draw_ion_series,
    draw_spectrum,
    prediction_figure,
    save_figure,
    verdict_figure,
)
from branchpos.reporting.picture import Layer, NamedSize, Picture, ShownIon, cuts_of
from branchpos.workflow.picture import picture_of, picture_of_prediction

CHAINS = (
    "n-C12",
    "2-MeC8",
    "5,11-diMeC25",
    "3,7,11,15-tetraMeC33",
    "2,6,10,15,19,23-hexaMeC24",
    "3,3-diMeC14",
)


def planted(name: str) -> bp.Spectrum:
    ions = bp.predict(name, least=0.004).series.ions
    return bp.Spectrum.from_peaks([ion.mz for ion in ions], [ion.expected for ion in ions], title=name)


def placed_texts(figure: Figure) -> list[Text]:
    """Return the texts that are placed by hand; tick labels are matplotlib's own business."""
    upon_axes = {
        text for axes in figure.axes for axis in (axes.xaxis, axes.yaxis) for text in axis.findobj(Text)
    }
    labels = [axis.label for axes in figure.axes if axes.axison for axis in (axes.xaxis, axes.yaxis)]
    free = [text for text in figure.findobj(Text) if text.get_text() and text not in upon_axes]
    return free + labels


def overlapping(figure: Figure) -> list[tuple[str, str]]:
    figure.draw_without_rendering()
    boxes = [(text.get_text(), Text.get_window_extent(text)) for text in placed_texts(figure)]
    return [(a, b) for (a, one), (b, other) in combinations(boxes, 2) if one.overlaps(other)]


@pytest.mark.parametrize("name", CHAINS)
def test_no_text_of_a_prediction_covers_another(name: str) -> None:
    assert overlapping(prediction_figure(picture_of_prediction(bp.predict(name)))) == []


@pytest.mark.parametrize("name", ["n-C12", "4-MeC16", "5,11-diMeC25"])
def test_no_text_of_a_verdict_covers_another(name: str) -> None:
    spectrum = planted(name)
    figure = verdict_figure(picture_of(spectrum, bp.locate(spectrum, chain="alkane")), spectrum)
    assert overlapping(figure) == []


def test_no_text_leaves_the_figure() -> None:
    spectrum = planted("5,11-diMeC25")
    figure = verdict_figure(picture_of(spectrum, bp.locate(spectrum, chain="alkane")), spectrum)
    figure.draw_without_rendering()
    frame = figure.bbox
    for text in placed_texts(figure):
        box = Text.get_window_extent(text)
        assert frame.x0 <= box.x0, text.get_text()
        assert box.x1 <= frame.x1, text.get_text()
        assert frame.y0 <= box.y0, text.get_text()
        assert box.y1 <= frame.y1, text.get_text()


@pytest.mark.parametrize("suffix", [".svg", ".pdf", ".png"])
def test_files_repeat_byte_for_byte(suffix: str, tmp_path: Path) -> None:
    written = []
    for number in range(2):
        path = tmp_path / f"{number}{suffix}"
        save_figure(prediction_figure(picture_of_prediction(bp.predict("4-MeC16"))), path)
        written.append(path.read_bytes())
    assert written[0] == written[1]


def test_without_evidence_for_a_chain_the_spectrum_stands_alone() -> None:
    figure = verdict_figure(Picture("title", "open", (), (), 0.01), planted("4-MeC12"))
    assert len(figure.axes) == 1


def simple_picture(observed: tuple[float | None, ...]) -> Picture:
    shown = tuple(
        ShownIon(mass, 6 + at // 2, 0.2, 0.1, 0.4, value)
        for at, (mass, value) in enumerate(zip((84, 85, 98, 99), observed, strict=True))
    )
    return Picture("", "", (Layer(Chain(12, (4,)), "one", shown),), (NamedSize(6, (84, 85)),), 0.01)


def test_seen_ions_are_filled_and_absent_ones_open_on_the_threshold() -> None:
    axes = Figure().add_subplot()
    draw_ion_series(axes, simple_picture((0.25, 0.5, None, 0.125)))
    marks = {
        (round(float(x), 2), round(float(y), 2)): line
        for line in axes.lines
        if line.get_marker() in ("o", "s")
        for x, y in zip(line.get_xdata(), line.get_ydata(), strict=True)
    }
    # Even mass left of its size, odd mass right; squares and circles.
    assert set(marks) == {(5.8, 25.0), (6.2, 50.0), (6.8, 1.0), (7.2, 12.5)}
    assert marks[5.8, 25.0].get_marker() == "s"
    assert marks[6.2, 50.0].get_marker() == "o"
    assert marks[6.8, 1.0].get_markerfacecolor() == palette.PAPER
    assert marks[7.2, 12.5].get_color() == palette.INK


def test_the_second_hypothesis_shows_only_where_it_differs() -> None:
    first = simple_picture((0.2, 0.2, 0.2, 0.2)).layers[0]
    changed = tuple(
        ShownIon(one.mz, one.carbons, 0.05, 0.02, 0.1) if one.mz == 98 else one for one in first.ions
    )
    axes = Figure().add_subplot()
    draw_ion_series(axes, Picture("", "", (first, Layer(Chain(12, (5,)), "two", changed)), (), 0.01))
    hatched = [bar for bars in axes.containers for bar in bars if bar.get_hatch()]
    assert [round(bar.get_x() + bar.get_width() / 2, 2) for bar in hatched] == [6.8]


def test_sticks_are_one_line_as_tall_as_the_peaks() -> None:
    axes = Figure().add_subplot()
    draw_spectrum(axes, bp.Spectrum.from_peaks([43, 57, 71], [50, 200, 100]))
    (line,) = [line for line in axes.lines if len(line.get_xdata()) == 9]
    assert line.get_ydata()[1::3].tolist() == [25.0, 100.0, 50.0]


def test_the_chain_carries_its_numbers_methyls_and_cuts() -> None:
    axes = Figure(figsize=(10, 1.5)).add_subplot()
    draw_chain(axes, Chain(25, (5, 11)), [NamedSize(13, (182, 183)), NamedSize(16, (224, 225))], "name")
    texts = [text.get_text() for text in axes.texts]
    assert [str(carbon) for carbon in range(1, 26)] == [text for text in texts if text.isdigit()]
    assert {"182, 183", "224, 225", "name"} <= set(texts)
    ends = [line for line in axes.lines if line.get_marker() == "o"]
    assert [float(line.get_xdata()[0]) for line in ends] == [5, 11]


def test_cuts_beside_a_branch_complement_each_other() -> None:
    # Both ions of the branch on C11 of 5,11-dimethylpentacosane: C13 keeps C1, C16 the other end
    # (the doublets 182/183 and 224/225 of record MSSJ-MSJ00076).
    (left,), (right,) = cuts_of(Chain(25, (5, 11)), 13), cuts_of(Chain(25, (5, 11)), 16)
    assert (left.bond, left.keeps_left) == (11, True)
    assert (right.bond, right.keeps_left) == (10, False)


def test_the_palette_is_told_apart_in_greyscale() -> None:
    # Steps of at least 0.05 in relative luminance; text on paper at least 7 : 1 (WCAG 2.1, level AAA).
    steps = sorted(
        palette.luminance(colour)
        for colour in (palette.INK, palette.SECOND, palette.FIRST_LINE, palette.FIRST, palette.PAPER)
    )
    assert all(high - low > 0.05 for low, high in pairwise(steps))
    assert (1 + 0.05) / (palette.luminance(palette.INK) + 0.05) >= 7
