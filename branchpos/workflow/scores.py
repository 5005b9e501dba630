"""From screened candidates to log likelihoods, priors and evidence of every hypothesis."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from branchpos.enumerating import PRIORS
from branchpos.hypothesis import Rival
from branchpos.ion_series import SeriesBatch
from branchpos.predicting.alkenes import predict_alkene
from branchpos.retention_index import RetentionIndex
from branchpos.scoring.likelihood import Fit
from branchpos.scoring.remainder import Remainder, score_no_chain
from branchpos.scoring.retention import retention_log_likelihood, retention_z
from branchpos.workflow.candidates import Screened, SizeGroup
from branchpos.workflow.method import ALL_CARBONS, Method
from branchpos.workflow.model import Model
from branchpos.workflow.recordings import Recording
from branchpos.workflow.retention import has_retention_model, predict_index

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

RIVAL_SHARE = 0.05
"""Prior of each rival (judgement); chains share what is left."""
_WIDENED_OTHERWISE, _WIDENED_ALKENE = 2.5, 2.0
"""How much wider ions may err for a hydrocarbon whose branches, or bond, are not modelled (judgement)."""
_RIVAL_INDEX_SPAN = 1000.0
"""Width [units] over which the index of a rival may fall anywhere (judgement)."""
_RIVAL_MARGIN = 25.0
"""Natural-log margin of a size's best chain within which rivals of that size are scored."""
_MARGIN, _MOST_FITTED, _FEWEST_FITTED = 14.0, 500, 30
"""Natural-log margin of the screening within which chains get the full likelihood, and how many."""


@dataclass(frozen=True, slots=True, eq=False)
class ScoredBatch:
    """Chains of one batch with all that bears on them; arrays of shape (chains,) unless said otherwise.

    Attributes
    ----------
    batch : expected ions.
    log_likelihood : spectrum only, remainder included.
    retention : log likelihood of the measured index, 0 without one.
    retention_z : its residual in standard deviations, nan without one.
    log_prior : natural log of the prior.
    fitted_rows : rows that got the full likelihood, rising; the others hold the screening's estimate.
    fit : their fit, rows in that order.
    remainder : log likelihood of the masses without an ion.
    """

    batch: SeriesBatch
    log_likelihood: FloatArray
    retention: FloatArray
    retention_z: FloatArray
    log_prior: FloatArray
    fitted_rows: IntArray
    fit: Fit
    remainder: Remainder

    @property
    def log_joint(self) -> FloatArray:
        """Log of prior times likelihood."""
        return self.log_likelihood + self.retention + self.log_prior


def score_candidates(
    recordings: Sequence[Recording],
    groups: Sequence[SizeGroup],
    measured: RetentionIndex | None,
    method: Method,
    model: Model,
) -> list[ScoredBatch]:
    """Give the leading chains the full likelihood, and all chains prior and retention index."""
    pairs = [(group, screened) for group in groups for screened in group.screened]
    known = [_known_beforehand(screened, measured, method, model) for _, screened in pairs]
    rests = {id(group): [_rest(one, group) for one in recordings] for group in groups}
    rough = [
        recordings[0].screen(screened) + rests[id(group)][0].total + prior + retention
        for (group, screened), (prior, retention, _) in zip(pairs, known, strict=True)
    ]
    lowest = _cut(np.concatenate(rough))
    scored = [
        _scored(screened, joint, lowest, before, recordings, rests[id(group)])
        for (group, screened), joint, before in zip(pairs, rough, known, strict=True)
    ]
    return _with_unfitted(scored, rough)


def _with_unfitted(scored: list[ScoredBatch], rough: list[FloatArray]) -> list[ScoredBatch]:
    """Give chains without the full likelihood their distance from the best by the screening."""
    best = max(float(one.log_joint[one.fitted_rows].max(initial=-np.inf)) for one in scored)
    best_rough = max(float(joint.max(initial=-np.inf)) for joint in rough)
    completed = []
    for one, joint in zip(scored, rough, strict=True):
        likelihood = best + joint - best_rough - one.retention - one.log_prior
        likelihood[one.fitted_rows] = one.log_likelihood[one.fitted_rows]
        completed.append(replace(one, log_likelihood=likelihood))
    return completed


def _rest(recording: Recording, group: SizeGroup) -> Remainder:
    """Score the masses without an ion at the effects of the best chain of a size."""
    if group.best is None:
        return _remainder(group)
    return recording.remainder(group.best, recording.fit(group.best).effects[0])


def _remainder(group: SizeGroup) -> Remainder:
    return group.remainder or Remainder(np.empty(0, dtype=np.intp), np.empty(0))


