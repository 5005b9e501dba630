"""Fitting a class's model to spectra of known chains: Gauss-Newton on robust weights, with covariance.

Each record adjusts its own instrument effects; they are eliminated from the normal equations, so that what
an instrument does is not mistaken for chemistry. Error scales follow from the weighted residuals.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from branchpos.cleaning.nominal import to_channels
from branchpos.end_group import ALKANE, EndGroup
from branchpos.ion_series import IonKind, SeriesBatch
from branchpos.mass_channels import MassChannels
from branchpos.predicting.parameters import YieldParameters
from branchpos.predicting.predictor import Predictor, predictor_of
from branchpos.scoring.error_model import STARTING_ERRORS, ErrorModel
from branchpos.scoring.likelihood import Linearised, linearise, log_expectation
from branchpos.workflow.reference_spectra import KnownSpectrum
from branchpos.workflow.side_ions import with_side_ions

FloatArray = NDArray[np.float64]

UNBRANCHED_WEIGHT = 0.35
"""Weight of an unbranched record: many of them tell one story and must not drown the few others."""
_DIFFERENCE = 1e-3
_LARGEST_STEP = 0.5
_SCALE_PRIOR_STRENGTH = 20.0
"""How many ions the starting error scales count for."""
USUAL_TILT_SD = 1.0
"""Spread of the tilt between instruments, as the alkanes measure it; other classes take it over."""
_LEAST_TILT_SD = 0.3
_TILT_PRIOR_STRENGTH = 3.0
"""How many records the starting spread of the tilt counts for."""


@dataclass(frozen=True, slots=True, eq=False)
class YieldFit:
    """What a fit gives.

    Attributes
    ----------
    parameters, errors : fitted yields with covariance; fitted error scales.
    misfit : robust weighted sum of squares at the end, priors included.
    """

    parameters: YieldParameters
    errors: ErrorModel
    misfit: float


@dataclass(frozen=True, slots=True, eq=False)
class Record:
    """One record of the fit.

    Attributes
    ----------
    channels : what was observed.
    backbone, positions : the known chain, positions of shape (1, methyls).
    weight : what the record counts for.
    """

    channels: MassChannels
    backbone: int
    positions: NDArray[np.int16]
    weight: float


def fit_yields(
    known: Sequence[KnownSpectrum],
    provenance: Mapping[str, str],
    *,
    end_group: EndGroup = ALKANE,
    start: YieldFit | None = None,
    iterations: int = 25,
) -> YieldFit:
    """Fit yields and error scales to spectra of known chains of one class.

    Parameters
    ----------
    known : the records; those that keep too few peaks should be left out by the caller.
    provenance : text fields kept with the parameters.
    end_group : the chain class.
    start : a former fit to begin from; fewer iterations do then.
    """
    predictor = predictor_of(end_group)
    records = [_to_record(one) for one in known]
    values = start.parameters.values if start else predictor.prior_mean
    errors = start.errors if start else replace(STARTING_ERRORS, tilt_sd=USUAL_TILT_SD)
    misfit, covariance = np.inf, np.asarray(np.linalg.inv(predictor.prior_precision), dtype=float)
    for _ in range(iterations):
        views = [_linearised(record, predictor, values, errors) for record in records]
        scaled = _scales(records, predictor, views, errors)
        values, covariance, misfit = _newton_step(records, predictor, views, values, errors)
        errors = scaled if end_group == ALKANE else replace(scaled, tilt_sd=USUAL_TILT_SD)
    parameters = YieldParameters(values, covariance, provenance)
    if end_group == ALKANE:
        parameters = with_side_ions([(one, one.channels) for one in records], parameters, errors)
    return YieldFit(parameters, errors, misfit)


def _to_record(one: KnownSpectrum) -> Record:
    positions = np.array([one.chain.methyls], dtype=np.int16).reshape(1, -1)
    channels, _ = to_channels(one.spectrum)
    weight = 1.0 if one.chain.is_branched else UNBRANCHED_WEIGHT
    return Record(channels, one.chain.backbone, positions, weight)


def _linearised(record: Record, predictor: Predictor, values: FloatArray, errors: ErrorModel) -> Linearised:
    batch = predictor.predict(values, record.backbone, record.positions)
    return linearise(record.channels.at(batch.masses), batch, errors)


def _newton_step(
    records: Sequence[Record],
    predictor: Predictor,
    views: Sequence[Linearised],
    values: FloatArray,
    errors: ErrorModel,
) -> tuple[FloatArray, FloatArray, float]:
    """Return new values, covariance and the misfit before the step."""
    precision = predictor.prior_precision
    offset = values - predictor.prior_mean
    normal, gradient = precision.copy(), -precision @ offset
    misfit = float(offset @ precision @ offset)
    for record, view in zip(records, views, strict=True):
        slopes = _slopes(record, predictor, view, values, errors)
        inner, pull = _eliminated(slopes, view)
        normal += record.weight * inner
        gradient += record.weight * pull
        misfit += record.weight * float(view.weight @ view.residual**2)
    step = np.clip(np.linalg.solve(normal, gradient), -_LARGEST_STEP, _LARGEST_STEP)
    return np.asarray(values + step), np.asarray(np.linalg.inv(normal), dtype=float), misfit


def _slopes(
    record: Record, predictor: Predictor, view: Linearised, values: FloatArray, errors: ErrorModel
) -> FloatArray:
    """Return the derivative of the log expectation by each parameter, shape (parameters, ions)."""
    base = predictor.predict(values, record.backbone, record.positions)
    shifted: list[SeriesBatch] = [base]
    for index in range(values.size):
        moved = values.copy()
        moved[index] += _DIFFERENCE
        shifted.append(predictor.predict(moved, record.backbone, record.positions))
    stacked = replace(
        base,
        positions=np.repeat(base.positions, len(shifted), axis=0),
        abundance=np.concatenate([batch.abundance for batch in shifted]),
        steered=np.concatenate([batch.steered for batch in shifted]),
    )
    logs = log_expectation(record.channels.at(base.masses), stacked, errors, view.effects)
    return np.asarray((logs[1:] - logs[0]) / _DIFFERENCE)


def _eliminated(slopes: FloatArray, view: Linearised) -> tuple[FloatArray, FloatArray]:
    """Return one record's share of the normal equations with its instrument effects eliminated."""
    weighted = slopes * view.weight
    effects = view.effect_columns * view.weight
    coupling = weighted @ view.effect_columns.T
    own = effects @ view.effect_columns.T + np.diag(view.precision + 1e-9)
    through = np.linalg.solve(own, coupling.T).T
    effect_pull = effects @ view.residual - view.precision * view.effects
    return weighted @ slopes.T - through @ coupling.T, weighted @ view.residual - through @ effect_pull


