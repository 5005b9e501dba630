"""Labels that keep clear of each other and of the data."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.text import Annotation

Box = tuple[float, float, float, float]
"""Left, bottom, right, top in pixels."""

_GAP = 2.0
"""Clearance around a label [points]."""
_ALONG = [share / 12 for share in range(12)]
_LINE: dict[str, Any] = {"arrowstyle": "-", "lw": 0.6, "shrinkA": 0, "shrinkB": 3}
_RISE = 7.0
"""Distance between the heights that are tried [points]."""


class LabelPlacer:
    """Puts labels above points of one axes; its limits must not change afterwards."""

    def __init__(self, axes: Axes) -> None:
        self._axes = axes
        self._taken: list[Box] = []
        self._labels: list[Box] = []
        self._leaders: list[Box] = []

    def keep_clear(self, x: float, y: float, reach: float = 4.0, foot: float | None = None) -> None:
        """Keep labels off a mark at a data point, and off the stroke down to ``foot`` where one is given."""
        left, bottom = self._pixels(x, y)
        room = self._points(reach)
        low = self._pixels(x, foot)[1] if foot is not None else bottom - room
        self._taken.append((left - room, low, left + room, bottom + room))

    def place(self, x: float, y: float, text: str, **style: Any) -> Annotation | None:
        """Write a label above a data point, as near as there is room, with a line to the point.

        Where there is no free room it may cover marks, but never another label; where there is none even
        so, nothing is written and None returned.
        """
        spot = self._free_spot(x, y, *self._size(text, style))
        if spot is None:
            return None
        shift, rise, box, leader = spot
        self._taken += [box, *leader]
        self._labels.append(box)
        self._leaders += leader
        return self._axes.annotate(
            text,
            (x, y),
            (shift, rise),
            textcoords="offset points",
            ha="center",
            va="bottom",
            arrowprops={**_LINE, "color": style.get("color")},
            **style,
        )

    def _free_spot(
        self, x: float, y: float, width: float, height: float
    ) -> tuple[float, float, Box, list[Box]] | None:
        """Return offset [points] and the boxes [pixels] of label and line."""
        for obstacles in (self._taken, [*self._labels, *self._leaders]):
            for shift, rise in self._offsets(width):
                box = self._box(x, y, shift, rise, width, height)
                leader = self._leader(x, y, box)
                if self._inside(box) and not _meets(box, obstacles) and not _crosses(leader, self._labels):
                    return shift, rise, box, leader
        return None

    def _offsets(self, width: float) -> Iterator[tuple[float, float]]:
        """Yield offsets [points], nearest first."""
        half = width * 36.0 / self._dpi
        for level in range(40):
            for shift in (0.0, half, -half, 2 * half, -2 * half, 3 * half, -3 * half):
                yield shift, 9.0 + level * _RISE

    def _size(self, text: str, style: dict[str, Any]) -> tuple[float, float]:
        trial = self._axes.text(0, 0, text, **style)
        extent = trial.get_window_extent()
        trial.remove()
        return extent.width, extent.height

    def _box(self, x: float, y: float, shift: float, rise: float, width: float, height: float) -> Box:
        centre, bottom = self._pixels(x, y)
        centre, bottom = centre + self._points(shift), bottom + self._points(rise)
        gap = self._points(_GAP)
        return (centre - width / 2 - gap, bottom - gap, centre + width / 2 + gap, bottom + height + gap)

    def _leader(self, x: float, y: float, label: Box) -> list[Box]:
        """Return the line from a point up to its label as a row of small boxes."""
        foot, bottom = self._pixels(x, y)
        across, up = (label[0] + label[2]) / 2 - foot, label[1] - bottom
        steps = [(foot + share * across, bottom + share * up) for share in _ALONG]
        return [(at - 1, height - 1, at + 1, height + 1) for at, height in steps]

    def _inside(self, box: Box) -> bool:
        frame = self._axes.get_window_extent()
        return bool(box[0] >= frame.x0 and box[2] <= frame.x1 and box[3] <= frame.y1)

    def _pixels(self, x: float, y: float) -> tuple[float, float]:
        at = self._axes.transData.transform((x, y))
        return float(at[0]), float(at[1])

    def _points(self, points: float) -> float:
        return points * self._dpi / 72

    @property
    def _dpi(self) -> float:
        return float(self._axes.figure.get_dpi())


def _crosses(line: Iterable[Box], others: Sequence[Box]) -> bool:
    return any(_meets(part, others) for part in line)


def _meets(one: Box, others: Iterable[Box]) -> bool:
    return any(
        one[0] < other[2] and other[0] < one[2] and one[1] < other[3] and other[1] < one[3]
        for other in others
    )
