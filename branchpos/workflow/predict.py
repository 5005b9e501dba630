"""What a chain should show: its ions with intervals, and its retention index."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.errors import SettingsError
from branchpos.ion_series import Ion, IonKind, IonSeries, SeriesBatch
from branchpos.masses import Formula
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.labels import cleavage_labels, ion_label
from branchpos.predicting.parameters import YieldParameters
from branchpos.predicting.retention import retention_index_of
from branchpos.retention_index import RetentionIndex
from branchpos.scoring.error_model import T_SCALE_TO_SD, ErrorModel
from branchpos.scoring.likelihood import TILT_PIVOT
from branchpos.workflow.method import ALL_CARBONS
from branchpos.workflow.model import Model, shipped_model

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
    >>> [ion.mz for ion in found.series.ions if ion.expected > 0.9]
    [57]
    """
    chosen = model or shipped_model()
    _require_predictable(chain)
    batch = _batch(chain, chosen.yields)
    ions = tuple(ion for ion in _ions(chain, batch, chosen) if ion.expected >= least)
    return Prediction(IonSeries(chain, ions), retention_index_of(chain, chosen.retention))


def relative_abundance(batch: SeriesBatch) -> FloatArray:
    """Return abundances relative to the tallest ion of each chain, shape (chains, ions)."""
    abundance = batch.abundance.astype(float)
    return np.asarray(abundance / abundance.max(axis=1, keepdims=True))


def _require_predictable(chain: Chain) -> None:
    if chain.end_group.name != "alkane":
        raise SettingsError(
            f"the class {chain.end_group.name!r} cannot be predicted yet", remedy="give an alkane"
        )
    if chain.carbons not in ALL_CARBONS:
        raise SettingsError(
            f"a chain of {chain.carbons} carbons cannot be predicted",
            remedy=f"give one of {ALL_CARBONS[0]} to {ALL_CARBONS[-1]} carbons",
        )


def _batch(chain: Chain, yields: YieldParameters) -> SeriesBatch:
    positions = np.array([chain.methyls], dtype=np.int16).reshape(1, -1)
    return predict_alkanes(yields, chain.backbone, positions)


def _ions(chain: Chain, batch: SeriesBatch, model: Model) -> Iterator[Ion]:
    expected = relative_abundance(batch)[0]
    sd = np.sqrt(_parameter_variance(chain, model.yields) + _recording_variance(batch, model.errors))
    low, high = expected * np.exp(-REACH * sd), np.minimum(expected * np.exp(REACH * sd), 1.0)
    labels = cleavage_labels(chain)
    for column in np.argsort(batch.masses):
        mass, carbons = int(batch.masses[column]), int(batch.carbons[column])
        hydrogens = mass - 12 * carbons
        yield Ion(
            mz=mass,
            exact_mz=Formula(carbons, hydrogens).cation_mz,
            carbons=carbons,
            hydrogens=hydrogens,
            kind=IonKind(int(batch.kinds[column])),
            expected=float(expected[column]),
            low=float(low[column]),
            high=float(high[column]),
            steered=float(batch.steered[0, column]),
            cleavage=ion_label(chain, carbons, mass, labels),
        )


def _parameter_variance(chain: Chain, yields: YieldParameters) -> FloatArray:
    """Return the variance of each log relative abundance that the fitted parameters leave, shape (ions,)."""
    slopes = []
    for index in range(yields.values.size):
        ends = [_log_relative(chain, yields, index, step) for step in (_DIFFERENCE, -_DIFFERENCE)]
        slopes.append((ends[0] - ends[1]) / (2 * _DIFFERENCE))
    gradient = np.array(slopes)
    return np.asarray(np.einsum("pi,pq,qi->i", gradient, yields.covariance, gradient))


def _log_relative(chain: Chain, yields: YieldParameters, index: int, step: float) -> FloatArray:
    """Return log abundances relative to the base peak with one parameter shifted, shape (ions,)."""
    values = yields.values.copy()
    values[index] += step
    shifted = _batch(chain, replace(yields, values=values))
    return np.asarray(np.log(np.maximum(relative_abundance(shifted)[0], 1e-12)))


def _recording_variance(batch: SeriesBatch, errors: ErrorModel) -> FloatArray:
    """Return the variance by which a recording scatters, shape (ions,).

    The error of the ion itself, and what instruments differ in: the tilt of the mass axis from the base peak
    on, the weight of branch-steered ions, the level of their doublets.
    """
    base = int(batch.abundance[0].argmax())
    own = (np.array(errors.scales)[batch.kinds] * T_SCALE_TO_SD) ** 2
    tilt = errors.tilt_sd * (batch.carbons - batch.carbons[base]) / TILT_PIVOT
    contrast = errors.contrast_sd * batch.steered[0]
    doublet = errors.doublet_sd * batch.steered[0] * (batch.kinds == IonKind.REARRANGED)
    return np.asarray(own + tilt**2 + contrast**2 + doublet**2)
