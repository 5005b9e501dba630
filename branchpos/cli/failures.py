"""What goes wrong, as one line each on standard error, and the exit status that follows."""

from __future__ import annotations

from pathlib import Path
from typing import IO, Any

import click

from branchpos.errors import BranchposError, InputError, SettingsError

SOME_FAILED, BAD_USE = 1, 2


class Stop(click.ClickException):
    """Ends the program with one line on standard error."""

    exit_code = SOME_FAILED

    def show(self, file: IO[Any] | None = None) -> None:
        """Print the line."""
        _say(self.message)


class BadUse(Stop):
    """Ends the program likewise where it was called in a wrong way."""

    exit_code = BAD_USE


class Program(click.Group):
    """The group of all commands: errors raised on purpose end as one line, never as a traceback."""

    def make_context(
        self, info_name: str | None, args: list[str], parent: click.Context | None = None, **extra: Any
    ) -> click.Context:
        """Read the program's own options and translate their errors."""
        try:
            return super().make_context(info_name, args, parent, **extra)
        except click.UsageError as problem:
            raise _one_line(problem) from problem

    def invoke(self, ctx: click.Context) -> Any:
        """Run a command and translate its errors."""
        try:
            return super().invoke(ctx)
        except click.UsageError as problem:
            raise _one_line(problem) from problem
        except SettingsError as problem:
            raise BadUse(str(problem)) from problem
        except BranchposError as problem:
            raise Stop(str(problem)) from problem


def _one_line(problem: click.UsageError) -> click.ClickException:
    """Return a usage error as one line that says where help is; a bare call shows the help itself."""
    if isinstance(problem, click.exceptions.NoArgsIsHelpError):
        return problem
    command = problem.ctx.command_path if problem.ctx else "branchpos"
    return BadUse(f"{problem.format_message().rstrip('.')}; see {command} --help")


class Failures:
    """Failures of single inputs, told as they come; the others go on."""

    def __init__(self) -> None:
        self._found: list[BranchposError] = []

    def add(self, problem: BranchposError) -> None:
        """Tell one failure."""
        self._found.append(problem)
        _say(str(problem))

    def finish(self) -> None:
        """End the program with the status that the failures call for."""
        if any(isinstance(one, SettingsError) for one in self._found):
            raise click.exceptions.Exit(BAD_USE)
        if self._found:
            raise click.exceptions.Exit(SOME_FAILED)


def not_writable(path: str | Path, problem: OSError) -> InputError:
    """Return the failure to write a file as an error with its remedy."""
    return InputError(
        f"cannot be written: {problem.strerror or problem}",
        file=str(path),
        remedy="give a path in a folder that exists and may be written to",
    )


def _say(message: str) -> None:
    """Print one line on standard error; line breaks and control characters of a file stay out of it."""
    line = "".join(char if char.isprintable() else " " for char in message)
    click.echo(f"branchpos: {' '.join(line.split())}", err=True)
