"""Models that have not seen what they are scored on: fits without one compound, and a check that it is so."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass, replace

import numpy as np

from branchpos.chain import Chain
from branchpos.errors import InputError, OverlapError
from branchpos.predicting.parameters import fitted_parameters
from branchpos.predicting.retention import RetentionParameters, shipped_parameters
from branchpos.predicting.retention_fit import IndexRow, fit_retention
from branchpos.scoring.error_model import fitted_errors
from branchpos.workflow.model import Model
from branchpos.workflow.reference_spectra import KnownSpectrum
from branchpos.workflow.refit import provenance_of
from branchpos.workflow.yield_fit import YieldFit, fit_yields

SETTLED = 0.02
"""Largest last move of any parameter, in standard errors, with which a fit counts as settled."""
_ROUND = 2
_MOST_ROUNDS = 20


@dataclass(frozen=True, slots=True)
class HeldOutFit:
    """A fit that started from another one.

    Attributes
    ----------
    fit : the fit.
    iterations : how many it took.
    last_move : largest move of a parameter in the last round [standard errors].
    """

    fit: YieldFit
    iterations: int
    last_move: float


def shipped_start() -> YieldFit:
    """Return the shipped parameters as a fit to begin from."""
    yields = fitted_parameters()
    # A plain mapping, since the read-only one cannot be handed to another process.
    return YieldFit(replace(yields, provenance=dict(yields.provenance)), fitted_errors(), np.inf)


def settle(
    known: Sequence[KnownSpectrum], start: YieldFit | None, left_out: Sequence[str] = ()
) -> HeldOutFit:
    """Fit until the parameters stand still.

    Parameters
    ----------
    known : the records of the fit.
    start : a former fit to begin from; None begins from the state of belief before any spectrum was seen.
    left_out : accessions to be named in the provenance as left out.

    Raises
    ------
    InputError : no record is left to fit to.
    """
    if not known:
        raise InputError("no record is left to fit the yields to", remedy="add records of other compounds")
    provenance, last, move = dict(provenance_of(known, left_out)), start, np.inf
    turn = 0
    while move >= SETTLED and turn < _MOST_ROUNDS:
        fitted = fit_yields(known, provenance, start=last, iterations=_ROUND)
        move, last = np.inf if last is None else largest_move(last, fitted), fitted
        turn += 1
    return HeldOutFit(fitted, turn * _ROUND, move)


def largest_move(before: YieldFit, after: YieldFit) -> float:
    """Return the largest difference of two fits in standard errors of the second."""
    errors = np.sqrt(np.diag(after.parameters.covariance))
    return float(np.max(np.abs(after.parameters.values - before.parameters.values) / errors))


def usable(known: Sequence[KnownSpectrum]) -> list[KnownSpectrum]:
    """Return the records that may take part in a fit: those that keep enough peaks."""
    return [one for one in known if not one.is_sparse]


def fit_without(known: Sequence[KnownSpectrum], chain: Chain, start: YieldFit | None) -> HeldOutFit:
    """Fit the yields to every usable record of another compound; all records of the chain leave together.

    Few compounds carry branches, and a start that knew one of them could hold the fit near it: without a
    branched compound the fit ought to begin from no start.
    """
    kept = [one for one in usable(known) if one.chain != chain]
    return settle(kept, start, [one.accession for one in known if one.chain == chain])


def retention_without(rows: Sequence[IndexRow], chain: Chain) -> RetentionParameters:
    """Fit the retention model to every measured compound but one."""
    return fit_retention([row for row in rows if index_chain(row) != chain])


def index_chain(row: IndexRow) -> Chain:
    """Return the structure of a measured index."""
    return Chain(row.backbone, row.methyls)


def refuse_overlap(accessions: Collection[str], model: Model) -> None:
    """Refuse to score records that took part in the fit of the model.

    Raises
    ------
    OverlapError : at least one of them did.
    """
    fitted = set(model.yields.provenance.get("accessions", "").split())
    if shared := sorted(fitted & set(accessions)):
        raise OverlapError(
            f"{shared[0]} took part in the fit of the model that is to score it"
            f"{f', and so did {len(shared) - 1} more' if len(shared) > 1 else ''}; fit again without it"
        )


def model_of(fit: YieldFit, retention: RetentionParameters | None = None) -> Model:
    """Return a fit as a model; the retention part is the shipped one when not given."""
    return Model(fit.parameters, fit.errors, retention or shipped_parameters())
