"""The result of a validation as one plain record, format ``branchpos.validation/1``.

``records`` holds one entry a spectrum of known structure, ``summary`` the figures drawn from them, ``others``
what was said of compounds that are no chains, ``index`` what a retention index adds, ``retention`` how well
indices themselves are predicted, ``yardsticks`` what two simple methods reach on the same spectra.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import asdict, dataclass, field
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from platform import python_version
from statistics import fmean, median
from typing import Any

from branchpos.naming import systematic_name
from branchpos.predicting.retention_fit import SOURCE, LeftOutScore
from branchpos.workflow.false_claims import CLAIMS, OtherScore
from branchpos.workflow.held_out import index_chain
from branchpos.workflow.known_scores import INDEX_SD, CompoundScore, RecordScore, StartCheck
from branchpos.workflow.record_scores import ALKANES, CONFIDENT, TruthScore, confident_error
from branchpos.workflow.reference_spectra import KnownSpectrum
from branchpos.workflow.yield_fit import YieldFit

FORMAT = "branchpos.validation/1"
LEVELS = (0.5, 0.6, 0.7, 0.8, 0.9, 0.95, 0.99)
_SMALLEST_CHANGE = 1e-3
"""Change of a probability that counts as one."""

Record = dict[str, Any]


@dataclass(frozen=True, slots=True, eq=False)
class Sources:
    """What was scored: the folder, the table of indices, the known spectra."""

    folder: Path
    retention: Path | None
    known: Sequence[KnownSpectrum]


@dataclass(frozen=True, slots=True, eq=False)
class Findings:
    """What the scoring gave, see the classes of the fields."""

    compounds: Sequence[CompoundScore]
    others: Sequence[OtherScore] = ()
    retention: LeftOutScore | None = None
    starts: Sequence[StartCheck] = field(default_factory=tuple)


def validation_record(sources: Sources, full: YieldFit, found: Findings) -> Record:
    """Put everything into one record that JSON can hold."""
    scores = [score for compound in found.compounds for score in compound.records]
    return {
        "format": FORMAT,
        **_origin(sources, full),
        "fits": {
            "compounds": [_fit_entry(one) for one in found.compounds],
            "starts": [asdict(one) for one in found.starts],
        },
        "summary": summary(scores),
        "coverage": coverage(scores),
        "confident_errors": confident_errors(scores),
        "index": index_gain(scores),
        "yardsticks": yardsticks(scores),
        "others": others_entry(found.others),
        "retention": None if found.retention is None else retention_entry(found.retention),
        "records": [_record_entry(score) for score in scores],
    }


def _origin(sources: Sources, full: YieldFit) -> Record:
    chains = {one.chain for one in sources.known}
    return {
        "program": version("branchpos"),
        "command": _command(sources),
        "date": datetime.now(UTC).date().isoformat(),
        "versions": {"python": python_version(), "numpy": version("numpy"), "scipy": version("scipy")},
        "settings": {"prior": ALKANES.prior, "level": ALKANES.level, "index_sd": INDEX_SD},
        "data": {
            "spectra": full.parameters.provenance.get("data", ""),
            "indices": SOURCE if sources.retention is not None else "",
            "known_spectra": len(sources.known),
            "known_compounds": len(chains),
            "branched_compounds": sum(chain.is_branched for chain in chains),
        },
        "held_out": "leave one compound out: every record of the compound, and its retention index, took no "
        "part in the fits that scored it; records flagged sparse take part in no fit; the error model's "
        "judged constants were set with sight of all spectra",
    }


def _command(sources: Sources) -> str:
    table = f" --retention {_shown(sources.retention)}" if sources.retention is not None else ""
    return f"branchpos validate {_shown(sources.folder)}{table}"


def _shown(path: Path) -> str:
    """Return a path as it may be printed: relative ones as given, of others the last part."""
    return path.name if path.is_absolute() else path.as_posix()


def _fit_entry(one: CompoundScore) -> Record:
    entry = {name: getattr(one, name) for name in ("name", "refitted", "cold", "iterations", "last_move")}
    return {**entry, "accessions": [score.accession for score in one.records]}


def _record_entry(score: RecordScore) -> Record:
    return {
        "accession": score.accession,
        "quality": score.quality,
        "truth": score.name,
        "shorthand": score.short_name,
        "methyls": len(score.chain.methyls),
        "carbons": score.chain.carbons,
        "alone": _truth_entry(score.alone),
        "index": score.index,
        "index_source": score.index_source,
        "with_index": None if score.indexed is None else _truth_entry(score.indexed),
        "nearest": None if score.nearest is None else asdict(score.nearest),
        "ion_count": asdict(score.ion_count),
    }


def _truth_entry(one: TruthScore) -> Record:
    return {**asdict(one), "branched": one.branched}


def summary(scores: Sequence[RecordScore]) -> Record:
    """Count what was right, unbranched and branched chains apart, the latter by quality flag."""
    straight, branched = _split(scores)
    flags = sorted({score.quality for score in branched})
    return {
        "unbranched": {
            "records": len(straight),
            "unbranched_first": _count(straight, lambda s: not s.alone.first_is_branched),
            "unbranched_at_0.9": _count(straight, lambda s: s.alone.unbranched >= CONFIDENT),
            "branched_at_0.9": _count(straight, lambda s: s.alone.branched >= CONFIDENT),
            "right_size_first": _count(straight, lambda s: s.alone.rank == 1),
            "truth_in_set": _count(straight, lambda s: s.alone.in_set),
            "statuses": _statuses(straight),
        },
        "branched": {
            flag: _branched_entry([score for score in branched if score.quality == flag]) for flag in flags
        },
    }


def _branched_entry(scores: Sequence[RecordScore]) -> Record:
    return {
        "records": len(scores),
        "truth_first": _count(scores, lambda s: s.alone.rank == 1),
        "truth_in_set": _count(scores, lambda s: s.alone.in_set),
        "unbranched_at_0.9": _count(scores, lambda s: s.alone.unbranched >= CONFIDENT),
        "statuses": _statuses(scores),
    }


def _statuses(scores: Sequence[RecordScore]) -> dict[str, int]:
    return dict(sorted(Counter(score.alone.status for score in scores).items()))


def _split(scores: Sequence[RecordScore]) -> tuple[list[RecordScore], list[RecordScore]]:
    straight = [score for score in scores if not score.chain.is_branched]
    return straight, [score for score in scores if score.chain.is_branched]


def _count(scores: Sequence[RecordScore], is_so: Callable[[RecordScore], bool]) -> int:
    return sum(is_so(score) for score in scores)


def coverage(scores: Sequence[RecordScore]) -> list[Record]:
    """Return, by level, how many credible sets of that level hold the truth."""
    straight, branched = _split(scores)
    return [
        {
            "level": level,
            "unbranched": _covered(straight, level),
            "branched": _covered(branched, level),
            "unbranched_records": len(straight),
            "branched_records": len(branched),
        }
        for level in LEVELS
    ]


def _covered(scores: Sequence[RecordScore], level: float) -> int:
    return _count(scores, lambda s: s.alone.rank is not None and s.alone.mass_above < level)


def confident_errors(scores: Sequence[RecordScore]) -> list[Record]:
    """List every confident answer that is wrong, with and without an index."""
    found = []
    for score in scores:
        for kind, one in (("spectrum alone", score.alone), ("with index", score.indexed)):
            wrong = confident_error(one, score.chain) if one is not None else None
            if one is not None and wrong is not None:
                found.append(
                    {
                        "accession": score.accession,
                        "quality": score.quality,
                        "truth": score.name,
                        "evidence": kind,
                        "error": wrong,
                        "posterior_of_truth": one.posterior,
                        "reasons": list(one.reasons),
                    }
                )
    return found


def index_gain(scores: Sequence[RecordScore]) -> Record | None:
    """Compare verdicts with and without the retention index, None where no record has one."""
    pairs = [(score, score.alone, score.indexed) for score in scores if score.indexed is not None]
    if not pairs:
        return None
    kinds = {"all": pairs} | {
        kind: [pair for pair in pairs if pair[0].chain.is_branched == is_branched]
        for kind, is_branched in (("unbranched", False), ("branched", True))
    }
    without = sorted({score.name for score in scores if score.indexed is None})
    return {
        "no_index_known_for": without,
        **{kind: _gain([(a, b) for _, a, b in members]) for kind, members in kinds.items() if members},
    }


def _gain(pairs: Sequence[tuple[TruthScore, TruthScore]]) -> Record:
    sizes = [(alone.set_size, indexed.set_size) for alone, indexed in pairs]
    chances = [(alone.posterior, indexed.posterior) for alone, indexed in pairs]
    return {
        "records": len(pairs),
        "mean_set_size": _both(sizes, fmean),
        "median_set_size": _both(sizes, median),
        "mean_posterior_of_truth": _both(chances, fmean),
        "sets_smaller": sum(after < before for before, after in sizes),
        "sets_larger": sum(after > before for before, after in sizes),
        "truth_rose": sum(after > before + _SMALLEST_CHANGE for before, after in chances),
        "truth_fell": sum(after < before - _SMALLEST_CHANGE for before, after in chances),
    }


def _both(
    pairs: Sequence[tuple[float, float]], middle: Callable[[Sequence[float]], float]
) -> dict[str, float]:
    before, after = zip(*pairs, strict=True)
    return {"alone": float(middle(before)), "with_index": float(middle(after))}


def yardsticks(scores: Sequence[RecordScore]) -> Record:
    """Compare with the nearest known spectrum and with counting ions, on the same records."""
    straight, branched = _split(scores)
    return {
        kind: {
            "records": len(members),
            "program_right_first": _count(
                members, lambda s: s.alone.rank == 1 if s.chain.is_branched else not s.alone.first_is_branched
            ),
            "nearest_right": _count(members, lambda s: s.nearest is not None and s.nearest.right),
            "ion_count_right": _count(members, lambda s: s.ion_count.rank == 1),
            "mean_ion_count_rank": fmean(s.ion_count.rank for s in members),
            "mean_candidates": fmean(s.ion_count.candidates for s in members),
            "mean_rank_among_alike": fmean(s.ion_count.rank_among_alike for s in members),
            "mean_alike": fmean(s.ion_count.alike for s in members),
        }
        for kind, members in (("unbranched", straight), ("branched", branched))
        if members
    }


def others_entry(others: Sequence[OtherScore]) -> Record | None:
    """Count statuses of other compounds, and list each claim of a chain."""
    if not others:
        return None
    claims = sorted(
        (one for one in others if one.status in CLAIMS), key=lambda one: (one.status, -one.first_posterior)
    )
    return {
        "records": len(others),
        "statuses": dict(sorted(Counter(one.status for one in others).items())),
        "claims": [asdict(one) for one in claims],
        "not_judged": [asdict(one) for one in others if one.fault],
    }


def retention_entry(left_out: LeftOutScore) -> Record:
    """Return the figures of the indices themselves, left-out compounds predicted."""
    return {
        "by_methyls": {
            str(count): {
                "median_error": left_out.median_error[count],
                "rms_error": left_out.rms_error[count],
                "coverage_95": left_out.coverage[count],
            }
            for count in left_out.median_error
        },
        "coverage_95": left_out.overall_coverage,
        "suspects": [
            {"name": systematic_name(index_chain(row)), "measured": row.index, "residual": gap, "z": z}
            for row, gap, z in left_out.suspects
        ],
    }
