"""``branchpos locate``: from spectra to ranked branch positions."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import click

from branchpos.cli.failures import Failures, not_writable
from branchpos.cli.options import (
    Asked,
    figure_option,
    json_option,
    method_options,
    numbered,
    quiet_option,
)
from branchpos.errors import BranchposError, InputError

if TYPE_CHECKING:
    from branchpos.retention_index import RetentionIndex
    from branchpos.spectrum import Spectrum
    from branchpos.verdict import Verdict
    from branchpos.workflow.method import Method

_MANY = 5
"""Files from which progress is worth a bar."""


@click.command()
@click.argument("files", nargs=-1, required=True, metavar="FILE...")
@method_options
@click.option("--index", type=float, metavar="RI", help="Measured retention index (one spectrum only).")
@click.option("--index-sd", type=float, metavar="SD", help="Its standard deviation [1].")
@json_option
@figure_option
@click.option("--all", "everything", is_flag=True, help="List every hypothesis, not only the leading ones.")
@quiet_option
def locate(
    files: tuple[str, ...],
    asked: Asked,
    index: float | None,
    index_sd: float | None,
    json_path: str | None,
    figure: str | None,
    everything: bool,
    quiet: bool,
) -> None:
    """Place the branches behind one spectrum or many.

    Gives ranked structures with probabilities, the credible set, and the ions that decide. Reads MassBank
    records, JCAMP-DX, peak lists and text with keys, each also compressed with gzip.
    """
    method = asked.to_method()
    measured = _measured(index, index_sd, files)
    run = _Run(method, measured, figure, everything, len(files) > 1, json_path is not None)
    show = _printer(quiet or json_path == "-", everything)
    with _progress(files, shown=show is not None) as step:
        for file in files:
            run.take(file, show)
            step()
    if json_path is not None:
        _write_json(json_path, run.records, method.prior)
    run.failures.finish()


@dataclass(slots=True)
class _Run:
    """What one call of the command keeps while it goes through the files."""

    method: Method
    measured: RetentionIndex | None
    figure: str | None
    everything: bool
    several: bool
    keeps_records: bool
    records: list[dict[str, Any]] = field(default_factory=list)
    failures: Failures = field(default_factory=Failures)
    done: int = 0

    def take(self, file: str, show: Callable[[Verdict], None] | None) -> None:
        """Read one file and give a verdict on each of its spectra."""
        from branchpos.workflow.intake import take_in

        items = list(take_in(file))
        self.several = self.several or len(items) > 1
        if self.measured is not None and self.several:
            raise click.UsageError(
                f"--index holds for one spectrum, and {file} holds {len(items)}; split the file"
            )
        for item in items:
            try:
                self._judge(item, show)
            except BranchposError as problem:
                located = problem.located(file=file) if isinstance(problem, InputError) else problem
                self.failures.add(located)

    def _judge(self, item: Spectrum | InputError, show: Callable[[Verdict], None] | None) -> None:
        from branchpos.reporting.records import verdict_record
        from branchpos.workflow.locate import locate_branches

        if isinstance(item, InputError):
            raise item
        verdict = locate_branches(item, self.method, self.measured, everything=self.everything)
        self.done += 1
        if self.keeps_records:
            self.records.append(verdict_record(verdict))
        if show is not None:
            show(verdict)
        if self.figure is not None:
            self._draw(self.figure, item, verdict)

    def _draw(self, path: str, spectrum: Spectrum, verdict: Verdict) -> None:
        from branchpos.reporting.figures import save_figure, verdict_figure
        from branchpos.workflow.picture import picture_of

        target = numbered(path, self.done, self.several)
        try:
            save_figure(verdict_figure(picture_of(spectrum, verdict), spectrum), target)
        except OSError as problem:
            raise not_writable(target, problem) from problem


def _measured(index: float | None, sd: float | None, files: tuple[str, ...]) -> RetentionIndex | None:
    if index is None:
        if sd is not None:
            raise click.UsageError("--index-sd needs --index; give both, or leave both out")
        return None
    if len(files) > 1:
        raise click.UsageError(
            f"--index holds for one spectrum, not for {len(files)} files; call locate once for each file"
        )
    from branchpos.retention_index import RetentionIndex

    return RetentionIndex(index, sd=1.0 if sd is None else sd)


def _printer(silent: bool, everything: bool) -> Callable[[Verdict], None] | None:
    if silent:
        return None
    from branchpos.reporting.console import show_verdict

    return lambda verdict: show_verdict(verdict, everything)


@contextmanager
def _progress(files: tuple[str, ...], shown: bool) -> Iterator[Callable[[], None]]:
    """Give a bar on standard error for many files; where results run by on the terminal, they are the bar."""
    import sys

    crowded = shown and sys.stdout.isatty()
    if len(files) < _MANY or not sys.stderr.isatty() or crowded:
        yield lambda: None
        return
    from rich.console import Console
    from rich.progress import Progress

    with Progress(console=Console(stderr=True), transient=True, redirect_stdout=False) as bar:
        task = bar.add_task("locating", total=len(files))
        yield lambda: bar.advance(task)


def _write_json(path: str, records: list[dict[str, Any]], prior: str) -> None:
    from branchpos.reporting.records import locate_document, write_document

    try:
        write_document(locate_document(records, prior), path)
    except OSError as problem:
        raise not_writable(path, problem) from problem