def _scales(
    records: Sequence[Record], predictor: Predictor, views: Sequence[Linearised], errors: ErrorModel
) -> ErrorModel:
    """Re-estimate the error scale of each ion kind, and how much instruments tilt."""
    kinds_count = len(IonKind)
    squares = np.array(STARTING_ERRORS.scales) ** 2 * _SCALE_PRIOR_STRENGTH
    counts = np.full(kinds_count, _SCALE_PRIOR_STRENGTH)
    old = np.array(errors.scales)
    for record, view in zip(records, views, strict=True):
        kinds = predictor.predict(predictor.prior_mean, record.backbone, record.positions).kinds
        pulling = (view.weight > 0) * record.weight
        squares += np.bincount(kinds, pulling * view.weight * old[kinds] ** 2 * view.residual**2, kinds_count)
        counts += np.bincount(kinds, pulling, kinds_count)
    fragment, rearranged, molecular, shared = np.sqrt(squares / counts).tolist()
    tilts = sum(float(view.effects[1]) ** 2 for view in views)
    tilt = np.sqrt(
        (tilts + STARTING_ERRORS.tilt_sd**2 * _TILT_PRIOR_STRENGTH) / (len(views) + _TILT_PRIOR_STRENGTH)
    )
    return replace(
        errors,
        scales=(fragment, rearranged, molecular, shared),
        tilt_sd=max(float(tilt), _LEAST_TILT_SD),
    )
