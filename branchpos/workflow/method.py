"""The settings of an analysis, as options on the command line or as a method file in TOML."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass, fields, replace
from pathlib import Path

from branchpos.end_group import END_GROUPS, PLACED_CLASSES, EndGroup
from branchpos.enumerating import PRIORS
from branchpos.errors import SettingsError
from branchpos.masses import Formula, parse_formula

ALL_CARBONS = range(5, 61)
"""Carbons that may be asked for: smaller chains have no branch to place, larger ones were not checked."""
MOST_METHYLS = 6
CHECKED_CLASSES = ("alkane",)
"""Classes whose probabilities were checked on compounds left out of the fit; the default."""


@dataclass(frozen=True, slots=True)
class Method:
    """Settings of ``locate``.

    Attributes
    ----------
    chain : chain classes to consider, by name; the checked ones when not given.
    carbons : carbons of the skeleton to consider, branches included; None lets the spectrum say.
    methyls : numbers of methyl branches to consider; isoprenoids with more are added when it begins at 0 or 1
        and ends at 4 or more.
    formula : molecular formula, if known; overrules ``carbons``.
    prior : name of the prior, see ``branchpos.enumerating.priors``.
    level : probability that the credible set has to reach.

    Raises
    ------
    SettingsError : a value is out of range or unknown.
    """

    chain: tuple[str, ...] = CHECKED_CLASSES
    carbons: range | None = None
    methyls: range = range(5)
    formula: str | None = None
    prior: str = "flat"
    level: float = 0.95

    def __post_init__(self) -> None:
        for name in self.chain:
            _check_class(name)
        if not self.chain:
            raise SettingsError("no chain class", remedy=f"choose from {', '.join(PLACED_CLASSES)}")
        if self.prior not in PRIORS:
            raise SettingsError(f"prior {self.prior!r}", remedy=f"choose from {', '.join(PRIORS)}")
        if not 0.5 <= self.level < 1:
            raise SettingsError(f"level {self.level:g}", remedy="give a probability from 0.5 to below 1")
        _check_range("methyls", self.methyls, range(MOST_METHYLS + 1))
        if self.carbons is not None:
            _check_range("carbons", self.carbons, ALL_CARBONS)
        if self.formula is not None:
            self.sizes_of_formula()

    def caution(self) -> tuple[str, ...]:
        """Return what has to be said of the classes asked for, in words."""
        unchecked = [name for name in self.chain if name not in CHECKED_CLASSES]
        if not unchecked:
            return ()
        named = unchecked[0] if len(unchecked) == 1 else f"{len(unchecked)} of the chain classes asked for"
        return (
            f"probabilities for {named} are not yet checked on compounds left out of the fit: "
            "take them as a ranking",
        )

    def sizes_of_formula(self) -> list[tuple[EndGroup, int]]:
        """Return the classes and numbers of carbons that have the formula.

        Raises
        ------
        SettingsError : the formula is not one, or is that of no chain of the asked classes.
        """
        try:
            formula = parse_formula(self.formula or "")
        except ValueError as problem:
            raise SettingsError(str(problem), remedy="write it like C27H56") from problem
        classes = [END_GROUPS[name] for name in self.chain]
        bare = [(one, formula - one.added) for one in classes]
        found = [
            (one, rest.c)
            for one, rest in bare
            if rest == Formula(rest.c, 2 * rest.c + 2) and rest.c in ALL_CARBONS
        ]
        if not found:
            raise SettingsError(
                f"formula {self.formula} fits no saturated chain of the classes asked for",
                remedy="leave --formula out, or check the chain class",
            )
        return found


def _check_class(name: str) -> None:
    if name in PLACED_CLASSES:
        return
    if name in END_GROUPS:
        raise SettingsError(
            f"no branch can be placed in chain class {name!r}",
            remedy=f"choose from {', '.join(PLACED_CLASSES)}",
        )
    raise SettingsError(f"chain class {name!r} is unknown", remedy=f"choose from {', '.join(END_GROUPS)}")


def _check_range(name: str, wanted: range, allowed: range) -> None:
    if len(wanted) == 0 or wanted[0] not in allowed or wanted[-1] not in allowed:
        span = f"{wanted.start}-{wanted.stop - 1}"
        raise SettingsError(f"{name} {span}", remedy=f"give a range within {allowed[0]}-{allowed[-1]}")


def parse_range(text: str, name: str) -> range:
    """Read ``27`` or ``20-40`` as a range that includes both ends.

    Raises
    ------
    SettingsError : the text is neither.

    >>> parse_range("20-40", "carbons")
    range(20, 41)
    """
    first, dash, last = text.strip().partition("-")
    if not first.isdigit() or (dash and not last.isdigit()):
        raise SettingsError(f"{name} {text!r}", remedy="write a number like 27 or a range like 20-40")
    low, high = int(first), int(last or first)
    if high < low:
        raise SettingsError(f"{name} {text!r} runs backwards", remedy=f"write {high}-{low}")
    return range(low, high + 1)


def read_method(path: Path) -> Method:
    """Read a method file: TOML with the fields of ``Method`` as keys.

    Raises
    ------
    SettingsError : the file is missing, is no TOML, or holds an unknown key or a value out of range; the
        message names the line.
    """
    try:
        text = path.read_text(encoding="utf-8")
        entries = tomllib.loads(text)
    except OSError as problem:
        raise SettingsError(
            f"cannot be read: {problem.strerror}", file=str(path), remedy="check the path"
        ) from problem
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as problem:
        raise SettingsError(f"no valid TOML: {problem}", file=str(path), remedy="mend the line") from problem
    method = Method()
    for key, value in entries.items():
        try:
            method = _with_entry(method, key, value)
        except SettingsError as problem:
            raise problem.located(file=str(path), place=_line_of(key, text)) from problem
    return method


def _with_entry(method: Method, key: str, value: object) -> Method:
    """Return the method with one entry of a method file applied."""
    match key, value:
        case "chain", list():
            return replace(method, chain=tuple(str(name) for name in value))
        case "chain", str():
            return replace(method, chain=tuple(value.split(",")))
        case "carbons", str() | int():
            return replace(method, carbons=parse_range(str(value), key))
        case "methyls", str() | int():
            return replace(method, methyls=parse_range(str(value), key))
        case "formula", str():
            return replace(method, formula=value)
        case "prior", str():
            return replace(method, prior=value)
        case "level", float():
            return replace(method, level=value)
    known = [field.name for field in fields(Method)]
    if key in known:
        raise SettingsError(f"{key} = {value!r} has the wrong type", remedy="see the example in the README")
    raise SettingsError(f"unknown entry {key!r}", remedy=f"use {', '.join(known)}")


def _line_of(key: str, text: str) -> str:
    for number, line in enumerate(text.splitlines(), start=1):
        if line.split("=")[0].strip().strip("\"'") == key:
            return f"line {number}"
    return ""
