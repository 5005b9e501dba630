"""Spectra of known chains: a folder of records with a table of the truth."""

from __future__ import annotations

import csv
import re
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.errors import FormatError, InputError
from branchpos.reading import read_file
from branchpos.spectrum import Spectrum

TRUTH_TABLE = "truth.csv"
_TRIMETHYLSILYL = re.compile(r"\bTMS\b")
"""In the title of a record, the mark of a trimethylsilyl derivative (MassBank usage)."""
_COLUMNS = ("accession", "chain_class", "backbone_carbons", "methyl_positions")


@dataclass(frozen=True, slots=True, eq=False)
class KnownSpectrum:
    """One spectrum with the chain it was recorded from.

    Attributes
    ----------
    accession : name of the record.
    chain : its structure.
    quality : what the table says of the record, ``ok`` or faults.
    spectrum : the record as read.
    """

    accession: str
    chain: Chain
    quality: str
    spectrum: Spectrum

    @property
    def is_sparse(self) -> bool:
        """True where the table says that the record keeps too few peaks."""
        return "sparse" in self.quality


def read_known_spectra(folder: Path, chain_classes: Iterable[str] = ("alkane",)) -> list[KnownSpectrum]:
    """Read the records of ``folder/truth.csv`` that belong to the asked chain classes.

    The table has the columns accession, chain_class, backbone_carbons, methyl_positions (positions parted by
    spaces, empty for an unbranched chain) and optionally quality; the records lie in the folder or in its
    folder ``chains`` as ``accession.txt``. Rows of other classes, and records without peaks, are passed over.

    Raises
    ------
    InputError : the table is missing or lacks a column, or a record cannot be read.
    """
    wanted = set(chain_classes)
    known = [
        _known(row, reading.spectra[0])
        for row in _truth_rows(folder / TRUTH_TABLE)
        if row["chain_class"] in END_GROUPS
        and (reading := read_file(_record_path(folder, row["accession"]))).spectra
    ]
    return [one for one in known if one.chain.end_group.name in wanted]


def _known(row: dict[str, str], spectrum: Spectrum) -> KnownSpectrum:
    """Join a row and its record; an acid recorded as its trimethylsilyl derivative is taken as the ester."""
    chain_class = row["chain_class"]
    if chain_class == "acid" and _TRIMETHYLSILYL.search(spectrum.title):
        chain_class = "trimethylsilyl ester"
    methyls = tuple(int(p) for p in row["methyl_positions"].split())
    chain = Chain(int(row["backbone_carbons"]), methyls, END_GROUPS[chain_class])
    return KnownSpectrum(row["accession"], chain, row.get("quality") or "ok", spectrum)


def _truth_rows(path: Path) -> list[dict[str, str]]:
    if not path.is_file():
        raise InputError(
            "no table of known structures", file=str(path), remedy=f"give a folder that holds {TRUTH_TABLE}"
        )
    with path.open(encoding="utf-8", newline="") as stream:
        reader = csv.DictReader(stream)
        missing = [column for column in _COLUMNS if column not in (reader.fieldnames or ())]
        if missing:
            raise FormatError(
                f"the column {missing[0]} is missing", file=str(path), place="line 1",
                remedy="name the columns " + ", ".join(_COLUMNS),
            )  # fmt: skip
        return list(reader)


def _record_path(folder: Path, accession: str) -> Path:
    for place in (folder / "chains", folder):
        path = place / f"{accession}.txt"
        if path.is_file():
            return path
    raise InputError(
        f"no record {accession}.txt", file=str(folder / TRUTH_TABLE), remedy="add the record or drop its row"
    )
