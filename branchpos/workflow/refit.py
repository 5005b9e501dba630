"""Fitting the shipped parameters again from reference spectra and retention indices."""

from __future__ import annotations

import csv
import json
from collections.abc import Mapping, Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from branchpos.end_group import ALKANE
from branchpos.errors import FormatError, InputError, SettingsError
from branchpos.predicting.classes import CLASS_RULES
from branchpos.predicting.ester_retention import ester_record_of, fit_ester_retention
from branchpos.predicting.parameters import parameters_to_record
from branchpos.predicting.retention_fit import fit_retention, read_index_rows, record_of
from branchpos.reading import read_spectrum
from branchpos.reference_data import load_reference, reference_path
from branchpos.scoring.error_model import errors_to_record
from branchpos.spectrum import Spectrum
from branchpos.workflow.class_refit import refit_classes, write_classes
from branchpos.workflow.model import CLASS_YIELDS_FILE
from branchpos.workflow.reference_spectra import (
    TRUTH_TABLE,
    KnownSpectrum,
    read_known_spectra,
)
from branchpos.workflow.yield_fit import YieldFit, fit_yields

YIELDS_FILE = "alkane_yields.json"
RETENTION_FILE = "retention.json"
ESTER_TABLE = "methyl_esters.csv"
"""Measured branched esters, looked for beside the table of measured alkanes."""
ESTER_COLUMN = "DB-5"
"""Column of the indices that esters are fitted to; more polar ones shift esters by tens of units."""
_FEWEST_STRAIGHT = 3
"""Straight-chain esters that a line with a scatter needs."""


def run_refit(
    folder: Path,
    retention: Path | None = None,
    out: Path | None = None,
    chain: Sequence[str] = ("alkane", *CLASS_RULES),
) -> list[Path]:
    """Fit the shipped parameters again and write them as reference sets.

    Parameters
    ----------
    folder : spectra of known chains with ``truth.csv``, see ``read_known_spectra``; a class with an end group
        that has no record there keeps its shipped model.
    retention : table of measured indices; without one the retention set is left alone. A table
        ``methyl_esters.csv`` beside it and straight-chain esters with an index in ``folder`` renew the part
        on esters; without them that part is kept as it is shipped.
    out : folder to write to; the reference sets of the checkout when not given.
    chain : classes to fit; the files of the others are left alone.

    Returns
    -------
    the files written.

    Raises
    ------
    SettingsError : no ``out`` was given and the program does not run from a checkout.
    InputError : the data cannot be read or hold nothing to fit to.
    """
    target = out if out is not None else _checkout_sets()
    if retention is not None and not retention.is_file():
        raise InputError("no table of retention indices", file=str(retention), remedy="check the path")
    rows = read_index_rows(retention) if retention is not None else None
    written = []
    if ALKANE.name in chain:
        fit = refit_yields(folder)
        written.append(_ready(target / YIELDS_FILE))
        write_yields(fit, written[-1])
    if headed := [name for name in chain if name in CLASS_RULES]:
        models = refit_classes(folder, headed, provenance_of)
        written.append(_ready(target / CLASS_YIELDS_FILE))
        write_classes(models, written[-1])
    if retention is not None and rows is not None:
        today = _today()
        alkanes = record_of(fit_retention(rows, today))
        record = {"alkanes": alkanes, "methyl esters": _ester_record(folder, retention, today)}
        written.append(_ready(target / RETENTION_FILE))
        written[-1].write_text(json.dumps(record) + "\n", encoding="utf-8")
    return written


def _ready(path: Path) -> Path:
    path.parent.mkdir(parents=True, exist_ok=True)
    return path


def _checkout_sets() -> Path:
    """Return the reference sets in use, provided that they lie in a checkout."""
    sets = reference_path(YIELDS_FILE).parent
    if not (sets.parent / "pyproject.toml").is_file():
        raise SettingsError(
            "the installed reference sets are not overwritten", remedy="say where to write with --out DIR"
        )
    return sets


def _ester_record(folder: Path, retention: Path, today: str) -> dict[str, Any]:
    branched_table = retention.with_name(ESTER_TABLE)
    straight, unread = _straight_esters(folder)
    if not branched_table.is_file() or len(straight) < _FEWEST_STRAIGHT:
        return dict(load_reference(RETENTION_FILE)["methyl esters"])
    record = ester_record_of(fit_ester_retention(_branched_esters(branched_table), straight), today)
    record["provenance"] |= {"straight": len(straight), "left_out": unread}
    return record


