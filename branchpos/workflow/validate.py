"""Scoring the program on spectra of known structure, each by a model that has not seen its compound."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

from branchpos.chain import Chain
from branchpos.errors import InputError
from branchpos.predicting.retention_fit import (
    IndexRow,
    cross_validate_retention,
    fit_retention,
    read_index_rows,
)
from branchpos.reporting.validation import validation_text
from branchpos.reporting.validation_figure import draw_validation
from branchpos.workflow.false_claims import other_records, score_others
from branchpos.workflow.held_out import settle, shipped_start, usable
from branchpos.workflow.known_scores import IndexKnowledge, compare_starts, score_compound
from branchpos.workflow.reference_spectra import KnownSpectrum, read_known_spectra
from branchpos.workflow.validation_record import Findings, Sources, validation_record
from branchpos.workflow.work_pool import count_done, open_pool
from branchpos.workflow.yield_fit import YieldFit

Progress = Callable[[int, int], None]
"""Called with how many pieces of work are done, and how many there are."""

RECORD_FILE, TEXT_FILE, FIGURE_FILE = "validation.json", "validation.md", "validation.svg"
_OTHERS_AT_ONCE = 20


def run_validate(
    folder: Path,
    retention: Path | None,
    out: Path,
    progress: Progress | None = None,
    *,
    workers: int | None = None,
) -> Path:
    """Score the program on the known alkanes of a folder and write what came out.

    Every compound is scored by a model fitted without any of its records; spectra of other compounds in
    ``folder/others`` are scored by the fit to all known ones. Processes are started afresh, so a script that
    calls this with more than one worker needs ``if __name__ == "__main__"``.

    Parameters
    ----------
    folder : holds ``truth.csv`` and the records, see ``read_known_spectra``; ``others`` inside it is used
        where it is there.
    retention : table of measured indices, for the section on retention and for verdicts with an index.
    out : folder for ``validation.json``, ``validation.md`` and ``validation.svg``.
    progress : told how far the work is.
    workers : processes to use; as many as there are processors when not given.

    Returns
    -------
    path of ``validation.json`` (format ``branchpos.validation/1``).

    Raises
    ------
    InputError : the data cannot be read, or hold fewer than two compounds.
    OverlapError : a record took part in the fit of the model that was to score it.
    """
    known = read_known_spectra(folder)
    chains = _compounds(known, folder)
    rows = _index_rows(retention)
    full = settle(usable(known), shipped_start()).fit
    indices = IndexKnowledge(rows, fit_retention(rows)) if rows else IndexKnowledge()
    found = _score_all(folder, chains, full, indices, workers, progress or _say_nothing)
    out.mkdir(parents=True, exist_ok=True)
    record = validation_record(Sources(folder, retention, known), full, found)
    return _write(record, out)


def _say_nothing(done: int, total: int) -> None:
    del done, total


def _compounds(known: Sequence[KnownSpectrum], folder: Path) -> list[Chain]:
    """Return the different chains, branched ones first: their fits take longest."""
    chains = sorted({one.chain for one in known}, key=lambda c: (not c.is_branched, c.backbone, c.methyls))
    if len({one.chain for one in usable(known)}) < 2:
        raise InputError(
            "leaving one compound out leaves nothing to fit to",
            file=str(folder),
            remedy="give spectra of at least two compounds with enough peaks",
        )
    return chains


def _index_rows(retention: Path | None) -> tuple[IndexRow, ...]:
    if retention is None:
        return ()
    if not retention.is_file():
        raise InputError("no table of retention indices", file=str(retention), remedy="check the path")
    return tuple(read_index_rows(retention))


def _score_all(
    folder: Path,
    chains: Sequence[Chain],
    full: YieldFit,
    indices: IndexKnowledge,
    workers: int | None,
    tell: Progress,
) -> Findings:
    """Do all work that can be done side by side, the longest first."""
    paths = other_records(folder)
    parts = [paths[at : at + _OTHERS_AT_ONCE] for at in range(0, len(paths), _OTHERS_AT_ONCE)]
    with open_pool(workers) as pool:
        left_out = [pool.submit(cross_validate_retention, indices.rows)] if indices.rows else []
        starts = [pool.submit(compare_starts, folder, chain, full) for chain in _longest_straight(chains)]
        compounds = [pool.submit(score_compound, folder, chain, full, indices) for chain in chains]
        others = [pool.submit(score_others, part, full) for part in parts]
        count_done([*left_out, *starts, *compounds, *others], tell)
        return Findings(
            compounds=[one.result() for one in compounds],
            others=[score for one in others for score in one.result()],
            retention=next((one.result() for one in left_out), None),
            starts=[one.result() for one in starts],
        )


def _longest_straight(chains: Sequence[Chain]) -> list[Chain]:
    """Return the compound on which the start of the fit is checked."""
    return [chain for chain in chains if not chain.is_branched][-1:]


def _write(record: Mapping[str, Any], out: Path) -> Path:
    path = out / RECORD_FILE
    path.write_text(json.dumps(record, indent=1, ensure_ascii=False) + "\n", encoding="utf-8")
    (out / TEXT_FILE).write_text(validation_text(record), encoding="utf-8")
    draw_validation(record, out / FIGURE_FILE)
    return path
