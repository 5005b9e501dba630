"""The JSON formats: their schemas are strict, and hold for what the program writes."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import jsonschema
import pytest

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.errors import SettingsError
from branchpos.reporting.records import (
    chain_record,
    locate_document,
    predict_document,
    schema,
    verdict_record,
    write_document,
)
from branchpos.verdict import RankedHypothesis, Status, Verdict


def verdict(*ranked: RankedHypothesis) -> Verdict:
    return Verdict(
        "a.txt", "", Status.NOT_A_CHAIN, "another compound", ranked, 0, 1.0,
        (("another compound", 1.0),), 0.95, ("none of these",), "flat", (), (),
    )  # fmt: skip


def valid(name: str, document: Any) -> bool:
    return bool(jsonschema.Draft202012Validator(schema(name)).is_valid(document))


@pytest.mark.parametrize("name", ["locate", "predict", "isomers"])
def test_schemas_are_valid_and_strict_all_the_way_down(name: str) -> None:
    jsonschema.Draft202012Validator.check_schema(schema(name))
    pending = [schema(name)]
    while pending:
        part = pending.pop()
        if "properties" in part and "type" in part:
            assert part["additionalProperties"] is False
            assert set(part["required"]) <= set(part["properties"])
        pending += [value for value in part.values() if isinstance(value, dict)]


def test_an_unknown_schema_is_refused() -> None:
    with pytest.raises(SettingsError, match="locate, predict, isomers"):
        schema("reports")


def test_empty_results_are_valid() -> None:
    assert valid("locate", locate_document([], "flat"))
    assert valid("predict", predict_document([]))


def test_a_verdict_without_hypotheses_or_evidence_is_valid() -> None:
    bare = RankedHypothesis(Chain(25, (5, 11)), 0.0, -1.5, None)
    assert valid("locate", locate_document([verdict_record(verdict())], "flat"))
    assert valid("locate", locate_document([verdict_record(verdict(bare))], "flat"))


def test_the_schema_refuses_a_misspelt_field_and_a_missing_threshold() -> None:
    document = locate_document([verdict_record(verdict())], "flat")
    document["results"][0]["titel"] = "x"
    assert not valid("locate", document)
    bare = verdict_record(verdict(RankedHypothesis(Chain(25, (5, 11)), 0.5, -1.5, None)))
    ion = {
        "mz": 85,
        "carbons": 6,
        "observed": None,
        "expected": 0.1,
        "weight_of_evidence": 0.2,
        "cleavage": "",
    }
    bare["hypotheses"][0]["ions"] = [ion]
    assert not valid("locate", locate_document([bare], "flat"))
    bare["hypotheses"][0]["ions"] = [ion | {"threshold": 0.01}]
    assert valid("locate", locate_document([bare], "flat"))


def test_classes_in_the_schemas_are_those_of_the_program() -> None:
    listed = schema("locate")["$defs"]["hypothesis"]["properties"]["chain_class"]["enum"]
    assert set(listed) == set(END_GROUPS)


def test_an_alkene_has_no_line_notation() -> None:
    assert chain_record(Chain(20, (), END_GROUPS["alkene"]))["smiles"] is None


def test_documents_are_written_as_utf_8_and_without_nan(tmp_path: Path) -> None:
    path = tmp_path / "out.json"
    write_document(locate_document([], "flät"), path)
    assert json.loads(path.read_text(encoding="utf-8"))["prior"] == "flät"
    with pytest.raises(ValueError, match="JSON"):
        write_document({"value": float("nan")}, path)
