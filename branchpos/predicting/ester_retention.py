"""Equivalent chain length of branched methyl esters, and their index on the n-alkane scale.

Equivalent chain length: straight-chain methyl esters stand at the carbons of their acid, others in between
(Miwa, Mikolajczak, Earle and Wolff, Anal. Chem. 32 (1960) 1739-1742). Too few branched esters are measured to
fit positions one by one. The increment is taken over from the alkane in which a stretch of chain stands for
the carboxyl end, and six measured esters (iso, anteiso, mid-chain; DB-5) say how well that holds.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.errors import SettingsError
from branchpos.predicting.retention import predict_retention
from branchpos.predicting.retention_terms import Array
from branchpos.reference_data import load_reference
from branchpos.retention_index import RetentionIndex

SOURCE = "environmental fatty acid methyl esters on DB-5, bovee/AstonMSLibs (MIT); six branched, ten straight"

_CARBOXYL = 3
"""Chain carbons that the ester end stands for; the six esters fit equally well with 2 to 4."""

_FIRST_FREE = 2
_SD_FLOOR = 0.03
"""Least standard deviation [chain lengths]: six esters of three kinds cannot vouch for a finer one."""

_NEAR_CARBOXYL = {2: 0.25, 3: 0.15, 4: 0.12, 5: 0.08, 6: 0.06}
"""Added standard deviation [chain lengths] beside the carboxyl, where no ester here was measured.

From memory: 2-methyl esters elute some 0.2 earlier than an alkane's methyl would suggest.
"""


@dataclass(frozen=True, slots=True)
class EsterRetention:
    """What the measured esters yield.

    Attributes
    ----------
    bias, sd : mean and standard deviation of measured less alkane-derived increments [chain lengths].
    intercept, slope : of the line that straight-chain esters follow [units, units a carbon].
    scatter : standard deviation of the straight-chain esters about it [units].
    """

    bias: float
    sd: float
    intercept: float
    slope: float
    scatter: float


def predict_equivalent_chain_length(
    positions: NDArray[np.int_], backbone: int, parameters: EsterRetention | None = None
) -> tuple[Array, Array]:
    """Predict the equivalent chain lengths of methyl esters with the same backbone.

    Parameters
    ----------
    positions : shape (S, k), methyl positions counted from the carboxyl carbon, each row rising.
    backbone : carbons of the acid's main chain.
    parameters : a fit; the shipped one when not given.

    Returns
    -------
    mean, sd : shape (S,) each [chain lengths]. Straight chains have their carbons and sd 0.

    Raises
    ------
    SettingsError : a position lies outside the chain or a row does not rise.

    >>> mean, sd = predict_equivalent_chain_length(np.array([[13], [12]]), 14)
    >>> [float(round(length, 1)) for length in mean], bool((sd < 0.06).all())
    ([14.6, 14.7], True)
    """
    positions = np.asarray(positions, dtype=np.intp)
    if (positions < _FIRST_FREE).any():
        raise SettingsError(
            f"no methyl can sit on position {positions.min()} of a methyl ester",
            remedy=f"use positions {_FIRST_FREE} to {backbone - 1}",
        )
    methyls = positions.shape[-1]
    mean, sd = _from_alkane(positions, backbone)
    if methyls == 0:
        return mean, sd
    fitted = parameters or shipped_ester_parameters()
    beside = sum(
        ((positions == place).sum(axis=1) * extra**2 for place, extra in _NEAR_CARBOXYL.items()), start=0.0
    )
    return mean + methyls * fitted.bias, np.sqrt(sd**2 + methyls * fitted.sd**2 + beside)


def index_of_equivalent(
    length: float, sd: float = 0.0, parameters: EsterRetention | None = None
) -> RetentionIndex:
    """Convert an equivalent chain length [carbons] with its standard deviation to the n-alkane scale on DB-5.

    >>> index_of_equivalent(18.0).value > 2100
    True
    """
    fitted = parameters or shipped_ester_parameters()
    value = fitted.intercept + fitted.slope * length
    return RetentionIndex(value, sd=float(np.hypot(fitted.slope * sd, fitted.scatter)))


def ester_index_of(chain: Chain, parameters: EsterRetention | None = None) -> RetentionIndex:
    """Predict the index of one methyl ester on the n-alkane scale.

    Raises
    ------
    SettingsError : the chain is not a methyl ester.
    """
    if chain.end_group.name != "methyl ester":
        raise SettingsError(
            f"no equivalent chain length for the class {chain.end_group.name!r}",
            remedy="only methyl esters have one here",
        )
    positions = np.array([chain.methyls], dtype=np.intp).reshape(1, -1)
    mean, sd = predict_equivalent_chain_length(positions, chain.backbone, parameters)
    return index_of_equivalent(float(mean[0]), float(sd[0]), parameters)


def fit_ester_retention(
    branched: Sequence[tuple[int, tuple[int, ...], float]], straight: Sequence[tuple[int, float]]
) -> EsterRetention:
    """Fit bias, spread and line to measured esters.

    Parameters
    ----------
    branched : backbone [carbons], methyl positions, equivalent chain length; one a compound.
    straight : acid carbons and index on the n-alkane scale; one a record.
    """
    gaps = np.array(
        [length - _from_alkane(np.array([where]), chain)[0][0] for chain, where, length in branched]
    )
    carbons, index = np.array(straight, dtype=float).T
    slope, intercept = np.polyfit(carbons, index, 1)
    left = index - intercept - slope * carbons
    return EsterRetention(
        bias=float(gaps.mean()),
        sd=max(float(gaps.std(ddof=1)), _SD_FLOOR),
        intercept=float(intercept),
        slope=float(slope),
        scatter=float(np.sqrt((left**2).sum() / (len(left) - 2))),
    )


def ester_record_of(fitted: EsterRetention, date: str = "") -> dict[str, Any]:
    """Return the JSON form of fitted parameters."""
    numbers = {name: round(getattr(fitted, name), 4) for name in EsterRetention.__slots__}
    return {"provenance": {"source": SOURCE, "date": date}, **numbers}


@lru_cache(maxsize=1)
def shipped_ester_parameters() -> EsterRetention:
    """Return the fit in the shipped reference set."""
    record: Mapping[str, Any] = load_reference("retention.json")["methyl esters"]
    return EsterRetention(**{name: float(record[name]) for name in EsterRetention.__slots__})


def _from_alkane(positions: NDArray[np.intp], backbone: int) -> tuple[Array, Array]:
    """Return equivalent chain length and sd if the carboxyl end were a stretch of chain; shape (S,) each."""
    mean, sd = predict_retention(positions + _CARBOXYL, backbone + _CARBOXYL)
    return mean / 100 - _CARBOXYL, sd / 100
