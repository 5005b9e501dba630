"""The result of a validation as one plain record, format ``branchpos.validation/1``.

``records`` holds one entry a spectrum of known structure, ``summary`` the figures drawn from them, ``others``
what was said of compounds that are no chains, ``index`` what a retention index adds, ``retention`` how well
indices themselves are predicted, ``yardsticks`` what two simple methods reach on the same spectra.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import asdict, dataclass, field
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from platform import python_version
from typing import Any

from branchpos.naming import systematic_name
from branchpos.predicting.retention_fit import SOURCE, LeftOutScore
from branchpos.workflow.false_claims import CLAIMS, OtherScore
from branchpos.workflow.held_out import index_chain
from branchpos.workflow.known_scores import INDEX_SD, CompoundScore, RecordScore, StartCheck
from branchpos.workflow.record_scores import ALKANES, TruthScore
from branchpos.workflow.reference_spectra import KnownSpectrum
from branchpos.workflow.validation_summary import confident_errors, coverage, index_gain, summary, yardsticks
from branchpos.workflow.yield_fit import YieldFit

FORMAT = "branchpos.validation/1"

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
