"""``branchpos isomers``: every structure once."""

from __future__ import annotations

from collections.abc import Iterable
from contextlib import nullcontext
from pathlib import Path

import click

from branchpos.cli.failures import not_writable
from branchpos.cli.options import chain_classes, json_option, quiet_option
from branchpos.errors import SettingsError


@click.command()
@click.option("--carbons", required=True, type=int, metavar="N", help="Carbons, branches included.")
@click.option("--methyls", required=True, metavar="N or N-M", help="Numbers of methyl branches.")
@click.option("--chain", default="alkane", metavar="CLASS", help="Chain class [alkane].")
@click.option("--smiles", is_flag=True, help="Add line notation to the table.")
@json_option
@quiet_option
def isomers(carbons: int, methyls: str, chain: str, smiles: bool, json_path: str | None, quiet: bool) -> None:
    """List every structure once, with names, retention index and what would tell it apart."""
    from branchpos.reporting.isomer_listing import Listing, listing_json, listing_lines
    from branchpos.workflow.isomers import MOST_COMPARED, count_isomers, list_isomers
    from branchpos.workflow.method import parse_range

    numbers = parse_range(methyls, "methyls")
    chain_class = _one_class(chain)
    stream = list_isomers(carbons, numbers, chain_class)
    count = count_isomers(carbons, numbers)
    listing = Listing(chain_class, carbons, tuple(numbers), count, count <= MOST_COMPARED)
    if json_path is not None:
        _write(listing_json(listing, stream), json_path)
        stream = list_isomers(carbons, numbers, chain_class)
    if json_path != "-" and not quiet:
        for line in listing_lines(listing, stream, smiles):
            click.echo(line)


def _one_class(chain: str) -> str:
    names = chain_classes(chain)
    if len(names) != 1:
        raise SettingsError(f"chain {chain!r} names {len(names)} classes", remedy="give one")
    return names[0]


def _write(pieces: Iterable[str], path: str) -> None:
    try:
        with nullcontext() if path == "-" else Path(path).open("w", encoding="utf-8") as stream:
            for piece in pieces:
                click.echo(piece, file=stream, nl=False)
    except BrokenPipeError:
        raise
    except OSError as problem:
        raise not_writable(path, problem) from problem
