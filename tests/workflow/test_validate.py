"""Validation on a few real records, copied at test time; and the checks that keep data apart."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from branchpos.chain import Chain
from branchpos.errors import InputError, OverlapError
from branchpos.predicting.retention_fit import IndexRow
from branchpos.verdict import RankedHypothesis, Status, Verdict
from branchpos.workflow.false_claims import score_others
from branchpos.workflow.held_out import (
    fit_without,
    model_of,
    refuse_overlap,
    retention_without,
    shipped_start,
)
from branchpos.workflow.known_scores import IndexKnowledge
from branchpos.workflow.record_scores import compare, confident_error
from branchpos.workflow.reference_spectra import read_known_spectra
from branchpos.workflow.validate import run_validate
from branchpos.workflow.yardsticks import count_ions, nearest_spectrum, same_branching

TOKYO = "MSBNK-Fac_Eng_Univ_Tokyo-"
FEW = (f"{TOKYO}JP006878", f"{TOKYO}JP006881", f"{TOKYO}JP007581", "MSBNK-MSSJ-MSJ00076")
"""Dodecane, tetradecane, farnesane (sparse) and 5,11-dimethylpentacosane."""


@pytest.fixture(scope="module")
def few(shared: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with four known records and two spectra of other compounds."""
    folder = tmp_path_factory.mktemp("few")
    lines = (shared / "spectra" / "truth.csv").read_text(encoding="utf-8").splitlines(keepends=True)
    kept = [lines[0], *(line for line in lines if line.startswith(tuple(f"{name}," for name in FEW)))]
    (folder / "truth.csv").write_text("".join(kept), encoding="utf-8")
    for name in FEW:
        shutil.copy(shared / "spectra" / "chains" / f"{name}.txt", folder)
    (folder / "others").mkdir()
    for path in sorted((shared / "spectra" / "others").glob("*.txt"))[:2]:
        shutil.copy(path, folder / "others")
    return folder


