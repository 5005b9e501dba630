"""What the README shows is what the program does."""

from __future__ import annotations

import re
import subprocess
import sys
import tomllib
from pathlib import Path

from branchpos.workflow.method import Method, read_method

ROOT = Path(__file__).resolve().parents[2]
EXAMPLE = ROOT / "reports" / "example"
README = (ROOT / "README.md").read_text(encoding="utf-8")


def block(language: str) -> str:
    found = re.search(rf"```{language}\n(.+?)```", README, flags=re.DOTALL)
    assert found
    return found.group(1)


def without_numbers(text: str) -> str:
    """Return the text with figures blanked: a refit moves them in the last digits."""
    return re.sub(r"(?<![\d,-])[-+<]*\d+(?:\.\d+)?(?![\d,-])", "#", text)


def test_the_example_prints_what_is_shown() -> None:
    command, *shown = block("console").splitlines()
    arguments = command.removeprefix("$ branchpos ").split()
    figure = arguments.index("--figure")
    done = subprocess.run(
        [sys.executable, "-m", "branchpos", *arguments[:figure]],
        cwd=EXAMPLE, capture_output=True, text=True, check=True,
    )  # fmt: skip
    printed = done.stdout.rstrip().splitlines()
    assert printed[:2] == shown[:2]
    assert [without_numbers(line).split() for line in printed[3:6]] == [
        without_numbers(line).split() for line in shown[3:6]
    ]
    assert printed[-1] == shown[-1]


def test_the_python_example_runs(monkeypatch) -> None:
    monkeypatch.chdir(EXAMPLE)
    names: dict[str, object] = {}
    exec(block("python"), names)  # the README is ours
    verdict = names["verdict"]
    stated = re.findall(r"^verdict\.(\w+) +# (.+)$", block("python"), flags=re.MULTILINE)
    assert repr(verdict.call) == dict(stated)["call"]
    assert repr(verdict.credible_set) == dict(stated)["credible_set"]


def test_the_method_file_shown_is_the_one_kept_and_is_read() -> None:
    assert tomllib.loads(block("toml")) == tomllib.loads((EXAMPLE / "method.toml").read_text())
    assert read_method(EXAMPLE / "method.toml") == Method(("alkane",), range(20, 41), range(5), None)


def test_every_file_linked_is_there() -> None:
    linked = re.findall(r"\]\(([^)#:]+)\)", README)
    assert linked
    assert all((ROOT / link).is_file() for link in linked)


def test_every_command_is_listed() -> None:
    done = subprocess.run(
        [sys.executable, "-m", "branchpos", "--help"], capture_output=True, text=True, check=True
    )
    commands = re.findall(r"^  (\w+) +\w", done.stdout.split("Commands:")[1], flags=re.MULTILINE)
    assert len(commands) >= 6
    assert all(f"`branchpos {command}" in README for command in commands)
