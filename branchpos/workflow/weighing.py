"""The ranked hypotheses with their evidence, ion by ion, in bits."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.deciding.posterior import Posterior
from branchpos.evidence import IonEvidence, Shares
from branchpos.ion_series import IonKind
from branchpos.mass_channels import MassChannels
from branchpos.predicting.labels import NEIGHBOUR, mass_labels
from branchpos.verdict import RankedHypothesis
from branchpos.workflow.scores import ScoredBatch

FloatArray = NDArray[np.float64]

LOWEST_POSTERIOR, MOST_LISTED = 1e-4, 200
"""Hypotheses are listed down to this posterior, and at most this many, unless all are asked for."""
_BITS = 1 / np.log(2)


@dataclass(frozen=True, slots=True)
class Place:
    """Where a ranked chain stands: batch, row, posterior."""

    batch: int
    row: int
    posterior: float


def rank(scored: Sequence[ScoredBatch], posterior: Posterior, everything: bool = False) -> list[Place]:
    """Return the places of the chains to list, likeliest first."""
    owner = np.repeat(np.arange(len(scored)), [len(one.batch) for one in scored])
    row = np.concatenate([np.arange(len(one.batch)) for one in scored])
    probability = np.concatenate(posterior.chains)
    order = np.argsort(-probability, kind="stable")
    if not everything:
        order = order[:MOST_LISTED]
        order = order[: max(2, int((probability[order] >= LOWEST_POSTERIOR).sum()))]
    return [Place(int(owner[i]), int(row[i]), float(probability[i])) for i in order]


def chain_at(scored: Sequence[ScoredBatch], place: Place) -> Chain:
    """Return the chain of a place."""
    return scored[place.batch].batch.chain(place.row)


def describe(
    scored: Sequence[ScoredBatch], places: Sequence[Place], channels: MassChannels
) -> tuple[RankedHypothesis, ...]:
    """Return the ranked hypotheses; each is weighed against the first, the first against the second."""
    accounts = [_account(scored[place.batch], place.row) for place in places]
    described = []
    for index, (place, account) in enumerate(zip(places, accounts, strict=True)):
        other = accounts[1 if index == 0 else 0] if len(accounts) > 1 else None
        described.append(_hypothesis(scored[place.batch], place, account, other, channels))
    return tuple(described)


@dataclass(frozen=True, slots=True, eq=False)
class _Account:
    """Log likelihood of one chain by mass number, and its other terms."""

    by_mass: dict[int, float]
    instrument: float
    retention: float
    prior: float


def _account(one: ScoredBatch, row: int) -> _Account | None:
    """Break the likelihood of a chain down; None for a chain that only the screening saw."""
    at = int(np.searchsorted(one.fitted_rows, row))
    if at >= one.fitted_rows.size or one.fitted_rows[at] != row:
        return None
    by_mass = dict(zip(one.remainder.masses.tolist(), one.remainder.by_mass.tolist(), strict=True))
    by_mass |= dict(zip(one.batch.masses.tolist(), one.fit.by_ion[at].tolist(), strict=True))
    terms = float(one.log_likelihood[row]) - sum(by_mass.values())
    return _Account(by_mass, terms, float(one.retention[row]), float(one.log_prior[row]))


def _hypothesis(
    one: ScoredBatch, place: Place, account: _Account | None, other: _Account | None, channels: MassChannels
) -> RankedHypothesis:
    chain = one.batch.chain(place.row)
    z = float(one.retention_z[place.row])
    ions: tuple[IonEvidence, ...] = ()
    shares = None
    if account is not None and other is not None:
        ions = _ions(one, place.row, chain, account, other, channels)
        shares = _shares(account, other, ions)
    return RankedHypothesis(
        chain=chain,
        posterior=place.posterior,
        log_likelihood=float(one.log_likelihood[place.row] + one.retention[place.row]),
        retention_z=None if np.isnan(z) else z,
        ions=ions,
        shares=shares,
    )


def _ions(
    one: ScoredBatch, row: int, chain: Chain, account: _Account, other: _Account, channels: MassChannels
) -> tuple[IonEvidence, ...]:
    expected = one.fit.expected[int(np.searchsorted(one.fitted_rows, row))]
    view = channels.at(one.batch.masses)
    labels = mass_labels(chain)
    return tuple(
        IonEvidence(
            mz=mass,
            carbons=int(one.batch.carbons[column]),
            observed=float(view.intensity[column]) if view.seen[column] else None,
            expected=float(expected[column]),
            threshold=channels.threshold,
            cleavage=labels.get(mass, NEIGHBOUR),
            kind=IonKind(int(one.batch.kinds[column])),
            weight_of_evidence=(account.by_mass[mass] - other.by_mass.get(mass, 0.0)) * _BITS,
        )
        for mass, column in sorted((int(m), i) for i, m in enumerate(one.batch.masses))
        if view.recorded[column]
    )


def _shares(account: _Account, other: _Account, ions: Sequence[IonEvidence]) -> Shares:
    listed = sum(ion.weight_of_evidence for ion in ions)
    everything = (sum(account.by_mass.values()) - sum(other.by_mass.values())) * _BITS
    return Shares(
        ions=listed,
        other_masses=everything - listed,
        instrument=(account.instrument - other.instrument) * _BITS,
        retention_index=(account.retention - other.retention) * _BITS,
        prior=(account.prior - other.prior) * _BITS,
    )
