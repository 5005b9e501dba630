"""Fitting the classes with an end group again, each to its own records."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np

from branchpos.end_group import EndGroup
from branchpos.predicting.classes import CLASS_RULES
from branchpos.predicting.predictor import predictor_of
from branchpos.scoring.error_model import errors_to_record
from branchpos.workflow.model import ClassModel
from branchpos.workflow.reference_spectra import KnownSpectrum
from branchpos.workflow.yield_fit import YieldFit, fit_yields

ITERATIONS = 5
"""Steps from the prior that bring every class to rest (measured: the next step moves no value by 0.1 sd)."""
_RULES_ONLY_WIDENING = 1.5
"""Factor on the error scales of a class that stands on rules alone."""


def fit_class(
    end_group: EndGroup,
    known: Sequence[KnownSpectrum],
    provenance: Mapping[str, str],
    start: ClassModel | None = None,
    iterations: int = ITERATIONS,
) -> ClassModel:
    """Fit one class to its records; with none, the rules stand with wider errors.

    Parameters
    ----------
    known : records of the class that keep enough peaks.
    start : a former fit to begin from.
    """
    begin = None if start is None else YieldFit(start.parameters, start.errors, np.inf)
    fit = fit_yields(known, provenance, end_group=end_group, start=begin, iterations=iterations)
    rules_only = not CLASS_RULES[end_group.name].fitted
    errors = fit.errors.widened(_RULES_ONLY_WIDENING) if rules_only and begin is None else fit.errors
    return ClassModel(end_group, fit.parameters, errors)


def headed_to_record(model: ClassModel) -> dict[str, object]:
    """Return a class model as a JSON-ready record; of the covariance only the diagonal is kept."""
    names = predictor_of(model.end_group).names
    spread = np.sqrt(np.diag(model.parameters.covariance))
    return {
        "provenance": dict(model.parameters.provenance),
        "errors": dict(errors_to_record(model.errors)),
        "values": {name: round(float(v), 4) for name, v in zip(names, model.parameters.values, strict=True)},
        "standard_errors": [round(float(v), 3) for v in spread],
    }


def write_classes(models: Mapping[str, ClassModel], path: Path) -> None:
    """Write class models as the reference set that ``locate`` reads."""
    classes = {name: headed_to_record(model) for name, model in models.items()}
    path.write_text(json.dumps({"classes": classes}, indent=1) + "\n", encoding="utf-8")
