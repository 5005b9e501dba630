"""``branchpos refit``, ``validate`` and ``demo``: the program on spectra of known structure."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import click

from branchpos.cli.failures import not_writable
from branchpos.cli.options import chain_classes, json_option, quiet_option

_FOLDER = click.Path(path_type=Path, exists=True, file_okay=False)
_FILE = click.Path(path_type=Path, exists=True, dir_okay=False)
_NEW = click.Path(path_type=Path, file_okay=False)


@click.command()
@click.argument("folder", metavar="DIR", type=_FOLDER)
@click.option("--retention", type=_FILE, metavar="FILE", help="Measured retention indices to fit as well.")
@click.option("--out", type=_NEW, metavar="DIR", help="Where to write the fits [the shipped reference sets].")
@click.option("--chain", metavar="CLASS,...", help="Chain classes to fit [all].")
@quiet_option
def refit(folder: Path, retention: Path | None, out: Path | None, chain: str | None, quiet: bool) -> None:
    """Fit yield and retention parameters again.

    DIR holds reference spectra and their truth.csv.
    """
    from branchpos.workflow.refit import run_refit

    try:
        written = run_refit(folder, retention, out, *([chain_classes(chain)] if chain else []))
    except OSError as problem:
        raise not_writable(problem.filename or folder, problem) from problem
    _tell(written, quiet)


@click.command()
@click.argument("folder", metavar="DIR", type=_FOLDER)
@click.option("--retention", type=_FILE, metavar="FILE", help="Measured retention indices to check as well.")
@json_option
@click.option(
    "--out",
    type=_NEW,
    default=Path("branchpos-validation"),
    metavar="DIR",
    help="Where the report goes [branchpos-validation].",
)
@quiet_option
def validate(folder: Path, retention: Path | None, json_path: str | None, out: Path, quiet: bool) -> None:
    """Score the program on spectra of known structure.

    Accuracy, coverage, reliability and false claims, each compound left out of the fit that judges it. DIR
    holds the spectra and their truth.csv.
    """
    from branchpos.workflow.validate import run_validate

    try:
        with _progress("validating") as step:
            found = run_validate(folder, retention, out, step)
        _copy(found, json_path)
    except OSError as problem:
        raise not_writable(problem.filename or out, problem) from problem
    _tell([found], quiet or json_path == "-")


@click.command()
@click.option(
    "--out",
    type=_NEW,
    default=Path("branchpos-demo"),
    metavar="DIR",
    help="Where the study goes [branchpos-demo].",
)
@quiet_option
def demo(out: Path, quiet: bool) -> None:
    """Make an invented study, end to end, offline.

    The data are invented, and say so.
    """
    from branchpos.workflow.demo import run_demo

    try:
        written = run_demo(out, (lambda _line: None) if quiet else click.echo)
    except OSError as problem:
        raise not_writable(problem.filename or out, problem) from problem
    _tell(written, quiet)


def _copy(found: Path, json_path: str | None) -> None:
    """Give the JSON that was written also where the user asked for it."""
    if json_path == "-":
        click.echo(found.read_text(encoding="utf-8"), nl=False)
    elif json_path is not None and Path(json_path).resolve() != found.resolve():
        Path(json_path).write_text(found.read_text(encoding="utf-8"), encoding="utf-8")


def _tell(written: list[Path], quiet: bool) -> None:
    if quiet:
        return
    for path in written:
        click.echo(f"wrote {path}")


@contextmanager
def _progress(label: str) -> Iterator[Callable[[int, int], None]]:
    """Give a bar on standard error where that is a terminal."""
    import sys

    if not sys.stderr.isatty():
        yield lambda _done, _total: None
        return
    from rich.console import Console
    from rich.progress import Progress

    with Progress(console=Console(stderr=True), transient=True, redirect_stdout=False) as bar:
        task = bar.add_task(label, total=None)
        yield lambda done, total: bar.update(task, completed=done, total=total)
