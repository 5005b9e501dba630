"""Options that several commands share, and the settings they amount to."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from functools import wraps
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from branchpos.errors import SettingsError

if TYPE_CHECKING:
    from branchpos.workflow.method import Method

Command = Callable[..., Any]

FIGURE_SUFFIXES = (".svg", ".png", ".pdf")


@dataclass(frozen=True, slots=True)
class Asked:
    """Settings as given on the command line; None where an option was not given."""

    chain: str | None = None
    carbons: str | None = None
    methyls: str | None = None
    formula: str | None = None
    prior: str | None = None
    level: float | None = None
    method: Path | None = None

    def to_method(self) -> Method:
        """Return the method file's settings, or the defaults, overruled by the options.

        Raises
        ------
        SettingsError : a value is out of range or unknown, or the method file cannot be used.
        """
        from branchpos.workflow.method import Method, parse_range, read_method

        method = read_method(self.method) if self.method else Method()
        if self.chain is not None:
            method = replace(method, chain=chain_classes(self.chain))
        if self.carbons is not None:
            method = replace(method, carbons=parse_range(self.carbons, "carbons"))
        if self.methyls is not None:
            method = replace(method, methyls=parse_range(self.methyls, "methyls"))
        if self.formula is not None:
            method = replace(method, formula=self.formula)
        if self.prior is not None:
            method = replace(method, prior=_known_prior(self.prior))
        if self.level is not None:
            method = replace(method, level=self.level)
        return method


def method_options(command: Command) -> Command:
    """Add the options that settle a method; the command gets them as one ``Asked``."""

    @wraps(command)
    def with_settings(
        *args: Any,
        chain: str | None,
        carbons: str | None,
        methyls: str | None,
        formula: str | None,
        prior: str | None,
        level: float | None,
        method: Path | None,
        **others: Any,
    ) -> Any:
        asked = Asked(chain, carbons, methyls, formula, prior, level, method)
        return command(*args, asked=asked, **others)

    options = (
        click.option("--chain", metavar="CLASS[,CLASS]", help="Chain classes to consider, or all [alkane]."),
        click.option("--carbons", metavar="N or N-M", help="Carbons, branches included [as the data allow]."),
        click.option("--methyls", metavar="N or N-M", help="Numbers of methyl branches [0-4]."),
        click.option("--formula", metavar="FORMULA", help="Molecular formula; overrules --carbons."),
        click.option("--prior", metavar="NAME", help="What is likely beforehand: flat or biogenic [flat]."),
        click.option("--level", type=float, metavar="P", help="Probability of the credible set [0.95]."),
        click.option(
            "--method",
            type=click.Path(path_type=Path),
            metavar="FILE.toml",
            help="Settings from a file; options on the command line overrule it.",
        ),
    )
    for option in reversed(options):
        with_settings = option(with_settings)
    return with_settings


def json_option(command: Command) -> Command:
    """Add ``--json FILE``; ``-`` is standard output."""
    return click.option(
        "--json",
        "json_path",
        metavar="FILE",
        callback=_writable,
        help="Write the results as JSON; - for standard output.",
    )(command)


def figure_option(command: Command) -> Command:
    """Add ``--figure FILE`` with its suffix checked before any work is done."""
    return click.option(
        "--figure",
        metavar="FILE.svg",
        callback=_drawable,
        help="Draw the ion series (.svg, .png or .pdf); numbered where there are several.",
    )(command)


def quiet_option(command: Command) -> Command:
    """Add ``--quiet``."""
    return click.option("--quiet", "-q", is_flag=True, help="Print nothing but failures.")(command)


def chain_classes(text: str) -> tuple[str, ...]:
    """Read a list of chain classes; hyphens stand for blanks, so that ``methyl-ester`` needs no quotes.

    Raises
    ------
    SettingsError : a class is unknown.

    >>> chain_classes("alkane, methyl-ester")
    ('alkane', 'methyl ester')
    """
    from branchpos.end_group import END_GROUPS, PLACED_CLASSES

    if text.strip().lower() == "all":
        return PLACED_CLASSES
    spelt = {name.replace(" ", "-"): name for name in END_GROUPS}
    asked = [part.strip().lower().replace(" ", "-") for part in text.split(",")]
    return tuple(spelt[require_known("chain class", name, spelt)] for name in asked)


def require_known(what: str, name: str, known: Iterable[str]) -> str:
    """Return a name that is known.

    Raises
    ------
    SettingsError : it is not; the nearest known name is suggested.

    >>> require_known("prior", "flatt", ["flat", "biogenic"])
    Traceback (most recent call last):
    branchpos.errors.SettingsError: prior 'flatt' is unknown; did you mean 'flat'? choose from flat, biogenic
    """
    from difflib import get_close_matches

    names = list(known)
    if name in names:
        return name
    near = get_close_matches(name, names, n=1)
    hint = f"did you mean {near[0]!r}? " if near else ""
    raise SettingsError(f"{what} {name!r} is unknown", remedy=f"{hint}choose from {', '.join(names)}")


def numbered(path: str, number: int, several: bool) -> Path:
    """Return the path of one of several figures.

    >>> numbered("peaks.svg", 2, several=True).name, numbered("peaks.svg", 1, several=False).name
    ('peaks-2.svg', 'peaks.svg')
    """
    plain = Path(path)
    return plain.with_name(f"{plain.stem}-{number}{plain.suffix}") if several else plain


def _known_prior(name: str) -> str:
    from branchpos.enumerating import PRIORS

    return require_known("prior", name, PRIORS)


def _writable(_context: click.Context, _parameter: click.Parameter, value: str | None) -> str | None:
    if value is None or value == "-":
        return value
    path = Path(value)
    if path.is_dir():
        raise click.BadParameter(f"{value} is a folder; give the path of a file")
    if not path.parent.is_dir():
        raise click.BadParameter(f"the folder {path.parent} does not exist; make it first")
    return value


def _drawable(context: click.Context, parameter: click.Parameter, value: str | None) -> str | None:
    if value is not None and Path(value).suffix.lower() not in FIGURE_SUFFIXES:
        raise click.BadParameter(f"{value} ends in none of {', '.join(FIGURE_SUFFIXES)}; choose one")
    return None if value is None else _writable(context, parameter, value)
