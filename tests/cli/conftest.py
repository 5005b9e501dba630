"""Spectra invented from the model itself, and the command run in this process."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

import branchpos as bp
from branchpos.cli import main

Run = Callable[..., Result]


@pytest.fixture(scope="session")
def run() -> Run:
    """Return a function that runs one command and never lets a traceback through."""

    def call(*arguments: object) -> Result:
        result = CliRunner().invoke(main, [str(one) for one in arguments])
        assert result.exception is None or isinstance(result.exception, SystemExit), result.exception
        assert "Traceback" not in result.output
        return result

    return call


def peak_lines(name: str, least: float = 0.004) -> list[str]:
    """Return the expected ions of a chain as lines of a peak list, base peak 1000."""
    ions = bp.predict(name, least=least).series.ions
    return [f"{ion.mz}\t{1000 * ion.expected:.1f}" for ion in ions]


@pytest.fixture(scope="session")
def good(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a file with the spectrum expected of 4-methyldodecane."""
    path = tmp_path_factory.mktemp("good") / "good.txt"
    path.write_text("\n".join(["Name: invented", *peak_lines("4-MeC12")]) + "\n", encoding="utf-8")
    return path


@pytest.fixture(scope="session")
def two(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a file with two spectra."""
    path = tmp_path_factory.mktemp("two") / "two.txt"
    blocks = [["Name: first", *peak_lines("4-MeC12")], ["Name: second", *peak_lines("n-C14")]]
    path.write_text("\n\n".join("\n".join(block) for block in blocks) + "\n", encoding="utf-8")
    return path