def _straight_esters(folder: Path) -> tuple[list[tuple[int, float]], list[str]]:
    """Return acid carbons and index of straight-chain methyl esters, and the records that cannot be read."""
    with (folder / TRUTH_TABLE).open(encoding="utf-8", newline="") as stream:
        rows = [row for row in csv.DictReader(stream) if row["chain_class"] == "methyl ester"]
    found, unread = [], []
    for row in rows:
        if row["methyl_positions"]:
            continue
        try:
            spectrum = read_spectrum(_record_path(folder, row["accession"]))
        except InputError as fault:
            unread.append(f"{row['accession']}: {fault.problem}")
            continue
        if spectrum.retention_index is not None and _column(spectrum) == ESTER_COLUMN:
            found.append((int(row["backbone_carbons"]), spectrum.retention_index))
    return found, unread


def _column(spectrum: Spectrum) -> str:
    return next((text for key, text in spectrum.metadata.items() if key.endswith("COLUMN_NAME")), "")


def _record_path(folder: Path, accession: str) -> Path:
    inside = folder / "chains" / f"{accession}.txt"
    return inside if inside.is_file() else folder / f"{accession}.txt"


def _branched_esters(path: Path) -> list[tuple[int, tuple[int, ...], float]]:
    """Read backbone, methyl positions and equivalent chain length of measured esters."""
    rows = []
    with path.open(encoding="utf-8", newline="") as stream:
        for number, record in enumerate(csv.DictReader(stream), start=2):
            try:
                positions = tuple(int(p) for p in record["methyl_positions"].split())
                length = float(record["equivalent_chain_length"])
                rows.append((int(record["backbone_carbons"]), positions, length))
            except (KeyError, ValueError, AttributeError) as problem:
                raise FormatError(
                    f"no equivalent chain length in this row ({problem})",
                    file=str(path),
                    place=f"line {number}",
                    remedy="give columns backbone_carbons, methyl_positions, equivalent_chain_length",
                ) from problem
    return rows


def refit_yields(folder: Path, *, leave_out: Sequence[str] = ()) -> YieldFit:
    """Fit yields and error scales to the known alkanes of a folder.

    Records flagged ``sparse`` take no part: what they leave out says nothing of yields.

    Parameters
    ----------
    folder : holds ``truth.csv`` and the records, see ``read_known_spectra``.
    leave_out : accessions that must take no part, for checks on data the fit has not seen.

    Raises
    ------
    InputError : no usable record is left, or the folder cannot be read.
    """
    known = [
        one for one in read_known_spectra(folder) if not one.is_sparse and one.accession not in set(leave_out)
    ]
    if not any(one.chain.is_branched for one in known):
        raise InputError(
            "no usable record of a branched alkane", file=str(folder), remedy="add records to the folder"
        )
    return fit_yields(known, provenance_of(known, leave_out))


def provenance_of(known: Sequence[KnownSpectrum], leave_out: Sequence[str] = ()) -> Mapping[str, str]:
    """Say where fitted parameters come from: the records, the day, the command."""
    return {
        "command": "branchpos refit DIR",
        "data": "electron ionisation spectra of the public MassBank collection",
        "accessions": " ".join(sorted(one.accession for one in known)),
        "left_out": " ".join(sorted(leave_out)),
        "fitted": _today(),
        "unit": "natural logarithm of relative rates, survivals and ratios",
    }


def _today() -> str:
    return datetime.now(UTC).date().isoformat()


def write_yields(fit: YieldFit, path: Path) -> None:
    """Write a fit as the reference set that ``locate`` reads."""
    record = {**parameters_to_record(fit.parameters), "errors": dict(errors_to_record(fit.errors))}
    path.write_text(_compact(json.dumps(record, indent=1)), encoding="utf-8")


def _compact(text: str) -> str:
    """Put each row of the covariance on one line, so that the file can be read and compared."""
    head, mark, tail = text.partition('"covariance": [')
    body, end, rest = tail.partition("\n ],")
    rows = body.replace("\n   ", " ").replace("\n  ]", "]")
    return head + mark + rows + end + rest + "\n"
