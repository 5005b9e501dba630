"""Fitting the cleavage model to spectra of known chains: Gauss-Newton on robust weights, with covariance.

Each record adjusts its own instrument effects; they are eliminated from the normal equations, so that what
an instrument does is not mistaken for chemistry. Error scales follow from the weighted residuals.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from branchpos.cleaning.nominal import to_channels
from branchpos.ion_series import IonKind, SeriesBatch
from branchpos.mass_channels import MassChannels
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.parameters import PARAMETERS, YieldParameters, prior_parameters
from branchpos.predicting.yields import side_ions
from branchpos.scoring.error_model import STARTING_ERRORS, ErrorModel
from branchpos.scoring.likelihood import TILT_PIVOT, Linearised, linearise, log_expectation
from branchpos.scoring.remainder import isotopes_below
from branchpos.workflow.reference_spectra import KnownSpectrum

FloatArray = NDArray[np.float64]

UNBRANCHED_WEIGHT = 0.35
"""Weight of an unbranched record: many of them tell one story and must not drown the few others."""
_DIFFERENCE = 1e-3
_LARGEST_STEP = 0.5
_SCALE_PRIOR_STRENGTH = 20.0
"""How many ions the starting error scales count for."""
_LEAST_TILT_SD = 0.3
_SIDE_PRIOR_STRENGTH = 3.0


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
class _Record:
    channels: MassChannels
    backbone: int
    positions: NDArray[np.int16]
    weight: float

    def predict(self, parameters: YieldParameters) -> SeriesBatch:
        return predict_alkanes(parameters, self.backbone, self.positions)


def fit_yields(
    known: Sequence[KnownSpectrum],
    provenance: Mapping[str, str],
    *,
    start: YieldFit | None = None,
    iterations: int = 25,
) -> YieldFit:
    """Fit yields and error scales to spectra of known alkanes.

    Parameters
    ----------
    known : the records; those that keep too few peaks should be left out by the caller.
    provenance : text fields kept with the parameters.
    start : a former fit to begin from; fewer iterations do then.
    """
    records = [_to_record(one) for one in known]
    parameters = start.parameters if start else prior_parameters()
    errors = start.errors if start else STARTING_ERRORS
    misfit, covariance = np.inf, parameters.covariance
    for _ in range(iterations):
        views = [_linearised(record, parameters, errors) for record in records]
        values, covariance, misfit = _newton_step(records, views, parameters, errors)
        parameters = YieldParameters(values, covariance, provenance)
        errors = _scales(records, views, errors)
    parameters = _with_side_ions(records, parameters, errors)
    return YieldFit(parameters, errors, misfit)


def _to_record(one: KnownSpectrum) -> _Record:
    positions = np.array([one.chain.methyls], dtype=np.int16).reshape(1, -1)
    channels, _ = to_channels(one.spectrum)
    weight = 1.0 if one.chain.is_branched else UNBRANCHED_WEIGHT
    return _Record(channels, one.chain.backbone, positions, weight)


def _linearised(record: _Record, parameters: YieldParameters, errors: ErrorModel) -> Linearised:
    batch = record.predict(parameters)
    return linearise(record.channels.at(batch.masses), batch, errors)


def _newton_step(
    records: Sequence[_Record], views: Sequence[Linearised], parameters: YieldParameters, errors: ErrorModel
) -> tuple[FloatArray, FloatArray, float]:
    """Return new values, covariance and the misfit before the step."""
    prior = prior_parameters()
    precision = np.linalg.inv(prior.covariance)
    offset = parameters.values - prior.values
    normal, gradient = precision.copy(), -precision @ offset
    misfit = float(offset @ precision @ offset)
    for record, view in zip(records, views, strict=True):
        slopes = _slopes(record, view, parameters, errors)
        inner, pull = _eliminated(slopes, view)
        normal += record.weight * inner
        gradient += record.weight * pull
        misfit += record.weight * float(view.weight @ view.residual**2)
    step = np.clip(np.linalg.solve(normal, gradient), -_LARGEST_STEP, _LARGEST_STEP)
    return parameters.values + step, np.linalg.inv(normal), misfit


def _slopes(record: _Record, view: Linearised, parameters: YieldParameters, errors: ErrorModel) -> FloatArray:
    """Return the derivative of the log expectation by each parameter, shape (parameters, ions)."""
    base = record.predict(parameters)
    shifted = [base]
    for index in range(len(PARAMETERS)):
        values = parameters.values.copy()
        values[index] += _DIFFERENCE
        shifted.append(record.predict(replace(parameters, values=values)))
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


def _scales(records: Sequence[_Record], views: Sequence[Linearised], errors: ErrorModel) -> ErrorModel:
    """Re-estimate the error scale of each ion kind, and how much instruments tilt."""
    squares = np.array(STARTING_ERRORS.scales) ** 2 * _SCALE_PRIOR_STRENGTH
    tilts = np.array([view.effects[1] for view in views])
    counts = np.full(len(IonKind), _SCALE_PRIOR_STRENGTH)
    old = np.array(errors.scales)
    for record, view in zip(records, views, strict=True):
        kinds = record.predict(prior_parameters()).kinds
        pulling = (view.weight > 0) * record.weight
        squares += np.bincount(kinds, pulling * view.weight * old[kinds] ** 2 * view.residual**2, 3)
        counts += np.bincount(kinds, pulling, 3)
    fragment, rearranged, molecular = np.sqrt(squares / counts).tolist()
    tilt = float(np.sqrt((tilts**2).mean()))
    return replace(errors, scales=(fragment, rearranged, molecular), tilt_sd=max(tilt, _LEAST_TILT_SD))


def _with_side_ions(
    records: Sequence[_Record], parameters: YieldParameters, errors: ErrorModel
) -> YieldParameters:
    """Set the side ions to the robust middle of what the records show above their carbon-13 neighbours."""
    names = [parameter.name for parameter in PARAMETERS]
    values, variances = parameters.values.copy(), np.diag(parameters.covariance).copy()
    found: dict[str, list[float]] = {name: [] for name in names if name.startswith("side_")}
    for record in records:
        for name, ratio in _side_ratios(record, parameters, errors).items():
            found[name].append(ratio)
    for name, ratios in found.items():
        index = names.index(name)
        spread = 1.48 * float(np.median(np.abs(np.array(ratios) - np.median(ratios)))) if ratios else 0.0
        weight = len(ratios) / (len(ratios) + _SIDE_PRIOR_STRENGTH)
        middle = float(np.median(ratios)) if ratios else 0.0
        values[index] = (1 - weight) * PARAMETERS[index].mean + weight * middle
        variances[index] = max(spread, 0.1) ** 2 / (len(ratios) + 1)
    covariance = parameters.covariance.copy()
    np.fill_diagonal(covariance, variances)
    return replace(parameters, values=values, covariance=covariance)


def _side_ratios(record: _Record, parameters: YieldParameters, errors: ErrorModel) -> dict[str, float]:
    """Return, by parameter, the log of an observed side ion over the daughter ion it is predicted from."""
    batch = record.predict(parameters)
    named = parameters.named()
    effects = linearise(record.channels.at(batch.masses), batch, errors).effects
    observed = record.channels.at(batch.side_masses)
    excess = observed.intensity - isotopes_below(record.channels, batch.side_masses)
    usable = observed.seen & observed.recorded & ~observed.doubtful & (excess > 0)
    ratios = {}
    for column, (series, size) in enumerate(side_ions(batch.skeleton_carbons)):
        if usable[column]:
            name = f"side_{series}_{size}"
            tilted = effects[0] + effects[1] * (size - TILT_PIVOT) / TILT_PIVOT
            bare = np.log(batch.side_abundance[column]) - named[name]
            ratios[name] = float(np.log(excess[column]) - tilted - bare)
    return ratios
