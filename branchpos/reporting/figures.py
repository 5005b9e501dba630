"""Whole figures, and how they are saved so that they repeat byte for byte.

``draw_ion_series``, ``draw_spectrum`` and ``draw_chain`` draw on axes the caller may pass.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from branchpos.reporting import palette
from branchpos.reporting.chain_drawing import chain_height, draw_chain
from branchpos.reporting.ion_view import draw_ion_series, ion_places
from branchpos.reporting.picture import Picture
from branchpos.reporting.stick_spectrum import draw_spectrum
from branchpos.spectrum import Spectrum

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = [
    "draw_chain",
    "draw_ion_series",
    "draw_spectrum",
    "prediction_figure",
    "save_figure",
    "verdict_figure",
]

_WIDTH = 10.5
_HEAD, _SERIES, _GAP, _STICKS, _FOOT = 0.75, 4.4, 0.6, 1.5, 0.55
"""Heights of the parts [inches]."""
_LEFT, _RIGHT = 0.075, 0.985
_STYLE: Any = {
    "font.family": "DejaVu Sans",
    "font.size": 8,
    "axes.edgecolor": palette.QUIET,
    "axes.labelcolor": palette.INK,
    "xtick.color": palette.INK,
    "ytick.color": palette.INK,
    "hatch.linewidth": 0.5,
    "svg.hashsalt": "branchpos",
    "svg.fonttype": "path",
}
_METADATA: dict[str, dict[str, Any]] = {
    ".svg": {"Date": None, "Creator": "branchpos"},
    ".pdf": {"CreationDate": None, "Creator": "branchpos"},
    ".png": {"Software": "branchpos"},
}


def verdict_figure(picture: Picture, spectrum: Spectrum) -> Figure:
    """Return the figure of a verdict: chains, ion series, stick spectrum, on one scale of size."""
    return _figure(picture, spectrum)


def prediction_figure(picture: Picture) -> Figure:
    """Return the figure of a prediction: the chain and its expected ion series."""
    return _figure(picture, None)


def save_figure(figure: Figure, path: Path) -> None:
    """Write a figure; the suffix settles the format (``OSError`` where it cannot be written)."""
    from matplotlib import rc_context

    with rc_context(_STYLE):
        figure.savefig(path, dpi=160, metadata=_METADATA[path.suffix.lower()])


def _figure(picture: Picture, spectrum: Spectrum | None) -> Figure:
    """Stack chains, ion series and stick spectrum; without evidence for any chain, the spectrum alone."""
    from matplotlib import rc_context
    from matplotlib.figure import Figure

    chains = [chain_height(layer.chain, picture.named) for layer in picture.layers]
    below = [_SERIES] * bool(chains) + [_STICKS + _GAP] * (spectrum is not None)
    total = _HEAD + sum(chains) + sum(below) + _FOOT
    mz_range = None
    with rc_context(_STYLE):
        figure = Figure(figsize=(_WIDTH, total), facecolor=palette.PAPER)
        _write_head(figure, picture, total)
        top = total - _HEAD
        for number, (layer, height) in enumerate(zip(picture.layers, chains, strict=True)):
            draw_chain(_part(figure, top, height, total), layer.chain, picture.named, layer.label)
            if len(chains) > 1:
                _draw_swatch(figure, top / total, 0.11 / total, second=number == 1)
            top -= height
        if chains:
            series = _part(figure, top - 0.3, _SERIES - 0.3, total)
            draw_ion_series(series, picture)
            _write_legend(figure, series, picture, top / total)
            mz_range = _mz_range(series, picture)
            top -= _SERIES
        if spectrum is not None:
            draw_spectrum(
                _part(figure, top - _GAP, _STICKS, total), spectrum, mz_range, _named_masses(picture)
            )
    return figure


def _part(figure: Figure, top: float, height: float, total: float) -> Axes:
    """Return axes across the figure; top and height in inches."""
    return figure.add_axes((_LEFT, (top - height) / total, _RIGHT - _LEFT, height / total))


def _write_head(figure: Figure, picture: Picture, total: float) -> None:
    figure.text(_LEFT, 1 - 0.2 / total, picture.headline, fontsize=12, fontweight="bold", va="top")
    figure.text(_LEFT, 1 - 0.47 / total, _shortened(picture.title), fontsize=8, color=palette.QUIET, va="top")


def _draw_swatch(figure: Figure, top: float, height: float, second: bool) -> None:
    """Put the look of a hypothesis's band beside its name; lengths are shares of the figure."""
    from matplotlib.patches import Rectangle

    look: dict[str, Any]
    if second:
        look = {"fill": False, "edgecolor": palette.SECOND, "hatch": "////////", "lw": 1.0}
    else:
        look = {"facecolor": palette.FIRST, "lw": 0}
    figure.add_artist(Rectangle((_LEFT - 0.02, top - height), 0.014, height, **look))


def _write_legend(figure: Figure, series: Axes, picture: Picture, top: float) -> None:
    """Put the key above the ion series, where no data can be."""
    from matplotlib.lines import Line2D

    handles, labels = series.get_legend_handles_labels()
    if picture.threshold is not None:
        handles += [Line2D([], [], ls="", marker="o", mfc=palette.PAPER, mec=palette.INK, ms=4)]
        handles += [Line2D([], [], color=palette.QUIET, ls=(0, (5, 3)), lw=0.9)]
        labels += ["not seen", "detection threshold"]
    figure.legend(
        handles,
        labels,
        loc="center left",
        bbox_to_anchor=(_LEFT - 0.005, top - 0.012),
        ncols=len(labels),
        frameon=False,
        fontsize=7.5,
        handletextpad=0.5,
        columnspacing=1.4,
    )


def _mz_range(series: Axes, picture: Picture) -> tuple[float, float]:
    """Return the m/z axis that puts every peak below its place in the ion series."""
    ions = [ion for layer in picture.layers[:1] for ion in layer.ions]
    places = ion_places(picture.layers)
    shift = sum(ion.mz - 14 * places[ion.mz].x for ion in ions) / max(len(ions), 1)
    low, high = series.get_xlim()
    return 14 * low + shift, 14 * high + shift


def _named_masses(picture: Picture) -> list[int]:
    return [mass for size in picture.named for mass in size.masses]


def _shortened(title: str, longest: int = 130) -> str:
    plain = "".join(char if char.isprintable() else " " for char in title)
    return plain if len(plain) <= longest else plain[: longest - 3] + "..."
