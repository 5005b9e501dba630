"""Fit the retention model of methylalkanes to measured indices, and judge it on compounds left out.

Bayesian linear regression: coefficients have normal priors whose scales, one a group of terms, are found by
maximising the evidence; the errors of the measurements follow Student's t, so that a misprint does not pull
the fit (weights after Lange, Little and Taylor, J. Am. Stat. Assoc. 84 (1989) 881-896).
"""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from branchpos.errors import FormatError
from branchpos.predicting import retention_terms as terms
from branchpos.predicting.retention import (
    RetentionParameters,
    design_row,
    fixed_offset,
    predict_retention,
    whitened_closeness,
)
from branchpos.predicting.retention_terms import COLUMNS, Array

SOURCE = (
    "Liang, Yuan, Xu and Kvalheim, J. Chemometrics 22 (2008) 23-35, a compilation; methyl silicone phases"
)
COMMAND = "branchpos refit --retention ../shared/retention/methylalkanes.csv"

_DEGREES_OF_FREEDOM = 4.0
"""Of Student's t for one measured index."""

_LOG_SCALE_SD = 0.6
"""How far, in natural logarithms, a prior scale may sensibly lie from its first guess."""

_ROUNDS = 3
_REWEIGHTINGS = 4
_NOISE_START = (0.5, 2.0)

_COVERAGE_AIM = 0.97
"""Share of compounds left out one at a time that the 95 % interval is stretched to hold.

Above 0.95, because the scales of the priors were learnt with the compound still in.
"""

_SUSPECT = 2.5
"""Residual of a left-out compound, in predicted standard deviations, from which its value is doubted."""


@dataclass(frozen=True, slots=True)
class IndexRow:
    """One measured methylalkane: backbone [carbons], rising methyl positions, index [units]."""

    backbone: int
    methyls: tuple[int, ...]
    index: float


@dataclass(frozen=True, slots=True)
class LeftOutScore:
    """How well compounds that took no part in the fit are predicted.

    Attributes
    ----------
    median_error, rms_error, coverage : by number of methyls, means over random splits [units, units, share].
    overall_coverage : share of left-out compounds inside their 95 % interval.
    suspects : compounds whose value is doubted, with residual [units] and residual over sd, worst first.
    """

    median_error: dict[int, float]
    rms_error: dict[int, float]
    coverage: dict[int, float]
    overall_coverage: float
    suspects: tuple[tuple[IndexRow, float, float], ...]


@dataclass(frozen=True, eq=False)
class _Problem:
    """Design (n, C), increments less prior mean (n,), several methyls or one (n,), group of columns (C,)."""

    design: Array
    target: Array
    several: NDArray[np.bool_]
    group: NDArray[np.int_]
    patterns: dict[int, Array]

    def noise_variance(self, log_sd: Array) -> Array:
        return np.asarray(np.exp(2 * np.where(self.several, log_sd[-1], log_sd[-2])))


def read_index_rows(path: Path) -> list[IndexRow]:
    """Read measured indices from a table with columns backbone_carbons, methyl_positions, retention_index.

    Raises
    ------
    FormatError : a column is missing, or a row cannot be read.
    """
    rows = []
    with path.open(encoding="utf-8", newline="") as stream:
        for number, record in enumerate(csv.DictReader(stream), start=2):
            try:
                positions = tuple(sorted(int(p) for p in record["methyl_positions"].split()))
                rows.append(
                    IndexRow(int(record["backbone_carbons"]), positions, float(record["retention_index"]))
                )
            except (KeyError, ValueError, AttributeError) as error:
                raise FormatError(
                    f"no retention index in this row ({error})",
                    file=str(path),
                    place=f"line {number}",
                    remedy="give columns backbone_carbons, methyl_positions (5 11), retention_index",
                ) from error
    return rows


def fit_retention(rows: Sequence[IndexRow], date: str = "") -> RetentionParameters:
    """Fit the model to measured indices.

    Parameters
    ----------
    rows : measured compounds; unbranched ones are left aside, their index being defined.
    date : of the fit, for the provenance.
    """
    problem = _problem([row for row in rows if row.methyls])
    log_sd = _starting_scales(problem)
    weight = np.ones(len(problem.target))
    for _ in range(_ROUNDS):
        log_sd = _maximise_evidence(problem, log_sd, weight)
        weight = _reweigh(problem, log_sd, weight)
    return _solve(problem, log_sd, weight, _provenance(rows, date))


