"""Fitting the classes with an end group again, each to its own records."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import END_GROUPS, EndGroup
from branchpos.predicting.classes import CLASS_RULES
from branchpos.predicting.parameters import YieldParameters
from branchpos.predicting.predictor import predictor_of
from branchpos.scoring.error_model import ErrorModel, errors_to_record
from branchpos.workflow.model import ClassModel, shipped_headed
from branchpos.workflow.reference_spectra import KnownSpectrum, read_known_spectra
from branchpos.workflow.yield_fit import YieldFit, fit_yields

FloatArray = NDArray[np.float64]
Describe = Callable[[Sequence[KnownSpectrum]], Mapping[str, str]]

ITERATIONS = 5
"""Steps from the prior; the scales of the errors still settle in the first three (measured)."""
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


def refit_classes(folder: Path, names: Sequence[str], describe: Describe) -> dict[str, ClassModel]:
    """Fit the named classes to the records of a folder; the others, and those without records, stay as is.

    Records flagged as sparse, or with a mass axis that is off, take no part.

    Parameters
    ----------
    folder : holds ``truth.csv`` and the records, see ``read_known_spectra``.
    names : classes to fit.
    describe : returns the provenance of a fit from its records.
    """
    known = read_known_spectra(folder, CLASS_RULES)
    usable = [one for one in known if not one.is_sparse and "mass axis" not in one.quality]
    shipped = dict(shipped_headed())
    by_class = {name: [one for one in usable if one.chain.end_group.name == name] for name in CLASS_RULES}
    jobs = {
        name: records
        for name, records in by_class.items()
        if name in names and (records or name not in shipped)
    }
    with ProcessPoolExecutor() as pool:
        futures = {
            name: pool.submit(_fitted_values, name, records, dict(describe(records)))
            for name, records in sorted(jobs.items(), key=lambda job: -len(job[1]))
        }
        fitted = {name: _class_model(name, *future.result()) for name, future in futures.items()}
    return {name: fitted.get(name) or shipped[name] for name in CLASS_RULES}


def _fitted_values(
    name: str, records: Sequence[KnownSpectrum], provenance: dict[str, str]
) -> tuple[FloatArray, FloatArray, dict[str, str], ErrorModel]:
    """Fit one class in a process of its own; plain values travel back."""
    model = fit_class(END_GROUPS[name], records, provenance)
    return model.parameters.values, model.parameters.covariance, provenance, model.errors


def _class_model(
    name: str, values: FloatArray, covariance: FloatArray, provenance: dict[str, str], errors: ErrorModel
) -> ClassModel:
    return ClassModel(END_GROUPS[name], YieldParameters(values, covariance, provenance), errors)


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
