"""The listing of isomers, streamed line by line: on the console, and as JSON."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

from branchpos import __version__
from branchpos.isomer import Difference, Isomer
from branchpos.naming import shorthand, systematic_name
from branchpos.reporting.numbers import percent_text, significant
from branchpos.reporting.records import Record, chain_record, retention_record, smiles_or_none
from branchpos.reporting.text_table import line_of

ISOMERS_FORMAT = "branchpos.isomers/1"
_SHORTHAND_WIDTH, _INDEX_WIDTH = 22, 14


@dataclass(frozen=True, slots=True)
class Listing:
    """What is listed.

    Attributes
    ----------
    chain_class, carbons, methyls : as asked for.
    count : how many structures there are.
    compared : whether each comes with its nearest isomer.
    """

    chain_class: str
    carbons: int
    methyls: Sequence[int]
    count: int
    compared: bool


def listing_lines(listing: Listing, isomers: Iterable[Isomer], with_smiles: bool = False) -> Iterator[str]:
    """Yield the lines of the listing; columns have fixed widths, so that nothing has to be kept."""
    # Numerals never add more than the longest name of the class; a longer name shifts its own line only.
    width = 24 + 6 * max(listing.methyls, default=0) + 6
    columns = ["name", "shorthand", "index", *(["SMILES"] if with_smiles else [])]
    widths = [width, _SHORTHAND_WIDTH, _INDEX_WIDTH, *([0] if with_smiles else [])]
    if listing.compared:
        columns, widths = [*columns, "hardest to tell from; what would"], [*widths, 0]
    yield _heading(listing)
    yield line_of(columns, widths, frozenset((2,)))
    for one in isomers:
        index = f"{one.retention_index.value:.1f} +-{1.96 * one.retention_index.sd:.1f}"
        row = [systematic_name(one.chain), shorthand(one.chain), index]
        row += [smiles_or_none(one.chain) or ""] if with_smiles else []
        row += [_difference_words(one.nearest)] if listing.compared else []
        yield line_of(row, widths, frozenset((2,)))


def listing_json(listing: Listing, isomers: Iterable[Isomer]) -> Iterator[str]:
    """Yield the text of the JSON document piece by piece."""
    head = {
        "format": ISOMERS_FORMAT,
        "program": __version__,
        "chain_class": listing.chain_class,
        "carbons": listing.carbons,
        "methyls": list(listing.methyls),
        "count": listing.count,
        "compared": listing.compared,
    }
    yield json.dumps(head, indent=1)[:-2] + ',\n "results": ['
    separator = "\n  "
    for one in isomers:
        yield separator + json.dumps(isomer_record(one), ensure_ascii=False)
        separator = ",\n  "
    yield "\n ]\n}\n"


def isomer_record(one: Isomer) -> Record:
    """Return one structure with its nearest isomer."""
    return {
        **chain_record(one.chain),
        "retention_index": retention_record(one.retention_index),
        "nearest": None if one.nearest is None else _difference_record(one.nearest),
    }


def _heading(listing: Listing) -> str:
    methyls = ", ".join(str(number) for number in listing.methyls)
    text = f"{listing.count} structures of {listing.carbons} carbons with {methyls} methyls"
    if listing.compared:
        return text
    return f"{text}; too many to say what would tell each apart: names and indices only"


def _difference_words(nearest: Difference | None) -> str:
    if nearest is None:
        return ""
    ions = ", ".join(
        f"m/z {ion.mz} ({percent_text(ion.expected)} against {percent_text(ion.expected_of_nearest)} %)"
        for ion in nearest.ions
    )
    parts = [f"{shorthand(nearest.chain)} ({nearest.bits:.1f} bits): {ions}"]
    return "; ".join([*parts, f"index {nearest.index_difference:+.1f}"])


def _difference_record(nearest: Difference) -> Record:
    return {
        "name": systematic_name(nearest.chain),
        "shorthand": shorthand(nearest.chain),
        "bits": significant(nearest.bits, 4),
        "index_bits": significant(nearest.index_bits, 4),
        "index_difference": round(nearest.index_difference, 2),
        "ions": [
            {
                "mz": ion.mz,
                "expected": significant(ion.expected, 4),
                "expected_of_nearest": significant(ion.expected_of_nearest, 4),
                "bits": significant(ion.bits, 4),
            }
            for ion in nearest.ions
        ],
    }