def record_of(parameters: RetentionParameters) -> dict[str, Any]:
    """Return the JSON form of fitted parameters, rounded to seven digits."""
    lower = parameters.covariance[np.tril_indices(len(parameters.coefficients))]
    return {
        "provenance": parameters.provenance,
        "groups": [[group.name, group.columns] for group in terms.GROUPS],
        "noise": [_rounded(sd) for sd in parameters.noise],
        "closeness_sd": _rounded(parameters.closeness_sd),
        "spread": _rounded(parameters.spread),
        "patterns": [rows.astype(int).tolist() for rows in parameters.patterns.values()],
        "coefficients": [_rounded(value) for value in parameters.coefficients],
        "covariance_lower": [_rounded(value) for value in lower],
    }


def cross_validate_retention(
    rows: Sequence[IndexRow], folds: int = 10, repeats: int = 10, seed: int = 20080123
) -> LeftOutScore:
    """Predict every compound from a fit without it, in several random splits by compound."""
    branched = [row for row in rows if row.methyls]
    splits = np.random.default_rng(seed).spawn(repeats)
    outcome = np.array([_left_out(branched, folds, split) for split in splits])
    return _score(branched, outcome[:, 0], outcome[:, 1])


def _left_out(rows: Sequence[IndexRow], folds: int, split: np.random.Generator) -> Array:
    """Return residuals and predicted standard deviations of one split, shape (2, n)."""
    outcome = np.zeros((2, len(rows)))
    order = split.permutation(len(rows))
    for fold in range(folds):
        out = set(order[fold::folds].tolist())
        parameters = fit_retention([row for i, row in enumerate(rows) if i not in out])
        for i in out:
            mean, sd = predict_retention(np.array([rows[i].methyls]), rows[i].backbone, parameters)
            outcome[:, i] = rows[i].index - mean[0], sd[0]
    return outcome


def _score(rows: Sequence[IndexRow], residual: Array, sd: Array) -> LeftOutScore:
    methyls = np.array([len(row.methyls) for row in rows])
    inside = np.abs(residual) < 1.96 * sd
    counts = sorted(set(methyls.tolist()))
    z = np.median(residual / sd, axis=0)
    doubted = sorted(np.flatnonzero(np.abs(z) > _SUSPECT).tolist(), key=lambda i: -abs(z[i]))
    return LeftOutScore(
        {k: float(np.median(np.abs(residual[:, methyls == k]), axis=1).mean()) for k in counts},
        {k: float(np.sqrt((residual[:, methyls == k] ** 2).mean())) for k in counts},
        {k: float(inside[:, methyls == k].mean()) for k in counts},
        float(inside.mean()),
        tuple((rows[i], float(np.median(residual[:, i])), float(z[i])) for i in doubted),
    )


def _problem(rows: Sequence[IndexRow]) -> _Problem:
    linear = np.array([_linear_terms(row) for row in rows])
    blocks, patterns = [linear], {}
    for methyls in sorted({len(row.methyls) for row in rows} - {1}):
        mine = [i for i, row in enumerate(rows) if len(row.methyls) == methyls]
        lowest = np.concatenate([_lowest(rows[i]) for i in mine])
        patterns[methyls] = np.unique(lowest, axis=0)
        block = np.zeros((len(rows), len(patterns[methyls])))
        block[mine] = whitened_closeness(lowest, patterns[methyls])
        blocks.append(block)
    design = np.concatenate(blocks, axis=1)
    target = np.array(
        [
            row.index
            - 100 * row.backbone
            - terms.MEAN_INCREMENT * len(row.methyls)
            - fixed_offset(row.methyls)
            for row in rows
        ]
    )
    last = np.full(design.shape[1] - COLUMNS, len(terms.GROUPS))
    several = np.array([len(row.methyls) > 1 for row in rows])
    return _Problem(design, target, several, np.concatenate([terms.group_of_column(), last]), patterns)


@lru_cache(maxsize=1024)
def _linear_terms(row: IndexRow) -> Array:
    return design_row(row.methyls, row.backbone)


