"""``branchpos locate`` from files to output, on invented spectra and on one real record."""

from __future__ import annotations

import json
from math import log2
from pathlib import Path

import jsonschema
import pytest

from branchpos.reporting.records import schema
from tests.cli.conftest import Run


def documents(text: str) -> dict[str, object]:
    loaded: dict[str, object] = json.loads(text)
    jsonschema.Draft202012Validator(schema("locate")).validate(loaded)
    return loaded


def test_text_puts_the_call_first_then_the_table_then_the_reasons(good: Path, run: Run) -> None:
    lines = run("locate", good).stdout.splitlines()
    assert lines[0].startswith(str(good))
    order = [
        next(at for at, line in enumerate(lines) if word in line)
        for word in ("(", "rank", "4-MeC12", "none of these", "why")
    ]
    assert order == sorted(order)
    assert "\x1b" not in "".join(lines)


def test_the_planted_structure_comes_first(good: Path, run: Run) -> None:
    found = documents(run("locate", good, "--json", "-").stdout)["results"][0]
    assert found["hypotheses"][0]["name"] == "4-methyldodecane"
    assert found["source"] == str(good)
    assert found["title"] == "invented"


def test_each_spectrum_of_each_file_gives_a_result(two: Path, good: Path, run: Run) -> None:
    results = documents(run("locate", two, good, "--json", "-").stdout)["results"]
    assert [one["title"] for one in results] == ["first", "second", "invented"]


def test_no_results_are_an_empty_list(tmp_path: Path, run: Run) -> None:
    empty = tmp_path / "empty.txt"
    empty.touch()
    assert documents(run("locate", empty, "--json", "-").stdout)["results"] == []


def test_options_overrule_the_method_file(tmp_path: Path, good: Path, run: Run) -> None:
    method = tmp_path / "method.toml"
    method.write_text('methyls = "0-1"\ncarbons = "13"\nprior = "biogenic"\n', encoding="utf-8")
    found = documents(run("locate", good, "--method", method, "--prior", "flat", "--json", "-").stdout)
    assert found["prior"] == "flat"
    counts = {len(one["methyl_positions"]) for one in found["results"][0]["hypotheses"]}
    assert counts <= {0, 1}


def test_quiet_prints_nothing(good: Path, run: Run) -> None:
    assert run("locate", good, "--quiet").output == ""


def test_all_lists_every_chain(good: Path, run: Run) -> None:
    arguments = ["locate", good, "--carbons", "13", "--methyls", "0-1", "--chain", "alkane", "--json", "-"]
    few = documents(run(*arguments).stdout)["results"][0]
    every = documents(run(*arguments, "--all").stdout)["results"][0]
    # Tridecane and 2- to 6-methyldodecane: the other positions are the same molecules from the other end.
    assert len(every["hypotheses"]) == every["considered"] == 6
    assert len(few["hypotheses"]) <= 6


def test_a_figure_is_drawn_for_each_spectrum(tmp_path: Path, two: Path, run: Run) -> None:
    result = run("locate", two, "--quiet", "--figure", tmp_path / "out.svg")
    assert result.exit_code == 0
    assert sorted(path.name for path in tmp_path.iterdir()) == ["out-1.svg", "out-2.svg"]


@pytest.fixture(scope="module")
def record(shared: Path, run: Run) -> dict[str, object]:
    """MassBank record MSSJ-MSJ00076, 5,11-dimethylpentacosane, with a retention index of 2581 (invented)."""
    path = shared / "spectra" / "chains" / "MSBNK-MSSJ-MSJ00076.txt"
    result = run("locate", path, "--index", "2581", "--json", "-")
    assert result.exit_code == 0
    return documents(result.stdout)["results"][0]


def test_weights_and_shares_add_up(record: dict[str, object]) -> None:
    for one in record["hypotheses"]:
        if one["shares"] is not None:
            summed = sum(ion["weight_of_evidence"] for ion in one["ions"])
            assert summed == pytest.approx(one["shares"]["ions"], abs=1e-3)


def test_shares_add_up_to_the_difference_of_the_posteriors(record: dict[str, object]) -> None:
    first, second = record["hypotheses"][:2]
    assert sum(first["shares"].values()) == pytest.approx(
        log2(first["posterior"] / second["posterior"]), abs=0.3
    )
    assert sum(second["shares"].values()) == pytest.approx(-sum(first["shares"].values()), abs=1e-3)


def test_an_absent_ion_carries_the_threshold(record: dict[str, object]) -> None:
    ions = record["hypotheses"][0]["ions"]
    assert all(("threshold" in ion) == (ion["observed"] is None) for ion in ions)
    assert any(ion["observed"] is None for ion in ions)


def test_members_use_the_names_of_the_hypotheses(record: dict[str, object]) -> None:
    names = {one["name"] for one in record["hypotheses"]} | {"none of these"}
    assert set(record["credible_set"]["members"]) <= names


def test_fields_come_in_the_published_order(record: dict[str, object]) -> None:
    # The order that users' scripts and eyes rely on; extras may only follow.
    assert list(record)[:6] == ["source", "title", "warnings", "verdict", "credible_set", "hypotheses"]
    assert list(record["hypotheses"][0])[:11] == [
        "name", "shorthand", "chain_class", "backbone_carbons", "methyl_positions", "formula", "smiles",
        "posterior", "log_likelihood", "retention_z", "ions",
    ]  # fmt: skip
    assert list(record["hypotheses"][0]["ions"][0])[:5] == [
        "mz", "carbons", "observed", "expected", "weight_of_evidence",
    ]  # fmt: skip
