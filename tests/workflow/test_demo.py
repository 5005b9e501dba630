"""The invented study: made offline, labelled as invented, and read back like any other data."""

from __future__ import annotations

import csv
import json
from dataclasses import replace
from pathlib import Path

import pytest

from branchpos.reading import read_spectrum
from branchpos.workflow.demo import RESULTS, SPECTRA, TABLE, TRUTH, run_demo
from branchpos.workflow.demo_data import INVENTED, invent_fraction
from branchpos.workflow.model import shipped_model


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, list[Path], list[str]]:
    out, told = tmp_path_factory.mktemp("demo"), list[str]()
    return out, run_demo(out, told.append), told


def test_every_file_says_that_it_is_invented(made: tuple[Path, list[Path], list[str]]) -> None:
    out, written, told = made
    assert all(path.is_file() and path.is_relative_to(out) for path in written)
    assert sorted(path for path in out.rglob("*") if path.is_file()) == sorted(written)
    assert INVENTED in told[0]
    for path in written:
        if path.suffix == ".svg":  # its lettering is drawn, not written: the title is the spectrum's own
            assert path.name.startswith("invented")
        else:
            assert INVENTED in path.read_text(encoding="utf-8").lower(), path.name


def test_every_row_of_the_tables_says_so_too(made: tuple[Path, list[Path], list[str]]) -> None:
    for name in (TABLE, TRUTH):
        with (made[0] / name).open(encoding="utf-8", newline="") as stream:
            rows = list(csv.DictReader(stream))
        assert len(rows) == len(invent_fraction(shipped_model()))
        assert {row["data"] for row in rows} == {INVENTED}


def test_the_spectra_are_read_back_as_they_were_made(made: tuple[Path, list[Path], list[str]]) -> None:
    files = sorted((made[0] / SPECTRA).glob("*.txt"))
    for peak, file in zip(invent_fraction(shipped_model()), files, strict=True):
        spectrum = read_spectrum(file)
        assert not spectrum.warnings
        assert spectrum.retention_index == pytest.approx(peak.index, abs=0.05)
        assert list(zip(spectrum.mz, spectrum.intensity, strict=True)) == [
            (mz, pytest.approx(height)) for mz, height in peak.peaks
        ]


def test_results_hold_one_verdict_a_peak(made: tuple[Path, list[Path], list[str]]) -> None:
    results = json.loads((made[0] / RESULTS).read_text(encoding="utf-8"))["results"]
    assert [one["title"] for one in results] == [peak.title for peak in invent_fraction(shipped_model())]
    assert all((made[0] / one["source"]).is_file() for one in results)


def test_the_same_seed_invents_the_same_and_another_does_not() -> None:
    model = shipped_model()
    assert invent_fraction(model) == invent_fraction(model)
    assert invent_fraction(model) != invent_fraction(model, seed=1)


def test_spectra_follow_the_model_they_are_drawn_from() -> None:
    """Planted truth: with hardly any error, M-43 and M-15 of a 2-methylalkane stand out.

    Strong M-43 and M-15 of 2-methylalkanes: common practice.
    """
    model = shipped_model()
    fraction = invent_fraction(replace(model, errors=model.errors.widened(0.02)))
    heights = dict(next(peak.peaks for peak in fraction if peak.truth == "2-methylhexacosane"))
    molecular = 14 * 27 + 2
    assert heights[molecular - 43] > max(heights.get(molecular - loss, 0.0) for loss in (29, 57))
    assert heights[molecular - 15] > heights[molecular - 43]
