"""The rules of the house that a program can check."""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator
from functools import cache
from pathlib import Path
from statistics import median

import pytest

ROOT = Path(__file__).resolve().parents[2]
PACKAGE = ROOT / "branchpos"
SOURCES = sorted(PACKAGE.rglob("*.py"))
LONGEST_FILE, LONGEST_FUNCTION, MIDDLING_FUNCTION = 400, 60, 10
BANNED_NAMES = {"utils", "util", "helpers", "helper", "common", "manager", "base", "misc"}
MAY_PRINT = ("cli", "reporting")
Function = ast.FunctionDef | ast.AsyncFunctionDef

in_every_file = pytest.mark.parametrize("path", SOURCES, ids=lambda path: str(path.relative_to(PACKAGE)))


@cache
def parsed(path: Path) -> ast.Module:
    return ast.parse(path.read_text(encoding="utf-8"))


def functions(path: Path) -> Iterator[Function]:
    return (node for node in ast.walk(parsed(path)) if isinstance(node, Function))


def body_lines(function: Function) -> int:
    """Return the lines of a function from its signature on, docstring left out."""
    lines = (function.end_lineno or function.lineno) - function.lineno + 1
    first = function.body[0]
    if isinstance(first, ast.Expr) and ast.get_docstring(function) is not None:
        lines -= (first.end_lineno or first.lineno) - first.lineno + 1
    return lines


@in_every_file
def test_files_are_short(path: Path) -> None:
    assert len(path.read_text(encoding="utf-8").splitlines()) <= LONGEST_FILE


@in_every_file
def test_functions_are_short(path: Path) -> None:
    long = [one.name for one in functions(path) if body_lines(one) > LONGEST_FUNCTION]
    assert long == []


def test_half_of_all_functions_are_very_short() -> None:
    lengths = [body_lines(one) for path in SOURCES for one in functions(path)]
    assert len(lengths) > 300
    assert median(lengths) <= MIDDLING_FUNCTION


@in_every_file
def test_modules_say_what_they_are(path: Path) -> None:
    assert ast.get_docstring(parsed(path))
    assert path.stem not in BANNED_NAMES


@in_every_file
def test_what_is_public_says_what_it_does(path: Path) -> None:
    public = [
        node
        for node in parsed(path).body
        if isinstance(node, Function | ast.ClassDef) and not node.name.startswith("_")
    ]
    public += [
        method
        for owner in public
        if isinstance(owner, ast.ClassDef)
        for method in owner.body
        if isinstance(method, Function) and not method.name.startswith("_")
    ]
    assert [one.name for one in public if not ast.get_docstring(one)] == []


@in_every_file
def test_only_the_console_prints(path: Path) -> None:
    prints = [
        node.lineno
        for node in ast.walk(parsed(path))
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id == "print"
    ]
    assert prints == [] or path.relative_to(PACKAGE).parts[0].removesuffix(".py") in MAY_PRINT


@in_every_file
def test_nothing_swallows_misspelt_options(path: Path) -> None:
    """``**anything`` in a signature is passed on whole, to a call that knows its names, or not taken."""
    swallow = [one.name for one in functions(path) if one.args.kwarg and not passes_on(one)]
    assert swallow == []


def passes_on(function: Function) -> bool:
    """Tell whether the body hands its ``**keywords`` to a call."""
    keywords = function.args.kwarg.arg if function.args.kwarg else ""
    return any(
        isinstance(node, ast.keyword)
        and node.arg is None
        and isinstance(node.value, ast.Name)
        and node.value.id == keywords
        for node in ast.walk(function)
    )


@in_every_file
def test_errors_raised_are_those_of_the_tree(path: Path) -> None:
    """Bare ``Exception`` and ``RuntimeError`` tell a caller nothing."""
    raised = {
        node.exc.func.id
        for node in ast.walk(parsed(path))
        if isinstance(node, ast.Raise)
        and isinstance(node.exc, ast.Call)
        and isinstance(node.exc.func, ast.Name)
    }
    assert not raised & {"Exception", "BaseException", "RuntimeError", "AssertionError"}


@in_every_file
def test_calibration_is_for_instrument_axes(path: Path) -> None:
    """Probabilities have reliability; only axes are calibrated."""
    text = path.read_text(encoding="utf-8").lower()
    assert not re.search(r"calibrat\w+ (?:of )?(?:the )?(?:probab|posterior)", text)
    assert not re.search(r"(?:probab\w+|posteriors?) (?:are |is )?calibrat", text)


WRITTEN = [
    *SOURCES,
    *sorted((ROOT / "tests").rglob("*.py")),
    *(ROOT / name for name in ("README.md", "DEVELOPERS.md", "CHANGELOG.md", "pyproject.toml", ".ci/run")),
]


@pytest.mark.parametrize("path", WRITTEN, ids=lambda path: str(path.relative_to(ROOT)))
def test_no_path_of_one_machine_and_no_index(path: Path) -> None:
    """What is committed must run anywhere: no home folders, no package index of one site, no loose ends."""
    text = path.read_text(encoding="utf-8")
    if path == Path(__file__).resolve():
        return
    assert not re.search(r"(?<![\w.])/(?:work|home|root|Users)/\w", text)
    assert not re.search(r"--(?:extra-)?index-url|PIP_INDEX_URL", text)
    assert not re.search(r"\b(?:TODO|FIXME|XXX)\b", text)
