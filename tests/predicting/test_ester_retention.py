"""Equivalent chain lengths of methyl esters against the six measured ones."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.errors import SettingsError
from branchpos.predicting.ester_retention import (
    ester_index_of,
    fit_ester_retention,
    index_of_equivalent,
    predict_equivalent_chain_length,
    shipped_ester_parameters,
)

Branched = list[tuple[int, tuple[int, ...], float]]
ESTER = END_GROUPS["methyl ester"]


@pytest.fixture(scope="module")
def branched(shared: Path) -> Branched:
    with (shared / "retention" / "methyl_esters.csv").open(encoding="utf-8") as stream:
        return [
            (int(r["backbone_carbons"]), (int(r["methyl_positions"]),), float(r["equivalent_chain_length"]))
            for r in csv.DictReader(stream)
        ]


@pytest.fixture(scope="module")
def straight(shared: Path) -> list[tuple[int, float]]:
    chains = shared / "spectra"
    with (chains / "truth.csv").open(encoding="utf-8") as stream:
        known = [r for r in csv.DictReader(stream) if r["accession"].startswith("LIB-FAME")]
    return [
        (int(r["backbone_carbons"]), index_in(chains / "chains" / f"{r['accession']}.txt"))
        for r in known
        if not r["methyl_positions"]
    ]


def index_in(record: Path) -> float:
    mark = "AC$CHROMATOGRAPHY: KOVATS_RTI"
    lines = record.read_text(encoding="utf-8").splitlines()
    return float(next(line for line in lines if line.startswith(mark)).removeprefix(mark))


def test_each_ester_is_predicted_from_the_other_five(
    branched: Branched, straight: list[tuple[int, float]]
) -> None:
    for out in branched:
        fitted = fit_ester_retention([row for row in branched if row != out], straight)
        mean, sd = predict_equivalent_chain_length(np.array([out[1]]), out[0], fitted)
        assert mean[0] == pytest.approx(out[2], abs=min(0.05, 1.96 * sd[0]))


def test_shipped_values_come_out_again(branched: Branched, straight: list[tuple[int, float]]) -> None:
    again, shipped = fit_ester_retention(branched, straight), shipped_ester_parameters()
    assert again.bias == pytest.approx(shipped.bias, abs=2e-3)
    assert (again.slope, again.intercept, again.scatter) == pytest.approx(
        (shipped.slope, shipped.intercept, shipped.scatter), abs=1e-3
    )


def test_measured_esters_lie_inside_their_index_interval(shared: Path) -> None:
    with (shared / "retention" / "methyl_esters.csv").open(encoding="utf-8") as stream:
        for row in csv.DictReader(stream):
            chain = Chain(int(row["backbone_carbons"]), (int(row["methyl_positions"]),), ESTER)
            low, high = ester_index_of(chain).interval(0.95)
            assert low < float(row["retention_index_alkane_scale_DB5"]) < high


@pytest.mark.parametrize(
    ("position", "low", "high"), [(15, 16.60, 16.70), (14, 16.68, 16.78), (10, 16.35, 16.50)]
)
def test_trade_values_of_heptadecanoate_isomers(position: int, low: float, high: float) -> None:
    # From memory, equivalent chain lengths on methyl silicone: iso 16.6-16.7, anteiso 16.7, 10-methyl 16.4.
    mean, _ = predict_equivalent_chain_length(np.array([[position]]), 16)
    assert low < mean[0] < high


def test_straight_esters_define_the_scale() -> None:
    mean, sd = predict_equivalent_chain_length(np.empty((1, 0), dtype=int), 18)
    assert (mean[0], sd[0]) == (18.0, 0.0)


def test_places_never_measured_are_trusted_less() -> None:
    _, sd = predict_equivalent_chain_length(np.array([[2], [3], [10]]), 16)
    assert sd[0] > sd[1] > 3 * sd[2]


def test_an_interval_on_the_index_scale_holds_the_spread_of_the_line() -> None:
    assert index_of_equivalent(16.0, sd=0.5).sd > index_of_equivalent(16.0).sd > 5


def test_other_classes_and_positions_are_refused() -> None:
    with pytest.raises(SettingsError, match="'alkane'"):
        ester_index_of(Chain(16, (5,)))
    with pytest.raises(SettingsError, match="position 1 "):
        predict_equivalent_chain_length(np.array([[1]]), 16)