def _cut(rough: FloatArray) -> float:
    """Return the screening score down to which chains get the full likelihood."""
    ranked = np.sort(rough)[::-1]
    within = int(np.searchsorted(-ranked, -(ranked[0] - _MARGIN), side="right"))
    return float(ranked[min(max(within, _FEWEST_FITTED), _MOST_FITTED, ranked.size) - 1])


def _known_beforehand(
    screened: Screened, measured: RetentionIndex | None, method: Method, model: Model
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return log prior, log likelihood of the index and its residual for every chain."""
    batch = screened.batch
    prior = PRIORS[method.prior].log_prior(batch.positions, batch.backbone, batch.end_group)
    if screened.is_family:
        prior = prior + _family_gain(batch, method)
    prior = prior + np.log((1 - RIVAL_SHARE * len(Rival)) / (len(ALL_CARBONS) * len(method.chain)))
    if measured is None or not has_retention_model(batch.end_group):
        flat = 0.0 if measured is None else -float(np.log(_RIVAL_INDEX_SPAN))
        return prior, np.full(len(batch), flat), np.full(len(batch), np.nan)
    mean, sd = predict_index(batch.positions, batch.backbone, batch.end_group, model)
    return prior, retention_log_likelihood(measured, mean, sd), retention_z(measured, mean, sd)


def _family_gain(batch: SeriesBatch, method: Method) -> float:
    """Return what lets a family carry the whole prior of its number of methyls."""
    prior = PRIORS[method.prior]
    held = np.logaddexp.reduce(prior.log_prior(batch.positions, batch.backbone))
    methyls = batch.positions.shape[1]
    return float(-(methyls + 1) * np.log(2) - held)


def _scored(
    screened: Screened,
    rough: FloatArray,
    lowest: float,
    before: tuple[FloatArray, FloatArray, FloatArray],
    recordings: Sequence[Recording],
    rests: Sequence[Remainder],
) -> ScoredBatch:
    """Give the rows at or above the cut the full likelihood, averaged over the readings of the quality."""
    prior, retention, z = before
    rows = np.flatnonzero(rough >= lowest)
    leading = screened.batch.take(rows)
    fits = [recording.fit(leading) for recording in recordings]
    likelihood = np.full(len(screened.batch), -np.inf)
    likelihood[rows] = np.logaddexp.reduce(
        [
            fit.log_likelihood + rest.total + recording.log_prior
            for fit, rest, recording in zip(fits, rests, recordings, strict=True)
        ]
    )
    return ScoredBatch(screened.batch, likelihood, retention, z, prior, rows, fits[0], rests[0])


def score_rivals(
    recordings: Sequence[Recording], groups: Sequence[SizeGroup], measured: RetentionIndex | None
) -> dict[Rival, float]:
    """Return the log of prior times likelihood of each rival, summed over the sizes that matter."""
    share = np.log(RIVAL_SHARE) - (np.log(_RIVAL_INDEX_SPAN) if measured else 0.0)
    best = max(group.standing for group in groups)
    sizes = [group for group in groups if group.standing >= best - _RIVAL_MARGIN]
    per_size = share - np.log(len(ALL_CARBONS) * len({group.end_group for group in groups}))
    otherwise = [
        one.widened(_WIDENED_OTHERWISE).evidence(_mean_chain(group)) for one in recordings for group in sizes
    ]
    alkenes = [
        one.widened(_WIDENED_ALKENE).evidence(predict_alkene(carbons))
        for one in recordings
        for carbons in _alkene_sizes(sizes)
    ]
    nothing = score_no_chain(recordings[0].channels, recordings[0].heaviest)
    return {
        Rival.OTHERWISE_BRANCHED: float(np.logaddexp.reduce(otherwise) + per_size),
        Rival.ALKENE: float(np.logaddexp.reduce(alkenes) + share - np.log(len(ALL_CARBONS))),
        Rival.NO_CHAIN: nothing.total + float(share),
    }


def _alkene_sizes(sizes: Sequence[SizeGroup]) -> list[int]:
    """Return the carbons of alkenes about as heavy as the chains that matter, with and without end group."""
    found = set()
    for group in sizes:
        added = group.end_group.added.nominal_mass
        found |= {group.carbons, group.carbons + round((added + 2) / 14)}
    return sorted(carbons for carbons in found if carbons in ALL_CARBONS)


def _mean_chain(group: SizeGroup) -> SeriesBatch:
    """Return the mean of all chains of a size as a batch of one: branches somewhere, of some kind."""
    batch = max((one.batch for one in group.screened if not one.is_family), key=len)
    mean = np.exp(np.log(batch.abundance + 1e-9).mean(axis=0, keepdims=True))
    return replace(
        batch,
        positions=batch.positions[:1],
        abundance=mean.astype(np.float32),
        steered=batch.steered.mean(axis=0, keepdims=True),
    )
