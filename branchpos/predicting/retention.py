"""Retention index of a methylalkane on methyl silicone, predicted with its standard deviation.

The index is 100 times the backbone plus terms linear in fitted coefficients (``retention_terms``), so the
variance of a prediction follows from their covariance. Sums over methyls and pairs are read from tables made
once for each backbone and number of methyls, which keeps thousands of candidate structures quick.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.errors import ReferenceDataError, SettingsError
from branchpos.predicting import retention_terms as terms
from branchpos.predicting.retention_terms import COLUMNS, Array
from branchpos.reference_data import load_reference
from branchpos.retention_index import EXACT, RetentionIndex

REFERENCE_SET = "retention.json"

_ROWS_AT_ONCE = 4096
"""Structures summed in one go: few enough for the sums to stay in the processor's cache."""


@dataclass(frozen=True, eq=False)
class RetentionParameters:
    """What a fit to measured indices yields.

    Attributes
    ----------
    coefficients : shape (C,): ``COLUMNS`` terms, then one a pattern, whitened, in the order of ``patterns``.
    covariance : shape (C, C), of the coefficients.
    patterns : by number of methyls, fitted patterns with the lower locants, shape (T, methyls).
    closeness_sd : standard deviation [units] of what structures with like patterns share.
    noise : standard deviation [units] of one measured index, with one methyl and with several.
    spread : factor on every standard deviation that brings the left-out compounds to their stated coverage.
    provenance : where the numbers come from.
    """

    coefficients: Array
    covariance: Array
    patterns: Mapping[int, Array]
    closeness_sd: float
    noise: tuple[float, float]
    spread: float
    provenance: dict[str, Any] = field(default_factory=dict)

    def rows_of(self, methyls: int) -> NDArray[np.int_]:
        """Return which coefficients bear on chains with this many methyls."""
        start = COLUMNS
        for count, patterns in self.patterns.items():
            if count == methyls:
                return np.concatenate([np.arange(COLUMNS), np.arange(start, start + len(patterns))])
            start += len(patterns)
        return np.arange(COLUMNS)


@dataclass(frozen=True, eq=False)
class _Tables:
    """Contributions to (mean, scaled square root of the variance) for one backbone and number of methyls."""

    mono: NDArray[np.float32]
    pair: tuple[NDArray[np.float32], ...]
    whole: NDArray[np.float32]
    pattern: NDArray[np.float32]


def predict_retention(
    positions: NDArray[np.int_], backbone: int, parameters: RetentionParameters | None = None
) -> tuple[Array, Array]:
    """Predict the indices of many methylalkanes with the same backbone.

    Parameters
    ----------
    positions : shape (S, k), methyl positions of S structures, each row rising, counted from either end.
    backbone : carbons of the main chain.
    parameters : a fit; the shipped one when not given.

    Returns
    -------
    mean, sd : shape (S,) each [index units]. Unbranched chains have 100 times their carbons and sd 0.

    Raises
    ------
    SettingsError : a position lies outside the chain or a row does not rise.

    >>> mean, sd = predict_retention(np.array([[5, 11], [5, 14]]), 25)
    >>> bool((abs(mean - 2582) < 2).all()), bool((sd < 6).all())
    (True, True)
    """
    positions = np.asarray(positions, dtype=np.intp)
    _check(positions, backbone)
    count, methyls = positions.shape
    if methyls == 0:
        return np.full(count, 100.0 * backbone), np.zeros(count)
    chosen = parameters or shipped_parameters()
    tables = _tables(chosen, backbone, methyls)
    mean, variance = np.empty(count), np.empty(count)
    for start in range(0, count, _ROWS_AT_ONCE):
        part = slice(start, start + _ROWS_AT_ONCE)
        mean[part], variance[part] = _sum_terms(chosen, tables, positions[part], backbone)
    variance += chosen.noise[methyls > 1] ** 2
    return mean + 100.0 * backbone + terms.MEAN_INCREMENT * methyls, chosen.spread * np.sqrt(variance)


def retention_index_of(chain: Chain, parameters: RetentionParameters | None = None) -> RetentionIndex:
    """Predict the index of one alkane.

    Raises
    ------
    SettingsError : the chain carries an end group.

    >>> retention_index_of(Chain(27))
    RetentionIndex(value=2700.0, sd=1e-06)
    """
    if chain.end_group.name != "alkane":
        raise SettingsError(
            f"no alkane retention index for the class {chain.end_group.name!r}",
            remedy="predict methyl esters by equivalent chain length; other classes have no retention model",
        )
    positions = np.array([chain.methyls], dtype=np.intp).reshape(1, -1)
    mean, sd = predict_retention(positions, chain.backbone, parameters)
    return RetentionIndex(float(mean[0]), sd=max(float(sd[0]), EXACT))


def design_row(positions: Iterable[int], backbone: int) -> Array:
    """Return the linear terms of one structure, shape (COLUMNS,).

    >>> bool(np.allclose(design_row((5, 11), 25), design_row((15, 21), 25)))
    True
    """
    place = np.array(sorted(positions), dtype=float)
    mono = terms.mono_terms(place, backbone, several=len(place) > 1).sum(axis=0)
    pair = np.zeros(terms.PAIR_COLUMNS)
    for i, j, between in _pairs(len(place)):
        pair += terms.pair_terms(place[[i]], place[[j]], between, backbone)[0]
    return np.concatenate([mono, pair, terms.whole_terms(place[None])[0]])


def fixed_offset(positions: Iterable[int]) -> float:
    """Return what is added before any coefficient [units]: the expected interaction of close neighbours."""
    return float(terms.close_offset(np.diff(np.array(sorted(positions), dtype=float))).sum())


