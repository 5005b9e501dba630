"""The fitted model that scores are worked out with: yields, errors, retention."""

from __future__ import annotations

from dataclasses import dataclass

from branchpos.predicting.parameters import YieldParameters, fitted_parameters
from branchpos.predicting.retention import RetentionParameters, shipped_parameters
from branchpos.scoring.error_model import ErrorModel, fitted_errors


@dataclass(frozen=True, slots=True, eq=False)
class Model:
    """Everything that was fitted.

    Attributes
    ----------
    yields : parameters of the cleavage model.
    errors : error scales and instrument effects.
    retention : parameters of the retention index.
    """

    yields: YieldParameters
    errors: ErrorModel
    retention: RetentionParameters


def shipped_model() -> Model:
    """Return the model that comes with the program (``ReferenceDataError`` where a set is missing)."""
    return Model(fitted_parameters(), fitted_errors(), shipped_parameters())
