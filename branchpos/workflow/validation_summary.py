"""Figures drawn from the scores of records of known structure."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Sequence
from statistics import fmean, median
from typing import Any

from branchpos.workflow.known_scores import RecordScore
from branchpos.workflow.record_scores import CONFIDENT, TruthScore, confident_error

Record = dict[str, Any]

LEVELS = (0.5, 0.6, 0.7, 0.8, 0.9, 0.95, 0.99)
_SMALLEST_CHANGE = 1e-3
"""Change of a probability that counts as one."""


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
