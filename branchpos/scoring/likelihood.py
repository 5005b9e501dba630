"""Likelihood of a spectrum under each chain, with what the instrument does adjusted for each.

Four effects are adjusted for every hypothesis, three of them held by priors: the overall scale; a tilt along
the mass axis; the weight of branch-steered ions against the rest; the level of their doublets. Gauss-Newton
steps on robust weights find the best values, and the volume they leave under their priors (Laplace) enters
the likelihood, so that a hypothesis that needs an unusual instrument pays for it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from branchpos.ion_series import IonKind, SeriesBatch
from branchpos.mass_channels import ChannelView
from branchpos.scoring.error_model import (
    NOISE_OF_THRESHOLD,
    OMISSION_FALL,
    SEEN_FLOOR,
    SHIFTED_SHARE,
    TEN,
    ErrorModel,
    log_below,
    log_density,
    robust_weight,
)

FloatArray = NDArray[np.float64]

TILT_PIVOT = 10.0
"""Mass [CH2 units of 14] at which the tilt leaves abundances alone; it is counted for each 10 units."""
_STEPS = 4
_LARGEST_STEP = 1.0
_SMALLEST_SHARE = 1e-6
"""Every ion gets at least this share of the summed abundance: stray routes the model does not know."""


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """How well each chain explains the ions it was scored on.

    Attributes
    ----------
    log_likelihood : natural log, effects adjusted, shape (chains,).
    by_ion : share of each ion, shape (chains, ions).
    expected : expected abundance relative to the base peak, effects applied, shape (chains, ions).
    effects : log scale, tilt, contrast, doublet level, shape (chains, 4).
    """

    log_likelihood: FloatArray
    by_ion: FloatArray
    expected: FloatArray
    effects: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class _Problem:
    """Arrays that the steps share; (chains, ions) or (ions,)."""

    log_abundance: FloatArray
    steered: FloatArray
    tilt: FloatArray
    rearranged: FloatArray
    scale: FloatArray
    view: ChannelView
    log_seen: FloatArray
    log_threshold: float
    precision: FloatArray


def fit_batch(view: ChannelView, batch: SeriesBatch, errors: ErrorModel) -> Fit:
    """Score every chain of a batch on the ions of the batch.

    Parameters
    ----------
    view : what was observed at ``batch.masses``.
    batch : expected ions, shape (chains, ions).
    errors : scales of errors and instrument effects.
    """
    problem = _pose(view, batch, errors)
    effects = _starting_effects(problem)
    normal = np.broadcast_to(np.eye(4), (len(batch), 4, 4))
    for _ in range(_STEPS):
        effects, normal = _step(problem, effects)
    log_expected, _, _ = _expected(problem, effects)
    by_ion = _by_ion(problem, log_expected)
    penalty = 0.5 * (effects**2 @ problem.precision)
    volume = 0.5 * np.linalg.slogdet(normal[:, 1:, 1:])[1] + np.log(errors.effect_sds).sum()
    return Fit(by_ion.sum(axis=1) - penalty - volume, by_ion, np.exp(log_expected), effects)


@dataclass(frozen=True, slots=True, eq=False)
class Linearised:
    """One chain's misfit as least squares sees it, at its best instrument effects.

    Attributes
    ----------
    residual : log observed minus log expected, shape (ions,).
    weight : robust weight over squared scale; 0 where an ion does not pull, shape (ions,).
    effect_columns : derivative of the log expectation by each effect, shape (4, ions).
    precision : prior precision of the effects, shape (4,).
    effects : their best values, shape (4,).
    """

    residual: FloatArray
    weight: FloatArray
    effect_columns: FloatArray
    precision: FloatArray
    effects: FloatArray


def linearise(view: ChannelView, batch: SeriesBatch, errors: ErrorModel) -> Linearised:
    """Return the least-squares view of the first chain of a batch."""
    problem = _pose(view, batch, errors)
    effects = _starting_effects(problem)
    for _ in range(2 * _STEPS):
        effects, _ = _step(problem, effects)
    log_expected, signal_share, steered = _expected(problem, effects)
    residual, weight = _residuals(problem, log_expected)
    columns = _effect_columns(problem, signal_share, steered)
    return Linearised(residual[0], weight[0], columns[0], problem.precision, effects[0])


def log_expectation(
    view: ChannelView, batch: SeriesBatch, errors: ErrorModel, effects: FloatArray
) -> FloatArray:
    """Return the log expectation of every ion with given effects, shape (chains, ions)."""
    return _expected(_pose(view, batch, errors), np.broadcast_to(effects, (len(batch), 4)))[0]


def _pose(view: ChannelView, batch: SeriesBatch, errors: ErrorModel) -> _Problem:
    abundance = batch.abundance.astype(float)
    abundance += _SMALLEST_SHARE * abundance.sum(axis=1, keepdims=True)
    return _Problem(
        log_abundance=np.log(abundance),
        steered=batch.steered.astype(float),
        tilt=tilt_coordinate(batch.masses),
        rearranged=(batch.kinds == IonKind.REARRANGED).astype(float),
        scale=np.array(errors.scales)[batch.kinds],
        view=view,
        log_seen=np.log(np.where(view.seen, view.intensity, view.threshold)),
        log_threshold=float(np.log(view.threshold)),
        precision=np.concatenate([[0.0], errors.effect_sds**-2]),
    )


def tilt_coordinate(masses: NDArray[np.intp]) -> FloatArray:
    """Return how far each mass lies from the pivot, in units of the mass of ten carbons."""
    return np.asarray(masses / (14 * TILT_PIVOT) - 1, dtype=float)


def _starting_effects(problem: _Problem) -> FloatArray:
    view = problem.view
    usable = view.seen & view.recorded & ~view.doubtful
    weight = np.sqrt(view.intensity) * (usable if usable.any() else view.seen)
    weight /= max(float(weight.sum()), 1e-12)
    effects = np.zeros((len(problem.log_abundance), 4))
    effects[:, 0] = (problem.log_seen - problem.log_abundance) @ weight
    return effects


def _expected(problem: _Problem, effects: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return log expectation with noise, the signal's share of it, and the steered share after adjustment."""
    gain = np.exp(effects[:, 2:3] + effects[:, 3:4] * problem.rearranged)
    growth = 1 + problem.steered * (gain - 1)
    log_signal = effects[:, :1] + effects[:, 1:2] * problem.tilt + problem.log_abundance + np.log(growth)
    signal = np.exp(log_signal)
    total = signal + NOISE_OF_THRESHOLD * problem.view.threshold
    return np.log(total), signal / total, problem.steered * gain / growth


