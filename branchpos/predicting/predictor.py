"""Prediction of every chain class behind one call: parameters, prior, and ions of a batch of chains."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from types import MappingProxyType
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import ALKANE, EndGroup
from branchpos.ion_series import SeriesBatch
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.classes import CLASS_RULES
from branchpos.predicting.headed import ClassRules, entries, predict_headed, prior_precision
from branchpos.predicting.parameters import YieldParameters, parameter_names, prior_parameters

FloatArray = NDArray[np.float64]


class Predictor(Protocol):
    """What the fit and the scoring need of a chain class."""

    @property
    def names(self) -> tuple[str, ...]:
        """Parameter names, in the order of all vectors."""

    @property
    def prior_mean(self) -> FloatArray:
        """Values believed before any spectrum, shape (parameters,)."""

    @property
    def prior_precision(self) -> FloatArray:
        """How firmly, shape (parameters, parameters)."""

    def predict(self, values: FloatArray, backbone: int, positions: NDArray[np.int16]) -> SeriesBatch:
        """Return the expected ions of chains that share a backbone."""


@dataclass(frozen=True, slots=True)
class AlkanePredictor:
    """The cleavage model of alkanes."""

    @property
    def names(self) -> tuple[str, ...]:
        """Parameter names."""
        return parameter_names()

    @property
    def prior_mean(self) -> FloatArray:
        """Prior means."""
        return prior_parameters().values

    @property
    def prior_precision(self) -> FloatArray:
        """Prior precision matrix."""
        return np.asarray(np.linalg.inv(prior_parameters().covariance))

    def predict(self, values: FloatArray, backbone: int, positions: NDArray[np.int16]) -> SeriesBatch:
        """Return the expected ions."""
        return predict_alkanes(YieldParameters(values, _NOTHING, MappingProxyType({})), backbone, positions)


@dataclass(frozen=True, slots=True)
class HeadedPredictor:
    """The tables of one class with an end group."""

    rules: ClassRules

    @property
    def names(self) -> tuple[str, ...]:
        """Parameter names."""
        return tuple(row.name for row in entries(self.rules))

    @property
    def prior_mean(self) -> FloatArray:
        """Prior means."""
        return np.array([row.mean for row in entries(self.rules)])

    @property
    def prior_precision(self) -> FloatArray:
        """Prior precision matrix."""
        return prior_precision(self.rules)

    def predict(self, values: FloatArray, backbone: int, positions: NDArray[np.int16]) -> SeriesBatch:
        """Return the expected ions."""
        return predict_headed(self.rules, values, backbone, positions)


_NOTHING = np.empty((0, 0))


@lru_cache(maxsize=32)
def predictor_of(end_group: EndGroup) -> Predictor:
    """Return the predictor of a chain class (``KeyError`` for one that cannot be placed)."""
    return AlkanePredictor() if end_group == ALKANE else HeadedPredictor(CLASS_RULES[end_group.name])
