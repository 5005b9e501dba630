"""Fitting the shipped parameters again from reference spectra and retention indices."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from datetime import UTC, datetime
from pathlib import Path

from branchpos.errors import InputError
from branchpos.predicting.parameters import parameters_to_record
from branchpos.scoring.error_model import errors_to_record
from branchpos.workflow.reference_spectra import KnownSpectrum, read_known_spectra
from branchpos.workflow.yield_fit import YieldFit, fit_yields

YIELDS_FILE = "alkane_yields.json"
RETENTION_FILE = "retention.json"


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
        "fitted": datetime.now(UTC).date().isoformat(),
        "unit": "natural logarithm of relative rates, survivals and ratios",
    }


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