def whitened_closeness(patterns: Array, others: Array) -> Array:
    """Return closeness to ``others`` in coordinates independent a priori: (S, k), (T, k) to (S, T)."""
    among = terms.closeness(others, others) + 1e-6 * np.eye(len(others))
    root = np.linalg.cholesky(among)
    return np.asarray(np.linalg.solve(root, terms.closeness(patterns, others).T).T)


@lru_cache(maxsize=1)
def shipped_parameters() -> RetentionParameters:
    """Return the fit in the shipped reference set."""
    return parameters_from_record(load_reference(REFERENCE_SET)["alkanes"])


def parameters_from_record(record: Mapping[str, Any]) -> RetentionParameters:
    """Read parameters from their JSON form.

    Raises
    ------
    ReferenceDataError : the terms of the set are not those of this program.
    """
    if record["groups"] != [[group.name, group.columns] for group in terms.GROUPS]:
        raise ReferenceDataError("retention.json was fitted with other terms; run `branchpos refit` again")
    size = len(record["coefficients"])
    covariance = np.zeros((size, size))
    covariance[np.tril_indices(size)] = record["covariance_lower"]
    covariance += np.tril(covariance, -1).T
    return RetentionParameters(
        np.array(record["coefficients"], dtype=float),
        covariance,
        {len(rows[0]): np.array(rows, dtype=float) for rows in record["patterns"]},
        float(record["closeness_sd"]),
        (float(record["noise"][0]), float(record["noise"][1])),
        float(record["spread"]),
        dict(record["provenance"]),
    )


def _check(positions: NDArray[np.intp], backbone: int) -> None:
    if positions.ndim != 2:
        raise SettingsError(
            f"positions of shape {positions.shape}", remedy="give one row a structure, one column a methyl"
        )
    outside = (positions < 2) | (positions >= backbone)
    if outside.any():
        raise SettingsError(
            f"no methyl can sit on position {positions[outside][0]} of a {backbone}-carbon alkane",
            remedy=f"use positions 2 to {backbone - 1}",
        )
    if (np.diff(positions, axis=1) < 0).any():
        raise SettingsError("methyl positions that do not rise along a row", remedy="sort each row")


def _pairs(methyls: int) -> Iterator[tuple[int, int, int]]:
    return ((i, j, j - i - 1) for i, j in combinations(range(methyls), 2))


@lru_cache(maxsize=24)
def _tables(parameters: RetentionParameters, backbone: int, methyls: int) -> _Tables:
    """Multiply the terms of every position and pair by mean coefficients and root of their covariance."""
    project = _projection(parameters, methyls)
    at_pair = terms.MONO_COLUMNS + terms.PAIR_COLUMNS
    place = np.arange(2.0, backbone)
    mono = np.zeros((backbone, project.shape[1]), np.float32)
    mono[2:] = terms.mono_terms(place, backbone, methyls > 1) @ project[: terms.MONO_COLUMNS]
    onto = project[terms.MONO_COLUMNS : at_pair]
    pair = tuple(_pair_table(backbone, between, onto) for between in range(max(methyls - 1, 0)))
    whole, pattern = project[at_pair:COLUMNS], project[COLUMNS:]
    return _Tables(mono, pair, whole.astype(np.float32), pattern.astype(np.float32))


def _pair_table(backbone: int, between: int, onto: Array) -> NDArray[np.float32]:
    first, second = np.triu_indices(backbone - 2)
    first, second = first + 2, second + 2
    table = np.zeros((backbone, backbone, onto.shape[1]), np.float32)
    table[first, second] = (
        terms.pair_terms(first.astype(float), second.astype(float), between, backbone) @ onto
    )
    if between == 0:
        table[first, second, 0] += terms.close_offset((second - first).astype(float))
    return table.reshape(backbone * backbone, -1)


@lru_cache(maxsize=24)
def _projection(parameters: RetentionParameters, methyls: int) -> Array:
    """Return the coefficients beside a square root of their covariance, shape (rows, 1 + rank)."""
    rows = parameters.rows_of(methyls)
    values, vectors = np.linalg.eigh(parameters.covariance[np.ix_(rows, rows)])
    # Directions that the fit pins down to a hundredth of a unit add nothing that shows.
    keep = values > 1e-4
    root = vectors[:, keep] * np.sqrt(values[keep])
    return np.column_stack([parameters.coefficients[rows], root])


def _sum_terms(
    parameters: RetentionParameters, tables: _Tables, positions: NDArray[np.intp], backbone: int
) -> tuple[Array, Array]:
    """Return mean increment and its variance, shape (S,) each, without the noise of a measurement."""
    methyls = positions.shape[1]
    total = terms.whole_terms(positions.astype(float)).astype(np.float32) @ tables.whole
    for column in positions.T:
        total += tables.mono[column]
    for i, j, between in _pairs(methyls):
        total += tables.pair[between][positions[:, i] * backbone + positions[:, j]]
    unexplained = np.full(len(positions), parameters.closeness_sd**2 * (methyls > 1))
    if methyls in parameters.patterns:
        lowest = terms.lowest_locants(positions.astype(float), backbone)
        shared = whitened_closeness(lowest, parameters.patterns[methyls])
        total += shared.astype(np.float32) @ tables.pattern
        unexplained *= np.maximum(1.0 - (shared**2).sum(axis=1), 0.0)
    variance = np.einsum("sd,sd->s", total[:, 1:], total[:, 1:])
    return total[:, 0].astype(float), variance + unexplained