def _lowest(row: IndexRow) -> Array:
    return terms.lowest_locants(np.array([row.methyls], dtype=float), row.backbone)


def _starting_scales(problem: _Problem) -> Array:
    """Return log standard deviations: each group, closeness, noise of one methyl, noise of several."""
    scales = [group.scale for group in terms.GROUPS]
    return np.asarray(np.log([*scales, terms.CLOSENESS_SCALE, *_NOISE_START]))


def _maximise_evidence(problem: _Problem, log_sd: Array, weight: Array) -> Array:
    """Return the scales with the highest evidence times their prior (log-normal about the first guess)."""
    from scipy.optimize import minimize

    start = _starting_scales(problem)
    learned = np.array([*(group.learned for group in terms.GROUPS), True, True, True])
    groups = range(len(terms.GROUPS) + 1)
    grams = np.stack([_gram(problem.design[:, problem.group == g]) for g in groups])
    flags = np.stack([~problem.several, problem.several]).astype(float)

    def cost(free: Array) -> tuple[float, Array]:
        trial = start.copy()
        trial[learned] = free
        variance = np.exp(2 * trial)
        covariance = np.tensordot(variance[:-2], grams, 1)
        covariance[np.diag_indices(len(covariance))] += problem.noise_variance(trial) / weight
        inverse = np.linalg.inv(covariance)
        solved = inverse @ problem.target
        away = (trial - start) / _LOG_SCALE_SD
        value = 0.5 * (problem.target @ solved + np.linalg.slogdet(covariance)[1] + away @ away)
        gap = inverse - np.outer(solved, solved)
        slope = np.concatenate([np.tensordot(grams, gap, 2), (flags / weight) @ np.diag(gap)]) * variance
        return float(value), (slope + away / _LOG_SCALE_SD)[learned]

    found = minimize(cost, log_sd[learned], jac=True, method="L-BFGS-B", options={"maxiter": 40})
    result = start.copy()
    result[learned] = found.x
    return result


def _gram(columns: Array) -> Array:
    return np.asarray(columns @ columns.T)


def _reweigh(problem: _Problem, log_sd: Array, weight: Array) -> Array:
    """Return the weights of the measurements under Student's t, given the scales."""
    noise = problem.noise_variance(log_sd)
    prior = _gram(problem.design * np.exp(log_sd[problem.group]))
    for _ in range(_REWEIGHTINGS):
        gain = np.linalg.solve(prior + np.diag(noise / weight), prior).T
        residual = problem.target - gain @ problem.target
        left = np.diag(prior - gain @ prior)
        weight = (_DEGREES_OF_FREEDOM + 1) / (_DEGREES_OF_FREEDOM + (residual**2 + left) / noise)
    return weight


def _solve(
    problem: _Problem, log_sd: Array, weight: Array, provenance: dict[str, Any]
) -> RetentionParameters:
    scaled = problem.design * np.exp(2 * log_sd[problem.group])
    noise = problem.noise_variance(log_sd)
    inverse = np.asarray(np.linalg.inv(scaled @ problem.design.T + np.diag(noise / weight)))
    covariance = np.diag(np.exp(2 * log_sd[problem.group])) - scaled.T @ inverse @ scaled
    fitted = RetentionParameters(
        scaled.T @ inverse @ problem.target,
        covariance,
        problem.patterns,
        float(np.exp(log_sd[-3])),
        (float(np.exp(log_sd[-2])), float(np.exp(log_sd[-1]))),
        1.0,
        provenance,
    )
    return replace(fitted, spread=_spread(problem.target, inverse, noise, weight))


def _spread(target: Array, inverse: Array, noise: Array, weight: Array) -> float:
    """Return the stretch with which 95 % intervals hold as many left-out compounds as aimed at."""
    diagonal = np.diag(inverse)
    residual = inverse @ target / diagonal
    variance = 1 / diagonal - noise / weight + noise
    return float(np.quantile(np.abs(residual) / np.sqrt(variance), _COVERAGE_AIM) / 1.96)


def _provenance(rows: Sequence[IndexRow], date: str) -> dict[str, Any]:
    return {"source": SOURCE, "command": COMMAND, "compounds": len(rows), "date": date}


def _rounded(value: float) -> float:
    return float(f"{value:.7g}")
