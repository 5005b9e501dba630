"""The ion-series view: the ions of each size side by side, expected as bands, observed as marks."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from math import log
from typing import TYPE_CHECKING, Any

from branchpos.reporting import palette
from branchpos.reporting.label_placing import LabelPlacer
from branchpos.reporting.picture import Layer, Picture, ShownIon, cuts_of

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_STEP, _ROOM = 0.4, 0.8
"""Distance [carbons] of neighbouring ions of a size, and the room that all of them have."""
_BAND = 0.75
"""Width of a band, of the distance to the next ion of its size."""
_SAME = 0.15
"""Natural log of the ratio of two expectations below which they count as one: only one band is drawn."""
_ROOM_ABOVE, _ROOM_FOR_NAMES = 3.2, 12.0
"""Factor by which the axis reaches beyond the base peak, and where tall ions are named."""
_TALL = 0.5
_LOWEST = 6e-4
"""Lower end of the axis where no threshold is known."""
_MARKS = {True: "o", False: "s"}
"""Marks of odd-mass and even-mass ions."""


def draw_ion_series(axes: Axes, picture: Picture) -> None:
    """Draw expected bands, observed marks, threshold and the named ions on given axes.

    Each size [carbons] has its ions side by side, lighter mass left; even-mass ions are squares,
    odd-mass ions circles. The vertical axis is logarithmic, in percent of the base peak.
    """
    places = ion_places(picture.layers)
    _set_limits(axes, picture, places)
    for layer in picture.layers[:1]:
        _draw_first(axes, layer, places)
    for layer in picture.layers[1:2]:
        _draw_second(axes, layer, picture.layers[0], places)
    if picture.threshold is not None:
        axes.axhline(100 * picture.threshold, color=palette.QUIET, lw=0.9, ls=(0, (5, 3)), zorder=2)
        _draw_observed(axes, picture, places)
    _write_names(axes, picture, places)


@dataclass(frozen=True, slots=True)
class Place:
    """Where an ion stands on the axis of sizes, and how wide its band is [carbons]."""

    x: float
    width: float


def ion_places(layers: Iterable[Layer]) -> dict[int, Place]:
    """Return the place of each mass number: beside the others of its size, lighter ones left.

    >>> from branchpos.chain import Chain
    >>> pair = (ShownIon(84, 6, 0.2, 0.1, 0.4), ShownIon(85, 6, 0.6, 0.3, 1.0))
    >>> {mass: place.x for mass, place in ion_places([Layer(Chain(25, (5, 11)), "", pair)]).items()}
    {84: 5.8, 85: 6.2}
    """
    by_size: dict[int, set[int]] = {}
    for layer in layers:
        for ion in layer.ions:
            by_size.setdefault(ion.carbons, set()).add(ion.mz)
    places: dict[int, Place] = {}
    for size, masses in by_size.items():
        step = min(_STEP, _ROOM / len(masses))
        for rank, mass in enumerate(sorted(masses)):
            places[mass] = Place(size + step * (rank - (len(masses) - 1) / 2), _BAND * step)
    return places


def lowest_shown(picture: Picture) -> float:
    """Return the lower end of the axis, relative to the base peak."""
    return _LOWEST if picture.threshold is None else picture.threshold / 3


def _set_limits(axes: Axes, picture: Picture, places: dict[int, Place]) -> None:
    from matplotlib.ticker import NullLocator

    axes.set_yscale("log")
    axes.set_ylim(100 * lowest_shown(picture), 100 * _room_above(picture))
    middles = [place.x for place in places.values()] or [3.0, 10.0]
    axes.set_xlim(min(middles) - 0.6, max(middles) + 0.6)
    _set_percent_axis(axes)
    sizes = range(round(min(middles)), round(max(middles)) + 1)
    axes.set_xticks(sizes)
    axes.xaxis.set_minor_locator(NullLocator())
    for size in sizes[::2]:
        axes.axvspan(size - 0.5, size + 0.5, color=palette.FAINT, alpha=0.55, lw=0, zorder=0)
    axes.set_ylabel("abundance, % of base peak")
    axes.set_xlabel("size of the ion [carbons]")
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def _room_above(picture: Picture) -> float:
    named = {mass for size in picture.named for mass in size.masses}
    shown = [ion for layer in picture.layers for ion in layer.ions if ion.mz in named]
    tallest = max((max(ion.high, ion.observed or 0.0) for ion in shown), default=0.0)
    return _ROOM_FOR_NAMES if tallest > _TALL else _ROOM_ABOVE


def _set_percent_axis(axes: Axes) -> None:
    """Mark the decades up to the base peak; the room above it is for labels only."""
    from matplotlib.ticker import FixedLocator, FuncFormatter, NullFormatter

    floor = axes.get_ylim()[0]
    decades = [10.0**power for power in range(-4, 3)]
    axes.yaxis.set_major_locator(FixedLocator(decades))
    axes.yaxis.set_minor_locator(FixedLocator([step * one for one in decades[:-1] for step in range(2, 10)]))
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axes.yaxis.set_minor_formatter(NullFormatter())
    axes.spines["left"].set_bounds(floor, 100.0)


def _draw_first(axes: Axes, layer: Layer, places: dict[int, Place]) -> None:
    """Draw the expected range of every ion as a filled upright bar, its middle as a line across."""
    shown = _above(layer.ions, axes)
    axes.bar(*_bars(shown, places, axes), color=palette.FIRST, lw=0, zorder=1, label="expected range")
    _draw_middles(axes, shown, places, palette.FIRST_LINE, 1.8)


def _draw_second(axes: Axes, layer: Layer, first: Layer, places: dict[int, Place]) -> None:
    """Draw the second hypothesis as outlined, hatched bars, only where it expects something else."""
    usual = {ion.mz: ion.expected for ion in first.ions}
    shown = [ion for ion in _above(layer.ions, axes) if _differs(ion.expected, usual.get(ion.mz))]
    style: dict[str, Any] = {
        "fill": False,
        "edgecolor": palette.SECOND,
        "lw": 1.0,
        "hatch": "////",
        "zorder": 3,
    }
    axes.bar(*_bars(shown, places, axes), label="second hypothesis, where it differs", **style)
    _draw_middles(axes, shown, places, palette.SECOND, 1.4)


def _above(ions: Iterable[ShownIon], axes: Axes) -> list[ShownIon]:
    floor = axes.get_ylim()[0]
    return [ion for ion in ions if 100 * ion.high > floor]


def _differs(expected: float, usual: float | None) -> bool:
    return usual is None or abs(log(expected / usual)) > _SAME


def _bars(
    ions: Sequence[ShownIon], places: dict[int, Place], axes: Axes
) -> tuple[list[float], list[float], list[float], list[float]]:
    """Return place, height, width and lower end of the bars of these ions, cut at the end of the axis."""
    floor = axes.get_ylim()[0]
    ends = [(max(100 * ion.low, floor), 100 * ion.high) for ion in ions]
    at = [places[ion.mz] for ion in ions]
    return (
        [place.x for place in at],
        [high - low for low, high in ends],
        [place.width for place in at],
        [low for low, _ in ends],
    )


def _draw_middles(
    axes: Axes, ions: Iterable[ShownIon], places: dict[int, Place], colour: str, weight: float
) -> None:
    floor = axes.get_ylim()[0]
    middle = [(places[ion.mz], 100 * ion.expected) for ion in ions if 100 * ion.expected > floor]
    left, right = ([place.x + way * place.width / 2 for place, _ in middle] for way in (-1, 1))
    axes.hlines([y for _, y in middle], left, right, color=colour, lw=weight, zorder=3)


def _draw_observed(axes: Axes, picture: Picture, places: dict[int, Place]) -> None:
    """Draw what was seen as filled marks, what stayed below the threshold as open marks on its line."""
    ions = _observed_ions(picture.layers)
    level = 100 * (picture.threshold or 0.0)
    for is_odd, mark in _MARKS.items():
        parity = [ion for ion in ions if bool(ion.mz % 2) == is_odd]
        seen = [ion for ion in parity if ion.observed is not None]
        absent = [ion for ion in parity if ion.observed is None]
        size = 4.6 if is_odd else 4.2
        kind = "odd" if is_odd else "even"
        axes.plot(
            [places[ion.mz].x for ion in seen], [100 * (ion.observed or 0.0) for ion in seen], mark, ms=size,
            color=palette.INK, mec=palette.PAPER, mew=0.5, zorder=5, label=f"observed, {kind} mass",
        )  # fmt: skip
        axes.plot(
            [places[ion.mz].x for ion in absent], [level] * len(absent), mark, ms=size - 0.6,
            mfc=palette.PAPER, mec=palette.INK, mew=0.8, zorder=4,
        )  # fmt: skip


def _observed_ions(layers: Sequence[Layer]) -> list[ShownIon]:
    """Return one entry for each mass number that any layer speaks of."""
    return list({ion.mz: ion for layer in reversed(layers) for ion in layer.ions}.values())


def _write_names(axes: Axes, picture: Picture, places: dict[int, Place]) -> None:
    """Label the named sizes with m/z, the bond, and what they say."""
    if not picture.layers:
        return
    placer = LabelPlacer(axes)
    floor = axes.get_ylim()[0]
    tops: dict[int, float] = {}
    for ion in _observed_ions(picture.layers):
        heights = [one.high for layer in picture.layers for one in layer.ions if one.mz == ion.mz]
        top = 100 * max(*heights, ion.observed or 0.0)
        if top > floor:
            tops[ion.mz] = top
            placer.keep_clear(places[ion.mz].x, top, foot=floor)
    for named in picture.named:
        masses = [mass for mass in named.masses if mass in tops]
        if masses:
            x = sum(places[mass].x for mass in masses) / len(masses)
            y = max(tops[mass] for mass in masses)
            text = "\n".join(_name_lines(picture, named.carbons, masses, named.note))
            placer.place(x, y, text, fontsize=7.5, color=palette.INK, linespacing=1.15)


def _name_lines(picture: Picture, carbons: int, masses: Sequence[int], note: str) -> list[str]:
    chain = picture.layers[0].chain
    bonds = ", ".join(dict.fromkeys(cut.words for cut in cuts_of(chain, carbons)[:2]))
    if carbons == chain.carbons:
        bonds = "molecular ion"
    elif carbons == chain.carbons - 1:
        bonds = "loss of CH3"
    return [part for part in (", ".join(map(str, masses)), bonds, note) if part]
