"""From a verdict or a prediction to what its figure shows."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

import numpy as np

from branchpos.evidence import IonEvidence
from branchpos.ion_series import Ion, IonKind
from branchpos.naming import systematic_name
from branchpos.reporting.numbers import probability_text
from branchpos.reporting.picture import Layer, NamedSize, Picture, ShownIon
from branchpos.scoring.error_model import T_SCALE_TO_SD, ErrorModel
from branchpos.spectrum import Spectrum
from branchpos.verdict import RankedHypothesis, Verdict
from branchpos.workflow.model import Model, shipped_model
from branchpos.workflow.predict import REACH, Prediction

_MOST_NAMED = 5
_LEAST_BITS = 0.5
"""Weight from which the ions of one size are named."""
_LEAST_STEERED, _LEAST_EXPECTED = 0.5, 0.02
"""In a prediction, ions are named that come from branches by this share and are this tall."""


def picture_of(spectrum: Spectrum, verdict: Verdict, model: Model | None = None) -> Picture:
    """Return what the figure of a verdict shows: the two leading hypotheses that carry evidence.

    Parameters
    ----------
    spectrum : the spectrum that was judged.
    verdict : the verdict on it.
    model : the model whose error scales give the expected ranges; the shipped one when not given.
    """
    chosen = model or shipped_model()
    leading = [one for one in verdict.hypotheses[:2] if one.ions]
    return Picture(
        title=spectrum.title or spectrum.source,
        headline=f"{verdict.call}  ({verdict.status.value})",
        layers=tuple(_layer(one, chosen.of(one.chain.end_group).errors) for one in leading),
        named=_deciding(leading[0].ions) if leading else (),
        threshold=spectrum.relative_threshold,
    )


def picture_of_prediction(prediction: Prediction, model: Model | None = None) -> Picture:
    """Return what the figure of a prediction shows.

    Its ranges are those on one instrument, whose tilt of the mass axis is known: the wider intervals of the
    prediction itself would hide what the branches do.
    """
    chain, ions = prediction.chain, prediction.series.ions
    errors = (model or shipped_model()).of(chain.end_group).errors
    index = prediction.retention_index
    known = str(chain.formula) if index is None else f"{chain.formula}, retention index {index.value:.0f}"
    shown = tuple(_within(ion.mz, ion.carbons, ion.expected, ion.kind, errors) for ion in ions)
    return Picture(
        title=f"expected of {known}",
        headline=systematic_name(chain),
        layers=(Layer(chain, systematic_name(chain), shown),),
        named=_steered(ions),
    )


def _layer(one: RankedHypothesis, errors: ErrorModel) -> Layer:
    return Layer(
        chain=one.chain,
        label=f"{one.name}  {probability_text(one.posterior)}",
        ions=tuple(_shown(ion, errors) for ion in one.ions),
    )


def _shown(ion: IonEvidence, errors: ErrorModel) -> ShownIon:
    """Widen an expected abundance, on this instrument, by the error of its kind."""
    return replace(_within(ion.mz, ion.carbons, ion.expected, ion.kind, errors), observed=ion.observed)


def _within(mz: int, carbons: int, expected: float, kind: IonKind, errors: ErrorModel) -> ShownIon:
    reach = float(np.exp(REACH * T_SCALE_TO_SD * errors.scales[kind]))
    return ShownIon(mz, carbons, expected, expected / reach, expected * reach)


def _deciding(ions: Sequence[IonEvidence]) -> tuple[NamedSize, ...]:
    """Name the sizes whose ions weigh most, for or against."""
    by_size: dict[int, list[IonEvidence]] = {}
    for ion in ions:
        by_size.setdefault(ion.carbons, []).append(ion)
    weights = {size: sum(ion.weight_of_evidence for ion in group) for size, group in by_size.items()}
    telling = [size for size in weights if abs(weights[size]) >= _LEAST_BITS]
    leading = sorted(telling, key=lambda size: -abs(weights[size]))[:_MOST_NAMED]
    return tuple(
        NamedSize(size, _masses(by_size[size]), f"{weights[size]:+.1f} bits") for size in sorted(leading)
    )


def _masses(ions: Iterable[IonEvidence]) -> tuple[int, ...]:
    """Return the masses of a size that carry its weight, all that reach a quarter of the largest."""
    listed = list(ions)
    largest = max(abs(ion.weight_of_evidence) for ion in listed)
    return tuple(ion.mz for ion in listed if abs(ion.weight_of_evidence) >= largest / 4)


def _steered(ions: Sequence[Ion]) -> tuple[NamedSize, ...]:
    by_size: dict[int, list[Ion]] = {}
    for ion in ions:
        if ion.steered >= _LEAST_STEERED and ion.expected >= _LEAST_EXPECTED:
            by_size.setdefault(ion.carbons, []).append(ion)
    return tuple(NamedSize(size, tuple(ion.mz for ion in group)) for size, group in sorted(by_size.items()))
