"""Spectra of known chains: a folder of records with a table of the truth."""

from __future__ import annotations

import csv
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.errors import FormatError, InputError
from branchpos.reading import read_spectrum
from branchpos.spectrum import Spectrum

TRUTH_TABLE = "truth.csv"
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
    folder ``chains`` as ``accession.txt``.

    Raises
    ------
    InputError : the table is missing or lacks a column, or a record cannot be read.
    """
    wanted = set(chain_classes)
    return [
        KnownSpectrum(
            row["accession"],
            Chain(
                int(row["backbone_carbons"]),
                tuple(int(p) for p in row["methyl_positions"].split()),
                END_GROUPS[row["chain_class"]],
            ),
            row.get("quality") or "ok",
            read_spectrum(_record_path(folder, row["accession"])),
        )
        for row in _truth_rows(folder / TRUTH_TABLE)
        if row["chain_class"] in wanted
    ]


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