@pytest.fixture(scope="module")
def table(tmp_path_factory: pytest.TempPathFactory, shared: Path) -> Path:
    """A table of a few measured indices, 5,11-dimethylpentacosane among them."""
    lines = (shared / "retention" / "methylalkanes.csv").read_text(encoding="utf-8").splitlines(keepends=True)
    path = tmp_path_factory.mktemp("indices") / "indices.csv"
    kept = {*lines[1::12], *(line for line in lines if line.startswith("25,5 11,"))}
    path.write_text(lines[0] + "".join(line for line in lines[1:] if line in kept), encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def outcome(
    few: Path, table: Path, tmp_path_factory: pytest.TempPathFactory
) -> tuple[Path, list[tuple[int, int]]]:
    told: list[tuple[int, int]] = []
    out = tmp_path_factory.mktemp("validation")
    run_validate(few, table, out, lambda done, total: told.append((done, total)), workers=1)
    return out, told


@pytest.fixture(scope="module")
def record(outcome: tuple[Path, list[tuple[int, int]]]) -> dict[str, Any]:
    loaded: dict[str, Any] = json.loads((outcome[0] / "validation.json").read_text(encoding="utf-8"))
    return loaded


def test_every_known_record_is_scored_and_progress_is_told(
    outcome: tuple[Path, list[tuple[int, int]]], record: dict[str, Any]
) -> None:
    assert record["format"] == "branchpos.validation/1"
    assert sorted(one["accession"] for one in record["records"]) == sorted(FEW)
    told = outcome[1]
    assert [done for done, _ in told] == list(range(1, told[-1][1] + 1))


def test_each_compound_was_left_out_of_its_own_fit(record: dict[str, Any]) -> None:
    by_name = {one["name"]: one for one in record["fits"]["compounds"]}
    assert by_name["dodecane"]["refitted"]
    assert by_name["5,11-dimethylpentacosane"]["cold"]
    assert not by_name["2,6,10-trimethyldodecane"]["refitted"], "a sparse record takes part in no fit"


def test_only_known_indices_are_added(record: dict[str, Any]) -> None:
    by_name = {one["truth"]: one for one in record["records"]}
    assert by_name["dodecane"]["index"] == 1200.0
    # Liang, Yuan, Xu and Kvalheim, J. Chemometrics 22 (2008) 23-35, as shared/retention states it.
    assert by_name["5,11-dimethylpentacosane"]["index"] == 2580.5
    assert by_name["2,6,10-trimethyldodecane"]["with_index"] is None
    assert record["index"]["no_index_known_for"] == ["2,6,10-trimethyldodecane"]


def test_counts_agree_with_the_records(record: dict[str, Any]) -> None:
    straight = [one for one in record["records"] if one["methyls"] == 0]
    summary = record["summary"]["unbranched"]
    assert summary["records"] == len(straight) == 2
    assert summary["truth_in_set"] == sum(one["alone"]["in_set"] for one in straight)
    assert record["others"]["records"] == sum(record["others"]["statuses"].values()) == 2
    shares = [one["unbranched"] + one["branched"] for one in record["coverage"]]
    assert shares == sorted(shares), "a higher level cannot hold the truth less often"


def test_text_and_figure_show_the_command_and_no_machine_path(
    outcome: tuple[Path, list[tuple[int, int]]],
) -> None:
    out = outcome[0]
    text = (out / "validation.md").read_text(encoding="utf-8")
    assert "branchpos validate few" in text
    assert str(out.parent) not in text
    assert all(name in text for name in FEW)
    assert (out / "validation.svg").read_text(encoding="utf-8").startswith("<?xml")


def test_a_model_may_not_score_what_it_was_fitted_to(few: Path) -> None:
    known = read_known_spectra(few)
    dodecane = Chain(12)
    without = model_of(fit_without(known, dodecane, shipped_start()).fit)
    refuse_overlap([FEW[0]], without)
    with pytest.raises(OverlapError, match="JP006881 took part in the fit"):
        refuse_overlap([FEW[1]], without)


def test_other_compounds_may_not_have_taken_part_either(few: Path) -> None:
    fit = fit_without(read_known_spectra(few), Chain(12), shipped_start()).fit
    with pytest.raises(OverlapError, match="MSJ00076"):
        score_others([few / "MSBNK-MSSJ-MSJ00076.txt"], fit)


def test_all_records_of_a_compound_leave_together(shared: Path) -> None:
    known = read_known_spectra(shared / "spectra")
    chain = Chain(25, (5, 11))
    kept = [one for one in known if one.chain in (chain, Chain(10))]
    provenance = fit_without(kept, chain, shipped_start()).fit.parameters.provenance
    assert "MSJ" not in provenance["accessions"]
    assert provenance["left_out"].split() == ["MSBNK-MSSJ-MSJ00076", "MSBNK-MSSJ-MSJ00078"]


def test_one_compound_cannot_be_left_out_of_itself(shared: Path, tmp_path: Path) -> None:
    lines = (shared / "spectra" / "truth.csv").read_text(encoding="utf-8").splitlines(keepends=True)
    kept = [line for line in lines if line.startswith(("accession", f"{FEW[0]},"))]
    (tmp_path / "truth.csv").write_text("".join(kept), encoding="utf-8")
    shutil.copy(shared / "spectra" / "chains" / f"{FEW[0]}.txt", tmp_path)
    with pytest.raises(InputError, match="leaves nothing to fit to"):
        run_validate(tmp_path, None, tmp_path / "out", workers=1)


def test_a_missing_table_is_named(few: Path, tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"absent\.csv: no table of retention indices"):
        run_validate(few, tmp_path / "absent.csv", tmp_path, workers=1)


def test_the_index_of_a_left_out_compound_takes_no_part() -> None:
    rows = [IndexRow(25, (at,), 2500 + 30 + at / 10) for at in range(4, 13)]
    chain = Chain(25, (5,))
    with_it, without = (
        IndexKnowledge(tuple(rows), retention_without(rows, Chain(9))),
        retention_without(rows, chain),
    )
    assert with_it.index_of(chain) == (2530.5, "measured")
    assert with_it.index_of(Chain(25, (2,))) is None
    assert without.provenance["compounds"] == len(rows) - 1
    left = with_it.without(chain)
    assert left is not None and left.provenance["compounds"] == len(rows) - 1


Maker = Callable[..., Verdict]


@pytest.fixture
def verdict_of() -> Maker:
    """Make a verdict from chains with their probabilities."""

    def make(*ranked: tuple[Chain, float], none: float = 0.0, status: Status = Status.OPEN) -> Verdict:
        hypotheses = tuple(RankedHypothesis(chain, p, 0.0, None) for chain, p in ranked)
        names = tuple(one.name for one in hypotheses[:1])
        return Verdict(
            "", "", status, "", hypotheses, len(ranked), none, (), 0.95, names, "flat", (), ()
        )  # fmt: skip

    return make


def test_the_mass_above_the_truth_decides_which_levels_hold_it(verdict_of: Maker) -> None:
    verdict = verdict_of((Chain(20, (3,)), 0.5), (Chain(20, (4,)), 0.2), (Chain(20, (5,)), 0.1), none=0.15)
    assert compare(verdict, Chain(20, (3,))).mass_above == 0.0
    assert compare(verdict, Chain(20, (4,))).mass_above == pytest.approx(0.5)
    assert compare(verdict, Chain(20, (5,))).mass_above == pytest.approx(0.85), (
        "none of these comes before it"
    )
    untried = compare(verdict, Chain(20, (9,)))
    assert (untried.rank, untried.posterior, untried.mass_above) == (None, 0.0, 1.0)


@pytest.mark.parametrize(
    ("ranked", "none", "truth", "said"),
    [
        ([(Chain(20, (3,)), 0.95)], 0.05, Chain(20, (4,)), "3-methylicosane at 0.950"),
        ([(Chain(20), 0.95)], 0.05, Chain(20, (4,)), "unbranched at 0.950"),
        ([(Chain(20, (3,)), 0.5), (Chain(20, (4,)), 0.45)], 0.05, Chain(21), "branched at 0.950"),
        ([(Chain(20, (4,)), 0.05)], 0.95, Chain(20, (4,)), "no chain at 0.950"),
        ([(Chain(20, (3,)), 0.95)], 0.05, Chain(20, (3,)), None),
        ([(Chain(20, (3,)), 0.6)], 0.4, Chain(20, (4,)), None),
    ],
)
def test_confident_errors_are_named(
    verdict_of: Maker, ranked: list[tuple[Chain, float]], none: float, truth: Chain, said: str | None
) -> None:
    assert confident_error(compare(verdict_of(*ranked, none=none), truth), truth) == said


def test_yardsticks_on_a_real_record(few: Path) -> None:
    known = read_known_spectra(few)
    branched = next(one for one in known if one.chain == Chain(25, (5, 11)))
    nearest = nearest_spectrum(branched, known)
    assert nearest is not None and nearest.chain != branched.chain and 0 < nearest.cosine < 1
    assert not same_branching(branched.chain, nearest.chain)
    counted = count_ions(branched, model_of(shipped_start()))
    assert 1 <= counted.rank_among_alike <= counted.rank <= counted.candidates
    # 5,14-dimethylpentacosane has the same ion sizes (6, 13, 16, 23 carbons): counting cannot part them.
    assert counted.rank_among_alike > 1
