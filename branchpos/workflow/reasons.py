"""Why a verdict is what it is, in words."""

from __future__ import annotations

from collections.abc import Sequence

from branchpos.deciding.call import Call
from branchpos.evidence import IonEvidence
from branchpos.naming import systematic_name
from branchpos.verdict import RankedHypothesis, Status

_NAMED_IONS = 4
_LEAST_BITS = 0.5


def reasons(call: Call, ranked: Sequence[RankedHypothesis], none_of_these: float) -> tuple[str, ...]:
    """Return the reasons, most important first."""
    if call.status is Status.NOT_A_CHAIN:
        return (f"none of the chains asked for explains the spectrum as well as {call.text} would",)
    lines = [_size_line(ranked[0])]
    if len(ranked) > 1 and ranked[0].shares is not None:
        lines.append(_contrast_line(ranked[0], ranked[1]))
        lines += _prior_line(ranked[0], ranked[1])
    if call.status in (Status.NARROWED, Status.OPEN):
        lines.append(_remaining_line(call, none_of_these))
    if ranked[0].chain.is_branched and call.status is not Status.UNBRANCHED:
        lines.append("electron ionisation does not show stereochemistry")
    return tuple(lines)


def _size_line(best: RankedHypothesis) -> str:
    mass = best.chain.formula.nominal_mass
    if not best.ions:
        return "no structure explains the spectrum well enough to weigh its ions"
    molecular = next((ion for ion in best.ions if ion.mz == mass), None)
    if molecular is None:
        return f"the molecular ion m/z {mass} lies outside the recorded range"
    if molecular.observed is None:
        return f"no molecular ion at m/z {mass}: the size rests on the fragments"
    return f"molecular ion at m/z {mass} ({100 * molecular.observed:.2g} %)"


def _contrast_line(best: RankedHypothesis, second: RankedHypothesis) -> str:
    total = best.shares.total if best.shares else 0.0
    name = systematic_name(second.chain)
    leading = sorted(best.ions, key=lambda ion: -abs(ion.weight_of_evidence))[:_NAMED_IONS]
    named = [_ion_words(ion) for ion in leading if abs(ion.weight_of_evidence) >= _LEAST_BITS]
    if not named:
        return f"no ion parts it from {name} by more than {_LEAST_BITS:g} bits"
    return f"{total:+.1f} bits against {name}, most by " + "; ".join(named)


def _ion_words(ion: IonEvidence) -> str:
    observed = "absent" if ion.observed is None else f"{100 * ion.observed:.2g} %"
    return f"m/z {ion.mz} ({observed}, expected {100 * ion.expected:.2g} %, {ion.weight_of_evidence:+.1f})"


def _prior_line(best: RankedHypothesis, second: RankedHypothesis) -> list[str]:
    """Say so where the prior alone decides between the two leading structures."""
    if best.shares is None or best.shares.total - best.shares.prior > 0:
        return []
    return [f"the prior alone decides against {systematic_name(second.chain)}: the data favour it"]


def _remaining_line(call: Call, none_of_these: float) -> str:
    shown = ", ".join(call.credible_set[:6]) + (" ..." if len(call.credible_set) > 6 else "")
    return f"not decided between {shown} (none of these: {none_of_these:.2g})"
