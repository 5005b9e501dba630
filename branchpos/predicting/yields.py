"""From parameters to yields: tables over the states of a cleavage and the size of the ion."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from branchpos.predicting.cleavage import states
from branchpos.predicting.parameters import POOL_EVEN_SIZES, POOL_SIZES, SIDE_SERIES

_REFERENCE_SURVIVAL, _REFERENCE_DOUBLET = 10, 12
"""Sizes [carbons] at which survival and doublet ratio are quoted."""
_HIGHEST_SURVIVAL = 0.95
_METHYL_LOSS_EVEN = -1.5
"""Log even/odd ratio of M-15: a hydrogen seldom moves to so small a radical (common practice)."""


@dataclass(frozen=True, slots=True, eq=False)
class YieldTables:
    """What every cleavage of a chain of given carbons contributes.

    Attributes
    ----------
    doublet : surviving ions of each state and size, odd mass real and even mass imaginary, flat, shape
        (states * (carbons + 2),).
    steered : the same where a branch sits on the ion's own end carbon, else 0.
    lost : what falls apart further, same shape.
    methyl_doublet, methyl_lost : the same for the loss of one single and one geminal methyl, shape (2,).
    pool, pool_even : weights of daughter ions and their even shares, shape (carbons + 2,).
    side : abundance of the side ions relative to their odd daughters, shape (side ions,).
    """

    doublet: NDArray[np.complex64]
    steered: NDArray[np.complex64]
    lost: NDArray[np.float32]
    methyl_doublet: NDArray[np.complex64]
    methyl_lost: NDArray[np.float32]
    pool: NDArray[np.float64]
    pool_even: NDArray[np.float64]
    side: NDArray[np.float64]


def yield_tables(named: Mapping[str, float], carbons: int, methyls: int) -> YieldTables:
    """Work out the tables for chains of so many carbons and methyls."""
    sizes = np.arange(carbons + 2, dtype=float)
    own, other, around = states()
    rate = np.exp(_log_rate(named, own, other, carbons))
    survival = _survival(named, own, around, sizes)
    even = _logistic(_log_doublet(named, own, around, sizes))
    doublet = rate * survival * ((1 - even) + 1j * even)
    methyl_doublet, methyl_lost = _methyl_loss(named, carbons, methyls)
    return YieldTables(
        doublet=doublet.ravel().astype(np.complex64),
        steered=(doublet * (own > 0)[:, None]).ravel().astype(np.complex64),
        lost=(rate * (1 - survival)).ravel().astype(np.float32),
        methyl_doublet=methyl_doublet,
        methyl_lost=methyl_lost,
        pool=_pool(named, carbons),
        pool_even=_logistic(_pool_even(named, carbons)),
        side=_side(named, carbons),
    )


def _log_rate(
    named: Mapping[str, float], own: NDArray[np.int32], other: NDArray[np.int32], carbons: int
) -> NDArray[np.float64]:
    site = np.array([0.0, named["rate_secondary"], named["rate_tertiary"]])
    radical = np.zeros(carbons + 2)
    radical[[carbons - 1, carbons - 2]] = named["rate_methyl_radical"], named["rate_ethyl_radical"]
    gain = site[own] + named["rate_branched_radical"] * other
    return np.asarray(gain[:, None] + radical)


def _survival(
    named: Mapping[str, float], own: NDArray[np.int32], around: NDArray[np.int32], sizes: NDArray[np.float64]
) -> NDArray[np.float64]:
    growth = np.log(np.maximum(sizes, 1) / _REFERENCE_SURVIVAL)
    level = np.array([named["survival_primary"], *[named["survival_branched"]] * 2])
    level[2] += named["survival_tertiary"]
    fall = np.array([named["survival_primary_fall"], *[named["survival_branched_fall"]] * 2])
    inner = named["survival_inner_methyl"] * (around == 2)
    log_survival = (level[own] + inner)[:, None] - fall[own][:, None] * growth
    return np.asarray(np.minimum(np.exp(log_survival), _HIGHEST_SURVIVAL))


def _log_doublet(
    named: Mapping[str, float], own: NDArray[np.int32], around: NDArray[np.int32], sizes: NDArray[np.float64]
) -> NDArray[np.float64]:
    growth = np.log(np.maximum(sizes, 1) / _REFERENCE_DOUBLET)
    level = np.array([named["even_primary"], named["even_own_methyl"], named["even_inner_methyl"]])
    rise = np.array([0.0, named["even_own_methyl_rise"], named["even_inner_methyl_rise"]])
    tertiary = named["even_tertiary"] * (own == 2)
    return np.asarray((level[around] + tertiary)[:, None] + rise[around][:, None] * growth)


def _methyl_loss(
    named: Mapping[str, float], carbons: int, methyls: int
) -> tuple[NDArray[np.complex64], NDArray[np.float32]]:
    around = np.array([2 if methyls > 1 else 1], dtype=np.int32)
    survival = _survival(named, np.array([1], dtype=np.int32), around, np.array([carbons - 1.0]))[0, 0]
    rates = np.exp(named["rate_methyl_branch"] + named["rate_methyl_geminal"] * np.arange(2.0))
    even = 1 / (1 + np.exp(-_METHYL_LOSS_EVEN))
    doublet = rates * survival * ((1 - even) + 1j * even)
    return doublet.astype(np.complex64), (rates * (1 - survival)).astype(np.float32)


def _pool(named: Mapping[str, float], carbons: int) -> NDArray[np.float64]:
    largest = POOL_SIZES[-1]
    beyond = np.arange(carbons + 2) - largest
    weights = np.exp(named[f"pool_{largest}"] - named["pool_decay"] * beyond)
    weights[: POOL_SIZES[0]] = 0.0
    for size in POOL_SIZES:
        if size < carbons + 2:
            weights[size] = np.exp(named[f"pool_{size}"])
    weights[carbons + 1] = 0.0
    return np.asarray(weights, dtype=float)


def _pool_even(named: Mapping[str, float], carbons: int) -> NDArray[np.float64]:
    ratios = np.full(carbons + 2, named["pool_even_large"])
    for size in POOL_EVEN_SIZES:
        if size < carbons + 2:
            ratios[size] = named[f"pool_even_{size}"]
    return ratios


def side_ions(carbons: int) -> list[tuple[int, int]]:
    """Return (series, size) of the side ions that a chain of so many carbons can show."""
    return [(series, size) for series, sizes in SIDE_SERIES.items() for size in sizes if size < carbons]


def _side(named: Mapping[str, float], carbons: int) -> NDArray[np.float64]:
    return np.exp([named[f"side_{series}_{size}"] for series, size in side_ions(carbons)])


def _logistic(values: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.asarray(1 / (1 + np.exp(-values)))
