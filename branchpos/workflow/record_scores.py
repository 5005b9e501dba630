"""How one verdict compares with the truth, as plain numbers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from branchpos.chain import Chain
from branchpos.naming import systematic_name
from branchpos.retention_index import RetentionIndex
from branchpos.verdict import RankedHypothesis, Status, Verdict
from branchpos.workflow.locate import locate_branches
from branchpos.workflow.method import Method
from branchpos.workflow.model import Model
from branchpos.workflow.reference_spectra import KnownSpectrum

ALKANES = Method(chain=("alkane",))
"""Settings of every verdict that is scored."""
CONFIDENT = 0.9
"""Probability from which an answer counts as confident."""


@dataclass(frozen=True, slots=True)
class TruthScore:
    """A verdict against the truth.

    Attributes
    ----------
    status, call, first : status in words, the call, name of the leading chain.
    first_posterior, first_is_branched : its probability, and whether it carries branches.
    rank : rank of the truth among the chains, None where it was not among those tried.
    posterior : probability of the truth, 0 where it was not tried.
    mass_above : summed probability of all that is likelier than the truth, "none of these" counted as one.
        The truth lies in the credible set of every level above this number.
    set_size, in_set : size of the credible set, and whether it holds the truth.
    unbranched, none_of_these : probability of all unbranched chains, and of no chain.
    size_right : whether the leading chain has the carbons of the truth.
    reasons, warnings : as in the verdict.
    """

    status: str
    call: str
    first: str
    first_posterior: float
    first_is_branched: bool
    rank: int | None
    posterior: float
    mass_above: float
    set_size: int
    in_set: bool
    unbranched: float
    none_of_these: float
    size_right: bool
    reasons: tuple[str, ...]
    warnings: tuple[str, ...]

    @property
    def branched(self) -> float:
        """Probability of all branched chains."""
        return max(0.0, 1.0 - self.unbranched - self.none_of_these)


def score_record(one: KnownSpectrum, model: Model, index: RetentionIndex | None = None) -> TruthScore:
    """Run ``locate_branches`` on a record of known structure and compare."""
    verdict = locate_branches(one.spectrum, ALKANES, retention_index=index, model=model)
    if one.chain not in (hypothesis.chain for hypothesis in verdict.hypotheses):
        verdict = locate_branches(one.spectrum, ALKANES, retention_index=index, model=model, everything=True)
    return compare(verdict, one.chain)


def compare(verdict: Verdict, truth: Chain) -> TruthScore:
    """Compare a verdict with the truth."""
    ranked = verdict.hypotheses
    place = next((at for at, one in enumerate(ranked) if one.chain == truth), None)
    return TruthScore(
        status=verdict.status.value,
        call=verdict.call,
        first=ranked[0].name,
        first_posterior=ranked[0].posterior,
        first_is_branched=ranked[0].chain.is_branched,
        rank=None if place is None else place + 1,
        posterior=0.0 if place is None else ranked[place].posterior,
        mass_above=_mass_above(ranked, place, verdict.none_of_these),
        set_size=len(verdict.credible_set),
        in_set=systematic_name(truth) in verdict.credible_set,
        unbranched=sum(one.posterior for one in ranked if not one.chain.is_branched),
        none_of_these=verdict.none_of_these,
        size_right=ranked[0].chain.carbons == truth.carbons,
        reasons=verdict.reasons,
        warnings=verdict.warnings,
    )


def confident_error(score: TruthScore, truth: Chain) -> str | None:
    """Say in what a confident answer is wrong; None where it is right or not confident."""
    if score.none_of_these >= CONFIDENT:
        return f"no chain at {score.none_of_these:.3f}"
    if truth.is_branched and score.unbranched >= CONFIDENT:
        return f"unbranched at {score.unbranched:.3f}"
    if not truth.is_branched and score.branched >= CONFIDENT:
        return f"branched at {score.branched:.3f}"
    if score.first_posterior >= CONFIDENT and score.rank != 1:
        return f"{score.first} at {score.first_posterior:.3f}"
    if score.status == Status.NARROWED.value and not score.in_set:
        return f"narrowed to {score.set_size} structures without the truth"
    return None


def _mass_above(ranked: Sequence[RankedHypothesis], place: int | None, none_of_these: float) -> float:
    if place is None:
        return 1.0
    above = sum(one.posterior for one in ranked[:place])
    return min(1.0, above + (none_of_these if none_of_these > ranked[place].posterior else 0.0))
