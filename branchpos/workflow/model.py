"""The fitted model that scores are worked out with: yields and errors of each class, retention."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache, lru_cache
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import ALKANE, END_GROUPS, EndGroup
from branchpos.enumerating import chain_positions
from branchpos.errors import ReferenceDataError
from branchpos.ion_series import SeriesBatch
from branchpos.predicting.parameters import YieldParameters, fitted_parameters
from branchpos.predicting.predictor import predictor_of
from branchpos.predicting.retention import RetentionParameters, shipped_parameters
from branchpos.reference_data import load_reference
from branchpos.scoring.error_model import ErrorModel, errors_from_record, fitted_errors

CLASS_YIELDS_FILE = "class_yields.json"
_KEPT_ROWS = 1500


@dataclass(frozen=True, slots=True, eq=False)
class ClassModel:
    """The fitted model of one chain class.

    Attributes
    ----------
    end_group : the class.
    parameters : values with covariance.
    errors : error scales and instrument effects.
    """

    end_group: EndGroup
    parameters: YieldParameters
    errors: ErrorModel

    def predict(self, backbone: int, positions: NDArray[np.int16]) -> SeriesBatch:
        """Return the expected ions of chains that share a backbone."""
        return predictor_of(self.end_group).predict(self.parameters.values, backbone, positions)

    def predict_all(self, backbone: int, methyls: int) -> SeriesBatch:
        """Return the expected ions of every chain of a backbone; small batches are kept for the next call."""
        positions = chain_positions(backbone, methyls, self.end_group)
        if len(positions) > _KEPT_ROWS:
            return self.predict(backbone, positions)
        return _predicted_and_kept(self, backbone, methyls)


@lru_cache(maxsize=256)
def _predicted_and_kept(model: ClassModel, backbone: int, methyls: int) -> SeriesBatch:
    return model.predict(backbone, chain_positions(backbone, methyls, model.end_group))


@dataclass(frozen=True, slots=True, eq=False)
class Model:
    """Everything that was fitted.

    Attributes
    ----------
    yields, errors : the cleavage model of alkanes and its errors.
    retention : parameters of the retention index of alkanes.
    headed : models of the classes with an end group, by name; None stands for the shipped ones, which are
        read only when one is asked for.
    """

    yields: YieldParameters
    errors: ErrorModel
    retention: RetentionParameters
    headed: Mapping[str, ClassModel] | None = None

    def of(self, end_group: EndGroup) -> ClassModel:
        """Return the model of one class (``ReferenceDataError`` where none was fitted)."""
        if end_group == ALKANE:
            return _alkane_model(self)
        headed = shipped_headed() if self.headed is None else self.headed
        if end_group.name not in headed:
            raise ReferenceDataError(f"no model of the class {end_group.name!r}; run `branchpos refit`")
        return headed[end_group.name]


@lru_cache(maxsize=64)
def _alkane_model(model: Model) -> ClassModel:
    return ClassModel(ALKANE, model.yields, model.errors)


@cache
def shipped_model() -> Model:
    """Return the model that comes with the program (``ReferenceDataError`` where a set is missing)."""
    return Model(fitted_parameters(), fitted_errors(), shipped_parameters())


@cache
def shipped_headed() -> Mapping[str, ClassModel]:
    """Return the shipped models of the classes with an end group."""
    record = load_reference(CLASS_YIELDS_FILE)
    return MappingProxyType(
        {name: headed_from_record(END_GROUPS[name], one) for name, one in record["classes"].items()}
    )


def headed_from_record(end_group: EndGroup, record: Mapping[str, object]) -> ClassModel:
    """Turn a JSON record, as ``headed_to_record`` makes it, into a class model."""
    values, errors, provenance = record["values"], record["errors"], record["provenance"]
    names = predictor_of(end_group).names
    if not isinstance(values, dict) or not isinstance(errors, dict) or tuple(values) != names:
        raise ReferenceDataError(
            f"{CLASS_YIELDS_FILE} does not hold the parameters of this version; run `branchpos refit` again"
        )
    spread = record["standard_errors"]
    parameters = YieldParameters(
        np.array(list(values.values()), dtype=float),
        np.diag(np.array(spread, dtype=float) ** 2),
        MappingProxyType(dict(provenance) if isinstance(provenance, dict) else {}),
    )
    return ClassModel(end_group, parameters, errors_from_record(errors))
