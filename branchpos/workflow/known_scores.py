"""Scoring the records of one known compound by models fitted without it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from branchpos.chain import Chain
from branchpos.naming import shorthand, systematic_name
from branchpos.predicting.retention import RetentionParameters
from branchpos.predicting.retention_fit import IndexRow
from branchpos.retention_index import RetentionIndex
from branchpos.workflow.held_out import (
    HeldOutFit,
    fit_without,
    index_chain,
    largest_move,
    model_of,
    refuse_overlap,
    retention_without,
    usable,
)
from branchpos.workflow.model import Model
from branchpos.workflow.record_scores import TruthScore, score_record
from branchpos.workflow.reference_spectra import KnownSpectrum, read_known_spectra
from branchpos.workflow.yardsticks import IonCount, count_ions, nearest_spectrum, same_branching
from branchpos.workflow.yield_fit import YieldFit

INDEX_SD = 1.0
"""Standard deviation [units] that the measured index is given."""


@dataclass(frozen=True, slots=True, eq=False)
class IndexKnowledge:
    """Measured indices and the retention model fitted to all of them; both empty where there are none."""

    rows: tuple[IndexRow, ...] = ()
    fitted: RetentionParameters | None = None

    def index_of(self, chain: Chain) -> tuple[float, str] | None:
        """Return the index [units] of a chain and where it comes from, None where nobody measured it."""
        if self.fitted is None:
            return None
        if not chain.is_branched:
            return 100.0 * chain.carbons, "by definition"
        found = [row.index for row in self.rows if index_chain(row) == chain]
        return (sum(found) / len(found), "measured") if found else None

    def without(self, chain: Chain) -> RetentionParameters | None:
        """Return the retention model fitted without a chain."""
        if any(index_chain(row) == chain for row in self.rows):
            return retention_without(self.rows, chain)
        return self.fitted


@dataclass(frozen=True, slots=True)
class NearestScore:
    """The nearest spectrum of another compound, and whether its branching is that of the truth."""

    accession: str
    name: str
    cosine: float
    right: bool


@dataclass(frozen=True, slots=True)
class RecordScore:
    """One record of known structure.

    Attributes
    ----------
    accession, quality : name of the record, and its flag in the table of the truth.
    chain, name, short_name : the truth.
    alone : the verdict on the spectrum alone, against the truth.
    index, index_source : the index that was added [units], None where there is none.
    indexed : the verdict with it.
    nearest, ion_count : what the two simple yardsticks say.
    """

    accession: str
    quality: str
    chain: Chain
    name: str
    short_name: str
    alone: TruthScore
    index: float | None
    index_source: str
    indexed: TruthScore | None
    nearest: NearestScore | None
    ion_count: IonCount


@dataclass(frozen=True, slots=True)
class CompoundScore:
    """The records of one compound, and the fit that scored them.

    Attributes
    ----------
    name : the compound.
    refitted : false where no record of it took part in the fit to all, which then scores it.
    cold : whether the fit began from no former fit.
    iterations, last_move : see ``HeldOutFit``.
    records : their scores.
    """

    name: str
    refitted: bool
    cold: bool
    iterations: int
    last_move: float
    records: tuple[RecordScore, ...]


@dataclass(frozen=True, slots=True)
class StartCheck:
    """Whether a fit that began from the fit to all reaches what one from no start reaches.

    Attributes
    ----------
    name : the compound left out.
    largest_move : largest difference of a parameter [standard errors].
    posterior_warm, posterior_cold : probability of the truth under both, mean over its records.
    """

    name: str
    largest_move: float
    posterior_warm: float
    posterior_cold: float


def score_compound(folder: Path, chain: Chain, full: YieldFit, indices: IndexKnowledge) -> CompoundScore:
    """Score every record of a chain by models that have seen none of them.

    Raises
    ------
    OverlapError : a record took part in the fit of its model.
    """
    known = read_known_spectra(folder)
    mine = [one for one in known if one.chain == chain]
    refitted = bool(usable(mine))
    held_out = HeldOutFit(full, 0, 0.0)
    if refitted:
        held_out = fit_without(known, chain, None if chain.is_branched else full)
    model = model_of(held_out.fit, indices.without(chain))
    refuse_overlap([one.accession for one in mine], model)
    scores = tuple(_score(one, known, model, indices) for one in mine)
    cold = refitted and chain.is_branched
    return CompoundScore(
        systematic_name(chain), refitted, cold, held_out.iterations, held_out.last_move, scores
    )


def compare_starts(folder: Path, chain: Chain, full: YieldFit) -> StartCheck:
    """Leave a chain out twice, beginning from the fit to all and from no fit, and compare."""
    known = read_known_spectra(folder)
    warm, cold = fit_without(known, chain, full).fit, fit_without(known, chain, None).fit
    mine = [one for one in known if one.chain == chain]
    posteriors = [
        sum(score_record(one, model_of(fit)).posterior for one in mine) / len(mine) for fit in (warm, cold)
    ]
    return StartCheck(systematic_name(chain), largest_move(warm, cold), *posteriors)


def _score(
    one: KnownSpectrum, known: Sequence[KnownSpectrum], model: Model, indices: IndexKnowledge
) -> RecordScore:
    found = indices.index_of(one.chain)
    indexed = score_record(one, model, RetentionIndex(found[0], INDEX_SD)) if found else None
    return RecordScore(
        accession=one.accession,
        quality=one.quality,
        chain=one.chain,
        name=systematic_name(one.chain),
        short_name=shorthand(one.chain),
        alone=score_record(one, model),
        index=found[0] if found else None,
        index_source=found[1] if found else "",
        indexed=indexed,
        nearest=_nearest(one, known),
        ion_count=count_ions(one, model),
    )


def _nearest(one: KnownSpectrum, known: Sequence[KnownSpectrum]) -> NearestScore | None:
    found = nearest_spectrum(one, known)
    if found is None:
        return None
    right = same_branching(one.chain, found.chain)
    return NearestScore(found.accession, systematic_name(found.chain), found.cosine, right)
