"""What is said of spectra that come from no chain: every claim of one is a false one."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from branchpos.errors import InputError
from branchpos.reading import read_spectrum
from branchpos.verdict import Status
from branchpos.workflow.held_out import model_of, refuse_overlap
from branchpos.workflow.locate import locate_branches
from branchpos.workflow.model import Model
from branchpos.workflow.record_scores import ALKANES
from branchpos.workflow.yield_fit import YieldFit

OTHERS = "others"
CLAIMS = (Status.ASSIGNED.value, Status.NARROWED.value, Status.UNBRANCHED.value)
"""Statuses that claim something; the others leave the matter open or deny a chain."""


@dataclass(frozen=True, slots=True)
class OtherScore:
    """What was said of one spectrum of another compound.

    Attributes
    ----------
    accession, title, formula : the record's name, title and formula.
    status, call, first, first_posterior, set_size, none_of_these : as in ``TruthScore``.
    warnings : doubts about the data.
    fault : why there is no verdict, empty where there is one.
    """

    accession: str
    title: str
    formula: str
    status: str
    call: str
    first: str
    first_posterior: float
    set_size: int
    none_of_these: float
    warnings: tuple[str, ...]
    fault: str = ""


def other_records(folder: Path) -> list[Path]:
    """Return the records of other compounds in ``folder/others``, by name; none where there is no folder."""
    return sorted((folder / OTHERS).glob("*.txt"))


def score_others(paths: Sequence[Path], fit: YieldFit) -> list[OtherScore]:
    """Run ``locate_branches`` on each; a record that cannot be judged comes back with its fault."""
    model = model_of(fit)
    return [_score(path, model) for path in paths]


def _score(path: Path, model: Model) -> OtherScore:
    refuse_overlap([path.stem], model)
    try:
        spectrum = read_spectrum(path)
        verdict = locate_branches(spectrum, ALKANES, model=model)
    except InputError as fault:
        return OtherScore(path.stem, "", "", "not judged", "", "", 0.0, 0, 0.0, (), fault.problem)
    return OtherScore(
        accession=path.stem,
        title=_first_of(spectrum.metadata.get("CH$NAME", "")) or verdict.title,
        formula=spectrum.metadata.get("CH$FORMULA", ""),
        status=verdict.status.value,
        call=verdict.call,
        first=verdict.hypotheses[0].name,
        first_posterior=verdict.hypotheses[0].posterior,
        set_size=len(verdict.credible_set),
        none_of_these=verdict.none_of_these,
        warnings=verdict.warnings,
    )


def _first_of(names: str) -> str:
    return names.partition("; ")[0].strip()
