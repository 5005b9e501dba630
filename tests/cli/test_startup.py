"""The program starts quickly, because nothing heavy is imported before it is needed."""

from __future__ import annotations

import subprocess
import sys

import pytest

HEAVY = ("numpy", "scipy", "matplotlib", "rich", "sklearn", "rdkit", "pydantic")


@pytest.mark.parametrize("statement", ["import branchpos", "import branchpos.cli"])
def test_nothing_heavy_is_imported_at_the_start(statement: str) -> None:
    code = f"{statement}; import sys; print([name for name in {HEAVY} if name in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


@pytest.mark.parametrize("command", ["locate", "predict", "isomers", "refit", "validate", "demo"])
def test_every_command_has_help_and_shows_its_options(command: str) -> None:
    arguments = [sys.executable, "-m", "branchpos", command, "--help"]
    done = subprocess.run(arguments, capture_output=True, text=True, check=True)
    assert f"branchpos {command}" in done.stdout
    assert "--quiet" in done.stdout
