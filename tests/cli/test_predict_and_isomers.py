"""``branchpos predict`` and ``branchpos isomers``: text, JSON, figures."""

from __future__ import annotations

import json
from pathlib import Path

import jsonschema
import pytest

from branchpos.reporting.records import schema
from tests.cli.conftest import Run


def test_predict_prints_index_and_ions(run: Run) -> None:
    text = run("predict", "5,11-diMeC25").stdout
    assert "5,11-dimethylpentacosane" in text
    assert "C27H56" in text
    assert "C11|C12" in text


def test_predict_json_keeps_its_schema_and_the_order_of_names(run: Run) -> None:
    found = json.loads(run("predict", "2-MeC26", "n-C20", "CCC(C)CCCCCC", "--json", "-").stdout)
    jsonschema.Draft202012Validator(schema("predict")).validate(found)
    assert [one["shorthand"] for one in found["results"]] == ["2-MeC26", "n-C20", "3-MeC9"]
    for one in found["results"]:
        masses = [ion["mz"] for ion in one["ions"]]
        assert masses == sorted(set(masses))
        assert max(ion["expected"] for ion in one["ions"]) == 1
        assert all(ion["low"] <= ion["expected"] <= ion["high"] for ion in one["ions"])
        assert min(ion["expected"] for ion in one["ions"]) >= 1e-3


def test_predict_draws(tmp_path: Path, run: Run) -> None:
    assert run("predict", "5-MeC14", "--quiet", "--figure", tmp_path / "one.pdf").exit_code == 0
    assert (tmp_path / "one.pdf").read_bytes().startswith(b"%PDF")


def test_isomers_lists_each_structure_once(run: Run) -> None:
    lines = run("isomers", "--carbons", "12", "--methyls", "2", "--smiles").stdout.splitlines()
    names = [line.split()[0] for line in lines[2:]]
    assert lines[0].startswith(f"{len(names)} structures")
    assert len(set(names)) == len(names)


def test_isomers_json_keeps_its_schema(run: Run) -> None:
    found = json.loads(run("isomers", "--carbons", "12", "--methyls", "0-2", "--json", "-").stdout)
    jsonschema.Draft202012Validator(schema("isomers")).validate(found)
    assert len(found["results"]) == found["count"]
    assert len({one["smiles"] for one in found["results"]}) == found["count"]


@pytest.mark.parametrize("carbons", ["5"])
def test_a_structure_without_isomers_has_no_nearest(carbons: str, run: Run) -> None:
    found = json.loads(run("isomers", "--carbons", carbons, "--methyls", "0", "--json", "-").stdout)
    jsonschema.Draft202012Validator(schema("isomers")).validate(found)
    assert [one["nearest"] for one in found["results"]] == [None]


def test_too_many_isomers_are_listed_without_comparison(run: Run) -> None:
    lines = run("isomers", "--carbons", "31", "--methyls", "3").stdout.splitlines()
    count = int(lines[0].split()[0])
    if count > 5000:
        assert "too many" in lines[0]
    more = run("isomers", "--carbons", "33", "--methyls", "4").stdout.splitlines()
    assert "too many" in more[0]
    assert len(more) - 2 == int(more[0].split()[0])
