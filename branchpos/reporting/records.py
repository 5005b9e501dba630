"""Results as JSON: stable, versioned formats, each with a published JSON Schema beside this file."""

from __future__ import annotations

import json
import sys
from collections.abc import Iterable, Sequence
from importlib.resources import files
from pathlib import Path
from typing import Any

from branchpos import __version__
from branchpos.chain import Chain
from branchpos.errors import NamingError, SettingsError
from branchpos.evidence import IonEvidence, Shares
from branchpos.ion_series import Ion, IonSeries
from branchpos.naming import shorthand, smiles, systematic_name
from branchpos.reporting.numbers import significant
from branchpos.retention_index import RetentionIndex
from branchpos.verdict import RankedHypothesis, Verdict

Record = dict[str, Any]

LOCATE_FORMAT, PREDICT_FORMAT = "branchpos.locate/1", "branchpos.predict/1"
LEVEL = 0.95
"""Level of the intervals that predictions carry."""
SCHEMAS = ("locate", "predict", "isomers")
_BIT_DECIMALS = 5
"""Weights keep so many decimals that the rounded ions of a long chain still add up to a thousandth."""


def schema(name: str) -> Record:
    """Return the published JSON Schema (draft 2020-12) of an output.

    Raises
    ------
    SettingsError : there is none of that name.

    >>> schema("locate")["properties"]["format"]
    {'const': 'branchpos.locate/1'}
    """
    if name not in SCHEMAS:
        raise SettingsError(f"no schema {name!r}", remedy=f"choose from {', '.join(SCHEMAS)}")
    text = files("branchpos.reporting").joinpath("schemas", f"{name}.schema.json").read_text(encoding="utf-8")
    loaded: Record = json.loads(text)
    return loaded


def locate_document(results: Iterable[Record], prior: str) -> Record:
    """Return the whole output of ``locate``; ``prior`` is the name of the prior used."""
    return {"format": LOCATE_FORMAT, "program": __version__, "prior": prior, "results": list(results)}


def verdict_record(verdict: Verdict) -> Record:
    """Return one result of ``locate``."""
    return {
        "source": verdict.source,
        "title": verdict.title,
        "warnings": list(verdict.warnings),
        "verdict": {
            "call": verdict.call,
            "status": verdict.status.value,
            "none_of_these": significant(verdict.none_of_these),
            "reasons": list(verdict.reasons),
        },
        "credible_set": {"level": verdict.level, "members": list(verdict.credible_set)},
        "hypotheses": [hypothesis_record(one) for one in verdict.hypotheses],
        "considered": verdict.considered,
        "rivals": [{"name": name, "posterior": significant(p)} for name, p in verdict.rivals],
    }


def hypothesis_record(one: RankedHypothesis) -> Record:
    """Return one hypothesis with the evidence for and against it."""
    return {
        **chain_record(one.chain),
        "posterior": significant(one.posterior),
        "log_likelihood": significant(one.log_likelihood, 7),
        "retention_z": None if one.retention_z is None else significant(one.retention_z, 4),
        "ions": [_evidence_record(ion) for ion in one.ions],
        "shares": None if one.shares is None else _shares_record(one.shares),
    }


def chain_record(chain: Chain) -> Record:
    """Return what a chain is, by name, structure and formula."""
    return {
        "name": systematic_name(chain),
        "shorthand": shorthand(chain),
        "chain_class": chain.end_group.name,
        "backbone_carbons": chain.backbone,
        "methyl_positions": list(chain.methyls),
        "formula": str(chain.formula),
        "smiles": smiles_or_none(chain),
    }


def smiles_or_none(chain: Chain) -> str | None:
    """Return line notation, or None where the class leaves the structure open (a bond not placed)."""
    try:
        return smiles(chain)
    except NamingError:
        return None


def predict_document(predictions: Iterable[tuple[IonSeries, RetentionIndex | None]]) -> Record:
    """Return the whole output of ``predict``."""
    return {"format": PREDICT_FORMAT, "results": [_prediction_record(*one) for one in predictions]}


def retention_record(index: RetentionIndex) -> Record:
    """Return a retention index with its interval [index units]."""
    low, high = index.interval(LEVEL)
    return {"value": round(index.value, 1), "low": round(low, 1), "high": round(high, 1), "level": LEVEL}


def write_document(document: Record, path: str | Path) -> None:
    """Write a document as JSON; ``-`` is standard output (``OSError`` where it cannot be written)."""
    text = json.dumps(document, indent=1, ensure_ascii=False, allow_nan=False) + "\n"
    if str(path) == "-":
        sys.stdout.write(text)
        sys.stdout.flush()
    else:
        Path(path).write_text(text, encoding="utf-8")


def _prediction_record(series: IonSeries, index: RetentionIndex | None) -> Record:
    return {
        "name": systematic_name(series.chain),
        "shorthand": shorthand(series.chain),
        "formula": str(series.chain.formula),
        "retention_index": None if index is None else retention_record(index),
        "ions": _ion_records(series.ions),
    }


def _ion_records(ions: Sequence[Ion]) -> list[Record]:
    return [
        {
            "mz": ion.mz,
            "carbons": ion.carbons,
            "expected": significant(ion.expected, 4),
            "low": significant(ion.low, 4),
            "high": significant(ion.high, 4),
            "cleavage": ion.cleavage,
        }
        for ion in ions
    ]


def _evidence_record(ion: IonEvidence) -> Record:
    """Return one ion; the threshold is given where the ion stayed below it."""
    record: Record = {
        "mz": ion.mz,
        "carbons": ion.carbons,
        "observed": None if ion.observed is None else significant(ion.observed, 5),
        "expected": significant(ion.expected, 5),
        "weight_of_evidence": _bits(ion.weight_of_evidence),
        "cleavage": ion.cleavage,
    }
    if ion.observed is None:
        record["threshold"] = significant(ion.threshold, 5)
    return record


def _shares_record(shares: Shares) -> Record:
    return {
        "ions": _bits(shares.ions),
        "other_masses": _bits(shares.other_masses),
        "instrument": _bits(shares.instrument),
        "retention_index": _bits(shares.retention_index),
        "prior": _bits(shares.prior),
    }


def _bits(weight: float) -> float:
    return round(float(weight), _BIT_DECIMALS) + 0.0
