"""One spectrum in, a verdict out."""

from __future__ import annotations

from branchpos.cleaning.nominal import to_channels
from branchpos.deciding.call import decide
from branchpos.deciding.posterior import normalise
from branchpos.enumerating import PRIORS
from branchpos.retention_index import RetentionIndex
from branchpos.spectrum import Spectrum
from branchpos.verdict import Verdict
from branchpos.workflow.candidates import choose_sizes, heaviest_mass, left_out, screen_candidates
from branchpos.workflow.method import Method
from branchpos.workflow.model import Model, shipped_model
from branchpos.workflow.reasons import reasons
from branchpos.workflow.recordings import judge_quality
from branchpos.workflow.scores import score_candidates, score_rivals
from branchpos.workflow.weighing import chain_at, describe, rank


def locate_branches(
    spectrum: Spectrum,
    method: Method | None = None,
    retention_index: RetentionIndex | None = None,
    *,
    model: Model | None = None,
    everything: bool = False,
) -> Verdict:
    """Say where the methyl branches of the compound behind a spectrum sit, and how sure that is.

    Parameters
    ----------
    spectrum : the electron ionisation spectrum.
    method : settings; the defaults when not given.
    retention_index : the measured index with its standard deviation [units].
    model : a fitted model; the shipped one when not given.
    everything : list every hypothesis, not only the leading ones.

    Raises
    ------
    SettingsError : no chain fits the settings.
    """
    method, model = method or Method(), model or shipped_model()
    channels, doubts = to_channels(spectrum)
    sizes = choose_sizes(channels, method, model)
    groups = screen_candidates(channels, sizes, method, model)
    recordings = judge_quality(channels, groups, heaviest_mass(sizes, channels), model)
    scored = score_candidates(recordings, groups, retention_index, method, model)
    rivals = score_rivals(recordings, groups, retention_index)
    posterior = normalise([one.log_joint for one in scored], rivals)
    places = rank(scored, posterior, everything)
    ranked = describe(scored, places, channels)
    call = decide([(chain_at(scored, place), place.posterior) for place in places], posterior, method.level)
    return Verdict(
        source=spectrum.source,
        title=spectrum.title,
        status=call.status,
        call=call.text,
        hypotheses=ranked,
        considered=sum(len(one.batch) for one in scored),
        none_of_these=posterior.none_of_these,
        rivals=tuple((rival.value, p) for rival, p in posterior.rivals.items()),
        level=method.level,
        credible_set=call.credible_set,
        prior=str(PRIORS[method.prior]),
        reasons=reasons(call, ranked, posterior.none_of_these),
        warnings=(*spectrum.warnings, *doubts, *left_out(groups), *method.caution()),
    )