def _step(problem: _Problem, effects: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Take one reweighted Gauss-Newton step; return the new effects and the normal matrix."""
    log_expected, signal_share, steered = _expected(problem, effects)
    residual, weight = _residuals(problem, log_expected)
    columns = _effect_columns(problem, signal_share, steered)
    weighted = columns * weight[:, None, :]
    normal = weighted @ columns.transpose(0, 2, 1) + np.diag(problem.precision + 1e-9)
    gradient = np.einsum("hai,hi->ha", weighted, residual) - effects * problem.precision
    step = np.linalg.solve(normal, gradient[:, :, None])[:, :, 0]
    return effects + np.clip(step, -_LARGEST_STEP, _LARGEST_STEP), normal


def _effect_columns(problem: _Problem, signal_share: FloatArray, steered: FloatArray) -> FloatArray:
    """Return the derivative of the log expectation by each effect, shape (chains, 4, ions)."""
    tilt = np.broadcast_to(problem.tilt, steered.shape)
    columns = np.stack([np.ones_like(steered), tilt, steered, steered * problem.rearranged], axis=1)
    return columns * signal_share[:, None, :]


def _residuals(problem: _Problem, log_expected: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return residuals and weights; an unseen ion pulls only where more than the threshold was expected."""
    view = problem.view
    z = (problem.log_seen - log_expected) / problem.scale
    if view.doubtful.any():
        shifted = z + TEN / problem.scale
        odds = np.exp(log_density(shifted) - log_density(z)) * SHIFTED_SHARE / (1 - SHIFTED_SHARE)
        z = np.where(view.doubtful, (z + odds * shifted) / (1 + odds), z)
    pull = np.where(view.seen, 1.0, np.clip(-z, 0.0, 1.0) * (1 - view.omission))
    weight = robust_weight(z) * pull * view.recorded / problem.scale**2
    return z * problem.scale, weight


def _by_ion(problem: _Problem, log_expected: FloatArray) -> FloatArray:
    """Return the log likelihood of every ion; unrecorded ions say nothing."""
    view = problem.view
    z = (problem.log_seen - log_expected) / problem.scale
    seen = log_density(z)
    if view.doubtful.any():
        shifted = log_density(z + TEN / problem.scale) + np.log(SHIFTED_SHARE)
        seen = np.where(view.doubtful, np.logaddexp(shifted, seen + np.log(1 - SHIFTED_SHARE)), seen)
    seen = np.logaddexp(seen - np.log(problem.scale), SEEN_FLOOR)
    omission = view.omission * np.exp(OMISSION_FALL * np.minimum(problem.log_threshold - log_expected, 0.0))
    unseen = np.log(omission + (1 - omission) * np.exp(log_below(z)))
    return np.where(view.recorded, np.where(view.seen, seen, unseen), 0.0)
