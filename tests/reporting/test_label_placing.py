"""Labels find free room, or are left out."""

from __future__ import annotations

import pytest
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.text import Text

from branchpos.reporting.label_placing import LabelPlacer


@pytest.fixture
def axes() -> Axes:
    made = Figure(figsize=(6, 4)).add_subplot()
    made.set_xlim(0, 10)
    made.set_ylim(0, 10)
    return made


def test_labels_of_crowded_points_do_not_meet(axes: Axes) -> None:
    placer = LabelPlacer(axes)
    placed = [placer.place(3 + 0.4 * at, 3, f"label {at}", fontsize=8, color="black") for at in range(8)]
    axes.figure.draw_without_rendering()
    boxes = [Text.get_window_extent(label) for label in placed if label is not None]
    assert len(boxes) == 8
    assert not any(one.overlaps(other) for at, one in enumerate(boxes) for other in boxes[at + 1 :])


def test_a_label_avoids_marks(axes: Axes) -> None:
    placer = LabelPlacer(axes)
    for height in range(4, 8):
        placer.keep_clear(5, height, reach=10)
    label = placer.place(5, 3, "label", fontsize=8, color="black")
    assert label is not None
    axes.figure.draw_without_rendering()
    box = Text.get_window_extent(label)
    for height in range(4, 8):
        x, y = axes.transData.transform((5, height))
        assert not box.contains(x, y)


def test_a_label_without_room_is_left_out(axes: Axes) -> None:
    placer = LabelPlacer(axes)
    assert placer.place(5, 9.99, "one\ntwo\nthree", fontsize=30, color="black") is None
