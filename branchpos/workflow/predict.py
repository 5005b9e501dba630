"""What a chain should show: its ions with intervals, and its retention index."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.end_group import ALKANE, PLACED_CLASSES
from branchpos.errors import SettingsError
from branchpos.ion_series import Ion, IonKind, IonSeries, SeriesBatch
from branchpos.masses import Formula
from branchpos.predicting.headed_labels import headed_compositions
from branchpos.predicting.labels import NEIGHBOUR, mass_labels
from branchpos.retention_index import EXACT, RetentionIndex
from branchpos.scoring.error_model import T_SCALE_TO_SD, ErrorModel
from branchpos.scoring.likelihood import tilt_coordinate
from branchpos.workflow.method import ALL_CARBONS
from branchpos.workflow.model import ClassModel, Model, shipped_model
from branchpos.workflow.retention import has_retention_model, predict_index

FloatArray = NDArray[np.float64]

LEAST = 1e-3
"""Abundance relative to the base peak below which ions are left out."""
REACH = 1.96
"""Standard deviations on either side that hold 95 %."""
_DIFFERENCE = 1e-3
"""Step of the finite differences, natural-log units."""


@dataclass(frozen=True, slots=True)
class Prediction:
    """What is expected of one chain.

    Attributes
    ----------
    series : ions by rising m/z.
    retention_index : predicted index, None for a class without a retention model.
    """

    series: IonSeries
    retention_index: RetentionIndex | None

    @property
    def chain(self) -> Chain:
        """The chain."""
        return self.series.chain


def predict_chain(chain: Chain, model: Model | None = None, *, least: float = LEAST) -> Prediction:
    """Predict the ions and the retention index of a chain.

    Parameters
    ----------
    chain : the structure.
    model : a fitted model; the shipped one when not given.
    least : abundance relative to the base peak below which ions are left out.

    Raises
    ------
    SettingsError : the class or the size cannot be predicted.

    >>> from branchpos.naming import parse_chain
    >>> found = predict_chain(parse_chain("5,11-diMeC25"))
    >>> max(found.series.ions, key=lambda ion: ion.expected).mz
    57
    """
    chosen = model or shipped_model()
    _require_predictable(chain)
    class_model = chosen.of(chain.end_group)
    ions = tuple(ion for ion in _ions(chain, class_model) if ion.expected >= least)
    return Prediction(IonSeries(chain, ions), _index_of(chain, chosen))


def relative_abundance(batch: SeriesBatch) -> FloatArray:
    """Return abundances relative to the tallest ion of each chain, shape (chains, ions)."""
    abundance = batch.abundance.astype(float)
    return np.asarray(abundance / abundance.max(axis=1, keepdims=True))


def _require_predictable(chain: Chain) -> None:
    if chain.end_group.name not in PLACED_CLASSES:
        raise SettingsError(
            f"the class {chain.end_group.name!r} cannot be predicted",
            remedy=f"give a chain of {', '.join(PLACED_CLASSES)}",
        )
    if chain.carbons not in ALL_CARBONS:
        raise SettingsError(
            f"a chain of {chain.carbons} carbons cannot be predicted",
            remedy=f"give one of {ALL_CARBONS[0]} to {ALL_CARBONS[-1]} carbons",
        )


def _index_of(chain: Chain, model: Model) -> RetentionIndex | None:
    if not has_retention_model(chain.end_group):
        return None
    mean, sd = predict_index(_positions(chain), chain.backbone, chain.end_group, model)
    return RetentionIndex(float(mean[0]), sd=max(float(sd[0]), EXACT))


def _positions(chain: Chain) -> NDArray[np.int16]:
    return np.array([chain.methyls], dtype=np.int16).reshape(1, -1)


def _compositions(chain: Chain, batch: SeriesBatch) -> dict[int, Formula]:
    """Return the compositions that are known, by mass number."""
    if chain.end_group != ALKANE:
        return headed_compositions(chain)
    ions = zip(batch.masses.tolist(), batch.carbons.tolist(), strict=True)
    return {mass: Formula(carbons, mass - 12 * carbons) for mass, carbons in ions}


def _ions(chain: Chain, model: ClassModel) -> Iterator[Ion]:
    batch = model.predict(chain.backbone, _positions(chain))
    expected = relative_abundance(batch)[0]
    sd = np.sqrt(_parameter_variance(chain, model) + _recording_variance(batch, model.errors))
    low, high = expected * np.exp(-REACH * sd), np.minimum(expected * np.exp(REACH * sd), 1.0)
    labels, compositions = mass_labels(chain), _compositions(chain, batch)
    for column in np.argsort(batch.masses):
        mass = int(batch.masses[column])
        composition = compositions.get(mass)
        yield Ion(
            mz=mass,
            exact_mz=None if composition is None else composition.cation_mz,
            carbons=int(batch.carbons[column]),
            composition=composition,
            kind=IonKind(int(batch.kinds[column])),
            expected=float(expected[column]),
            low=float(low[column]),
            high=float(high[column]),
            steered=float(batch.steered[0, column]),
            cleavage=labels.get(mass, NEIGHBOUR),
        )


def _parameter_variance(chain: Chain, model: ClassModel) -> FloatArray:
    """Return the variance of each log relative abundance that the fitted parameters leave, shape (ions,)."""
    slopes = []
    for index in range(model.parameters.values.size):
        ends = [_log_relative(chain, model, index, step) for step in (_DIFFERENCE, -_DIFFERENCE)]
        slopes.append((ends[0] - ends[1]) / (2 * _DIFFERENCE))
    gradient = np.array(slopes)
    return np.asarray(np.einsum("pi,pq,qi->i", gradient, model.parameters.covariance, gradient))


def _log_relative(chain: Chain, model: ClassModel, index: int, step: float) -> FloatArray:
    """Return log abundances relative to the base peak with one parameter shifted, shape (ions,)."""
    values = model.parameters.values.copy()
    values[index] += step
    shifted = replace(model, parameters=replace(model.parameters, values=values))
    batch = shifted.predict(chain.backbone, _positions(chain))
    return np.asarray(np.log(np.maximum(relative_abundance(batch)[0], 1e-12)))


def _recording_variance(batch: SeriesBatch, errors: ErrorModel) -> FloatArray:
    """Return the variance by which a recording scatters, shape (ions,).

    The error of the ion itself, and what instruments differ in: the tilt of the mass axis from the base peak
    on, the weight of branch-steered ions, the level of their doublets.
    """
    base = int(batch.abundance[0].argmax())
    own = (np.array(errors.scales)[batch.kinds] * T_SCALE_TO_SD) ** 2
    places = tilt_coordinate(batch.masses)
    tilt = errors.tilt_sd * (places - places[base])
    contrast = errors.contrast_sd * batch.steered[0]
    doublet = errors.doublet_sd * batch.steered[0] * (batch.kinds == IonKind.REARRANGED)
    return np.asarray(own + tilt**2 + contrast**2 + doublet**2)
