"""The validation record as a figure: coverage by level, and what a retention index adds."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from branchpos.reporting.figures import save_figure
from branchpos.reporting.palette import FIRST_LINE, QUIET, SECOND

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Record = Mapping[str, Any]

_KINDS = (("unbranched", "o", SECOND, False), ("branched", "s", FIRST_LINE, True))
"""Name, mark, colour, and whether the truth carries branches."""


def draw_validation(record: Record, path: Path) -> None:
    """Draw coverage by level and what an index adds to each record, as SVG or PNG by the suffix."""
    from matplotlib.figure import Figure

    figure = Figure(figsize=(9.0, 4.2), layout="constrained")
    left, right = figure.subplots(1, 2)
    _draw_coverage(left, record["coverage"])
    _draw_gain(right, record["records"])
    figure.suptitle(f"Held-out spectra of known alkanes, branchpos {record['program']}", fontsize=10)
    save_figure(figure, path)


def _draw_coverage(axes: Axes, coverage: Sequence[Record]) -> None:
    levels = [one["level"] for one in coverage]
    axes.plot([0.45, 1], [0.45, 1], color=QUIET, linewidth=1, label="as claimed")
    for kind, mark, shade, _ in _KINDS:
        shares = [one[kind] / one[f"{kind}_records"] for one in coverage if one[f"{kind}_records"]]
        if shares:
            number = coverage[0][f"{kind}_records"]
            label = f"{kind} ({number} records)"
            axes.plot(levels, shares, marker=mark, color=shade, linewidth=1.2, label=label)
    axes.set_xlabel("level that the credible set claims")
    axes.set_ylabel("share of sets that hold the truth")
    axes.set_ylim(0, 1.04)
    axes.legend(frameon=False, fontsize=8, loc="lower right")


def _draw_gain(axes: Axes, records: Sequence[Record]) -> None:
    axes.plot([0, 1], [0, 1], color=QUIET, linewidth=1)
    for kind, mark, shade, branched in _KINDS:
        pairs = [
            (one["alone"]["posterior"], one["with_index"]["posterior"])
            for one in records
            if one["with_index"] is not None and (one["methyls"] > 0) == branched
        ]
        if pairs:
            alone, indexed = zip(*pairs, strict=True)
            axes.scatter(alone, indexed, marker=mark, color=shade, s=28, alpha=0.7, label=kind)
    axes.set_xlabel("probability of the truth, spectrum alone")
    axes.set_ylabel("with the retention index")
    axes.set_xlim(-0.04, 1.04)
    axes.set_ylim(-0.04, 1.04)
    if axes.collections:
        axes.legend(frameon=False, fontsize=8, loc="lower right")
