"""A chain as a straight zigzag, with its deciding cleavages as cuts."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from branchpos.chain import Chain
from branchpos.reporting import palette
from branchpos.reporting.picture import Cut, NamedSize, cuts_of

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_AMPLITUDE = 0.32
"""Height of the zigzag about its middle [bond lengths along the axis]."""
_METHYL = 0.5
_CUT_REACH = 1.3
"""How far a cut reaches above and below the middle."""
_LEVEL = 0.62
"""Distance of the levels on which cut labels stand."""
_CHARACTER = 0.30
"""Width of a character of a cut label [carbons], a cautious guess, for the choice of level."""
_ALL_NUMBERS = 42
"""Longest backbone on which every carbon is numbered."""
_SHORTEST_AXIS = 26
"""Carbons that the axis has room for at least, so that short chains keep the look of long ones."""
_MARGIN_BELOW, _MARGIN_ABOVE = 0.45, 1.0
_INCHES = 0.26
"""Height on paper of one unit of the upright axis, see ``chain_height``."""


@dataclass(frozen=True, slots=True)
class _Arm:
    cut: Cut
    text: str
    level: int


def draw_chain(axes: Axes, chain: Chain, named: Sequence[NamedSize] = (), label: str = "") -> None:
    """Draw a chain with carbon numbers, methyls and cuts on given axes.

    Parameters
    ----------
    axes : where to draw; its frame is hidden and its limits are set.
    chain : the structure.
    named : sizes whose cleavages are drawn as cuts, m/z on the side that keeps the charge.
    label : written above the left end.
    """
    arms = _arms(chain, named)
    axes.set_xlim(-1.0, max(chain.backbone, _SHORTEST_AXIS) + 2.0)
    axes.set_ylim(*_upright_limits(arms))
    axes.axis("off")
    x = list(range(1, chain.backbone + 1))
    axes.plot(
        x, [_height(place) for place in x], color=palette.INK, lw=1.6, solid_joinstyle="round", zorder=3
    )
    for position in dict.fromkeys(chain.methyls):
        _draw_methyls(axes, position, chain.methyls.count(position))
    _write_numbers(axes, chain)
    for arm in arms:
        _draw_arm(axes, arm)
    axes.text(0.0, 1.0, label, transform=axes.transAxes, fontsize=8, color=palette.INK, va="top", ha="left")


def chain_height(chain: Chain, named: Sequence[NamedSize] = ()) -> float:
    """Return the height [inches] at which a chain with its cuts is well drawn."""
    low, high = _upright_limits(_arms(chain, named))
    return (high - low) * _INCHES


def _upright_limits(arms: Sequence[_Arm]) -> tuple[float, float]:
    top = max((arm.level for arm in arms if arm.cut.keeps_left), default=0)
    bottom = max((arm.level for arm in arms if not arm.cut.keeps_left), default=0)
    return -_CUT_REACH - _MARGIN_BELOW - bottom * _LEVEL, _CUT_REACH + _MARGIN_ABOVE + top * _LEVEL


def _height(carbon: int) -> float:
    return -_AMPLITUDE if carbon % 2 else _AMPLITUDE


def _draw_methyls(axes: Axes, position: int, count: int) -> None:
    """Draw one methyl upright from its carbon, two of them spread."""
    start = _height(position)
    way = 1 if start > 0 else -1
    for lean in (0.0,) if count == 1 else (-0.35, 0.35):
        axes.plot(
            [position, position + lean], [start, start + way * _METHYL], color=palette.INK, lw=1.6, zorder=3
        )
        axes.plot([position + lean], [start + way * _METHYL], "o", ms=4, color=palette.FIRST_LINE, zorder=4)


def _write_numbers(axes: Axes, chain: Chain) -> None:
    """Write the carbon numbers on the inner side of each bend; those with methyls stand out."""
    for carbon in range(1, chain.backbone + 1):
        branched = carbon in chain.methyls
        end = carbon in (1, chain.backbone)
        if chain.backbone > _ALL_NUMBERS and carbon % 5 and not branched and not end:
            continue
        inside = -1 if _height(carbon) > 0 else 1
        axes.text(
            carbon,
            _height(carbon) + inside * 0.2,
            str(carbon),
            fontsize=7.5 if branched else 6,
            fontweight="bold" if branched else "normal",
            color=palette.INK if branched else palette.QUIET,
            ha="center",
            va="top" if inside < 0 else "bottom",
        )


def _arms(chain: Chain, named: Iterable[NamedSize]) -> list[_Arm]:
    """Give every cut a level on its side of the chain, so that its label meets no other label or cut."""
    wanted = [
        (cut, ", ".join(map(str, size.masses)))
        for size in named
        if size.carbons < chain.carbons
        for cut in cuts_of(chain, size.carbons)[:2]
    ]
    to_left = sorted((pair for pair in wanted if pair[0].keeps_left), key=lambda pair: pair[0].bond)
    to_right = sorted((pair for pair in wanted if not pair[0].keeps_left), key=lambda pair: -pair[0].bond)
    return _levelled(to_left) + _levelled(to_right)


def _levelled(pairs: Iterable[tuple[Cut, str]]) -> list[_Arm]:
    """Stack cuts given in the order in which their labels point; a later one stands outside the others."""
    arms: list[_Arm] = []
    for cut, text in pairs:
        start, stop = _span(cut, text)
        met = [
            arm.level
            for arm in arms
            if start < _span(arm.cut, arm.text)[1] and _span(arm.cut, arm.text)[0] < stop
        ]
        arms.append(_Arm(cut, text, max(met, default=-1) + 1))
    return arms


def _span(cut: Cut, text: str) -> tuple[float, float]:
    """Return where along the chain a cut with its label lies."""
    at, length = cut.bond + 0.5, _CHARACTER * len(text) + 0.9
    return (at - length, at + 0.2) if cut.keeps_left else (at - 0.2, at + length)


def _draw_arm(axes: Axes, arm: _Arm) -> None:
    """Draw a cut: a line through the bond, bent towards the side that keeps the charge."""
    at = arm.cut.bond + 0.5
    side = 1 if arm.cut.keeps_left else -1
    reach = side * (_CUT_REACH + arm.level * _LEVEL)
    foot = at - side * 0.55
    dashes = (0, (3, 1.4))
    axes.plot(
        [at, at, foot], [-side * 0.55, reach, reach], color=palette.FIRST_LINE, lw=1.2, ls=dashes, zorder=2
    )
    axes.text(
        foot - side * 0.12,
        reach,
        arm.text,
        fontsize=7.5,
        color=palette.INK,
        ha="right" if arm.cut.keeps_left else "left",
        va="center",
    )
