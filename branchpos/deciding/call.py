"""The call: assigned, narrowed, open, unbranched, or no methyl-branched chain; and the credible set."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from branchpos.chain import Chain
from branchpos.deciding.posterior import Posterior
from branchpos.naming import systematic_name
from branchpos.verdict import Status

SURE = 0.9
"""Posterior from which a structure, or the absence of branches, is called."""
NARROW = 10
"""Largest credible set that counts as narrowed."""
TOLERATED_RIVALS = 0.2
"""Largest probability of the rivals with which a credible set counts as narrowed."""
NONE_OF_THESE = "none of these"


@dataclass(frozen=True, slots=True)
class Call:
    """What is said of the spectrum.

    Attributes
    ----------
    status, text : the status and the call itself.
    credible_set : names that together reach the level, likeliest first.
    """

    status: Status
    text: str
    credible_set: tuple[str, ...]


def decide(ranked: Sequence[tuple[Chain, float]], posterior: Posterior, level: float) -> Call:
    """Make the call.

    Parameters
    ----------
    ranked : chains with their posteriors, likeliest first.
    posterior : all probabilities.
    level : probability the credible set has to reach.
    """
    members = credible_set(ranked, posterior.none_of_these, level)
    unbranched = sum(float(p) for chain, p in ranked if not chain.is_branched)
    if posterior.none_of_these > 1 - posterior.none_of_these:
        rival = max(posterior.rivals, key=lambda one: posterior.rivals[one])
        return Call(Status.NOT_A_CHAIN, rival.value, members)
    if unbranched >= SURE:
        return Call(Status.UNBRANCHED, _unbranched_text(ranked, level), members)
    if ranked[0][1] >= SURE:
        return Call(Status.ASSIGNED, systematic_name(ranked[0][0]), members)
    if len(members) <= NARROW and posterior.none_of_these <= TOLERATED_RIVALS:
        return Call(Status.NARROWED, f"one of {len(members)} structures", members)
    return Call(Status.OPEN, f"open: {len(members)} structures remain", members)


def credible_set(
    ranked: Sequence[tuple[Chain, float]], none_of_these: float, level: float
) -> tuple[str, ...]:
    """Return the fewest names that together reach the level; the rivals count as one.

    Where the listed chains run out before the level is reached, all of them are members.
    """
    options: list[tuple[float, Chain | None]] = [(p, chain) for chain, p in ranked]
    options.append((none_of_these, None))
    options.sort(key=lambda option: -option[0])
    names, reached = [], 0.0
    for probability, chain in options:
        names.append(NONE_OF_THESE if chain is None else systematic_name(chain))
        reached += probability
        if reached >= level:
            break
    return tuple(names)


def _unbranched_text(ranked: Sequence[tuple[Chain, float]], level: float) -> str:
    straight = [(chain, p) for chain, p in ranked if not chain.is_branched]
    total = sum(p for _, p in straight)
    kept, reached = [], 0.0
    for chain, p in straight:
        kept.append(chain.carbons)
        reached += p
        if reached >= level * total:
            break
    if len(kept) == 1:
        return systematic_name(straight[0][0])
    return f"n-alkane of {min(kept)} to {max(kept)} carbons"
