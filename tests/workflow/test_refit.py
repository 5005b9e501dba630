"""Refitting from the real data gives what is shipped."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from branchpos.errors import FormatError, InputError, SettingsError
from branchpos.predicting.parameters import fitted_parameters, parameters_from_record
from branchpos.predicting.retention import parameters_from_record as retention_from_record
from branchpos.predicting.retention import predict_retention, shipped_parameters
from branchpos.reference_data import load_reference
from branchpos.workflow import refit
from branchpos.workflow.held_out import largest_move, shipped_start, usable
from branchpos.workflow.reference_spectra import read_known_spectra
from branchpos.workflow.refit import run_refit, write_yields
from branchpos.workflow.yield_fit import YieldFit, fit_yields

STAND_STILL = 0.1
"""How far [standard errors] the shipped parameters may move when the fit goes on from them."""


def test_the_shipped_yields_are_where_the_fit_stands_still(shared: Path) -> None:
    start = shipped_start()
    known = usable(read_known_spectra(shared / "spectra"))
    again = fit_yields(known, {}, start=start, iterations=2)
    assert largest_move(start, again) < STAND_STILL
    assert np.allclose(again.errors.scales, start.errors.scales, rtol=0.02)


def test_the_shipped_yields_name_every_record_they_rest_on(shared: Path) -> None:
    known = usable(read_known_spectra(shared / "spectra"))
    stated = fitted_parameters().provenance["accessions"].split()
    assert stated == sorted(one.accession for one in known)


@pytest.fixture
def quick_yields(monkeypatch: pytest.MonkeyPatch) -> YieldFit:
    """Let the yields be the shipped ones, so that the writing can be tested without a long fit."""
    start = shipped_start()
    monkeypatch.setattr(refit, "refit_yields", lambda folder, leave_out=(): start)
    return start


def test_retention_and_esters_come_out_as_shipped(
    shared: Path, tmp_path: Path, quick_yields: YieldFit
) -> None:
    table = shared / "retention" / "methylalkanes.csv"
    yields, retention = run_refit(shared / "spectra", table, tmp_path / "new", ("alkane",))
    record = json.loads(retention.read_text(encoding="utf-8"))
    shipped = load_reference("retention.json")
    positions = np.array([[5, 11], [3, 13]])
    new = predict_retention(positions, 27, retention_from_record(record["alkanes"]))
    assert np.allclose(new, predict_retention(positions, 27, shipped_parameters()), atol=0.05)
    esters, before = record["methyl esters"], shipped["methyl esters"]
    assert (esters["bias"], esters["sd"]) == pytest.approx((before["bias"], before["sd"]), abs=0.001)
    middle = esters["intercept"] + 17 * esters["slope"]
    assert middle == pytest.approx(before["intercept"] + 17 * before["slope"], abs=before["scatter"])
    assert esters["provenance"]["left_out"][0].startswith("LIB-FAME-0020: "), "its record holds no peaks"
    assert record["alkanes"]["provenance"]["date"]
    assert json.loads(yields.read_text(encoding="utf-8"))["values"] == load_reference(yields.name)["values"]


def test_without_ester_data_the_shipped_part_is_kept(
    shared: Path, tmp_path: Path, quick_yields: YieldFit
) -> None:
    alone = tmp_path / "indices.csv"
    alone.write_bytes((shared / "retention" / "methylalkanes.csv").read_bytes())
    record = json.loads(
        run_refit(shared / "spectra", alone, tmp_path, ("alkane",))[1].read_text(encoding="utf-8")
    )
    assert record["methyl esters"] == load_reference("retention.json")["methyl esters"]


def test_written_yields_are_read_back(tmp_path: Path) -> None:
    start = shipped_start()
    write_yields(start, tmp_path / "y.json")
    again = parameters_from_record(json.loads((tmp_path / "y.json").read_text(encoding="utf-8")), "y.json")
    assert np.allclose(again.values, start.parameters.values, atol=1e-5)
    assert again.provenance["command"].startswith("branchpos refit")


def test_an_installed_program_is_not_overwritten(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, quick_yields: YieldFit
) -> None:
    inside = tmp_path / "branchpos" / "reference_sets" / "alkane_yields.json"
    monkeypatch.setattr(refit, "reference_path", lambda name: inside)
    with pytest.raises(SettingsError, match="--out DIR"):
        run_refit(tmp_path)


def test_a_folder_without_a_table_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no table of known structures"):
        run_refit(tmp_path, out=tmp_path, chain=("alkane",))
    with pytest.raises(InputError, match=r"absent\.csv: no table of retention indices"):
        run_refit(tmp_path, tmp_path / "absent.csv", tmp_path, ("alkane",))


def test_a_bad_row_of_the_ester_table_is_named(shared: Path, tmp_path: Path, quick_yields: YieldFit) -> None:
    table = tmp_path / "indices.csv"
    table.write_bytes((shared / "retention" / "methylalkanes.csv").read_bytes())
    heads = "chain_class,backbone_carbons,methyl_positions,equivalent_chain_length\n"
    (tmp_path / "methyl_esters.csv").write_text(heads + "methyl ester,14,13,long\n", encoding="utf-8")
    with pytest.raises(FormatError, match=r"methyl_esters\.csv: line 2"):
        run_refit(shared / "spectra", table, tmp_path / "out", ("alkane",))
