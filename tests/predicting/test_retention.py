"""The retention model keeps its symmetries, its promised errors, and reproduces from the measured indices."""

from __future__ import annotations

import json
import time
from collections.abc import Callable
from itertools import combinations
from pathlib import Path

import numpy as np
import pytest

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.errors import FormatError, ReferenceDataError, SettingsError
from branchpos.predicting.retention import (
    parameters_from_record,
    predict_retention,
    retention_index_of,
    shipped_parameters,
)
from branchpos.predicting.retention_fit import (
    IndexRow,
    LeftOutScore,
    cross_validate_retention,
    fit_retention,
    read_index_rows,
    record_of,
)
from branchpos.reference_data import load_reference


@pytest.fixture(scope="module")
def rows(shared: Path) -> list[IndexRow]:
    return read_index_rows(shared / "retention" / "methylalkanes.csv")


@pytest.fixture(scope="module")
def score(rows: list[IndexRow]) -> LeftOutScore:
    return cross_validate_retention(rows)


def test_left_out_compounds_lie_as_close_as_promised(score: LeftOutScore) -> None:
    # Medians promised for one to four methyls; ten-fold by compound, mean over ten splits, which vary by 0.1.
    promised = {1: 0.7, 2: 1.5, 3: 1.9, 4: 2.0}
    assert {k: v for k, v in score.median_error.items() if v > promised[k]} == {}


def test_left_out_root_mean_squares_beat_a_ridge_fit(score: LeftOutScore) -> None:
    # 1.4, 3.2, 3.7, 5.6 units: a ridge fit of simple position and spacing terms to the same compounds.
    ridge = {1: 1.4, 2: 3.2, 3: 3.7, 4: 5.6}
    assert {k: v for k, v in score.rms_error.items() if v >= ridge[k]} == {}


def test_intervals_hold_as_many_left_out_compounds_as_they_say(score: LeftOutScore) -> None:
    assert 0.92 <= score.overall_coverage <= 0.98


def test_a_value_at_odds_with_its_neighbours_is_named(score: LeftOutScore) -> None:
    # 5,21-dimethylheptacosane at 2772.5 lies 16 below what its two single methyls add up to, where 5,19 and
    # 5,17 on chains of like length lie within 5; the compilation may have misprinted it.
    assert score.suspects[0][0] == IndexRow(27, (5, 21), 2772.5)


def test_a_planted_misprint_does_not_pull_the_fit(rows: list[IndexRow]) -> None:
    wrong = [IndexRow(r.backbone, r.methyls, r.index + 60 * (r == rows[0])) for r in rows]
    assert rows[0] != wrong[0]
    clean, pulled = (fit_retention(these) for these in (rows[1:], wrong))
    probe = np.array([[2], [3], [5]])
    assert predict_retention(probe, 15, pulled)[0] == pytest.approx(
        predict_retention(probe, 15, clean)[0], abs=1.0
    )


def test_shipped_parameters_come_out_again(rows: list[IndexRow]) -> None:
    again = fit_retention(rows)
    positions = np.array([[3, 7, 11], [5, 13, 17], [2, 10, 16], [13, 17, 21]])
    for shipped, fitted in zip(
        predict_retention(positions, 33), predict_retention(positions, 33, again), strict=True
    ):
        assert fitted == pytest.approx(shipped, abs=0.05)
    assert shipped_parameters().provenance["compounds"] == len(rows)


def test_a_record_reads_back_as_written(rows: list[IndexRow]) -> None:
    fitted = fit_retention(rows[:80])
    read = parameters_from_record(json.loads(json.dumps(record_of(fitted))))
    probe = np.array([[5, 11], [4, 8]])
    for before, after in zip(
        predict_retention(probe, 27, fitted), predict_retention(probe, 27, read), strict=True
    ):
        assert after == pytest.approx(before, abs=0.01)


def test_parameters_of_other_terms_are_refused() -> None:
    record = load_reference("retention.json")["alkanes"] | {"groups": [["something else", 1]]}
    with pytest.raises(ReferenceDataError, match="refit"):
        parameters_from_record(record)


@pytest.mark.parametrize("methyls", [1, 2, 3, 4, 5])
def test_either_end_may_be_counted_from(methyls: int) -> None:
    rng = np.random.default_rng(methyls)
    rows = np.sort(rng.choice(np.arange(2, 27), (50, methyls)), axis=1)
    mirror = 28 - rows[:, ::-1]
    for one, other in zip(predict_retention(rows, 27), predict_retention(mirror, 27), strict=True):
        assert other == pytest.approx(one, abs=1e-3)


def test_many_at_once_equal_one_at_a_time() -> None:
    rows = np.array(list(combinations(range(2, 27, 3), 3)))
    mean, sd = predict_retention(rows, 27)
    alone = [predict_retention(row[None], 27) for row in rows]
    assert mean == pytest.approx([m[0] for m, _ in alone], abs=1e-3)
    assert sd == pytest.approx([s[0] for _, s in alone], abs=1e-3)


@pytest.mark.parametrize("carbons", [8, 27, 45])
def test_unbranched_chains_define_the_scale(carbons: int) -> None:
    # Kovats, Helv. Chim. Acta 41 (1958) 1915: the index of an n-alkane is 100 times its carbons.
    mean, sd = predict_retention(np.empty((1, 0), dtype=int), carbons)
    assert (mean[0], sd[0]) == (100.0 * carbons, 0.0)
    assert retention_index_of(Chain(carbons)).interval() == pytest.approx((100 * carbons,) * 2, abs=1e-4)


@pytest.mark.parametrize("backbone", [9, 14, 27, 31, 41])
def test_single_methyls_rank_as_the_trade_knows(backbone: int) -> None:
    # Common practice on methyl silicone: 3-methyl elutes last, then 2-, 4- and 5-methyl.
    mean, _ = predict_retention(np.array([[3], [2], [4], [5]]), backbone)
    assert (np.diff(mean) < 0).all()


def test_a_methyl_is_worth_less_than_a_carbon_in_line() -> None:
    for methyls in (1, 2, 3, 4):
        rows = np.array(list(combinations(range(2, 25, 2), methyls)))
        mean, sd = predict_retention(rows, 27)
        assert ((mean > 2700) & (mean < 2700 + 100 * methyls)).all()
        assert (sd > 0).all()


def test_far_apart_methyls_nearly_add_up() -> None:
    single, _ = predict_retention(np.array([[3], [17]]), 33)
    both, sd = predict_retention(np.array([[3, 17]]), 33)
    assert both[0] - 3300 == pytest.approx((single - 3300).sum(), abs=3 * sd[0])


@pytest.mark.parametrize(
    ("backbone", "methyls", "low", "high"),
    [
        # From memory, methyl silicone phases; none took part in the fit.
        (12, (2, 6, 10), 1375, 1380),  # farnesane
        (15, (2, 6, 10, 14), 1705, 1710),  # pristane
        (16, (2, 6, 10, 14), 1805, 1811),  # phytane
        (8, (4,), 863, 864),  # 4-methyloctane
        (9, (5,), 957, 961),  # 5-methylnonane
    ],
)
def test_outside_the_fitted_range_the_interval_is_honest(
    backbone: int, methyls: tuple[int, ...], low: float, high: float
) -> None:
    index = retention_index_of(Chain(backbone, methyls))
    bottom, top = index.interval(0.95)
    assert bottom < high and low < top
    assert abs(index.value - (low + high) / 2) < 12


def test_unseen_patterns_are_trusted_less() -> None:
    _, sd = predict_retention(np.array([[7, 11], [5, 6], [5, 5]]), 31)
    assert sd[1] > 3 * sd[0] and sd[2] > 3 * sd[0]
    assert retention_index_of(Chain(24, (2, 6, 10, 15, 19, 23))).sd > 15


@pytest.mark.parametrize(
    ("positions", "remedy"),
    [([[1, 5]], "2 to 24"), ([[5, 25]], "2 to 24"), ([[11, 5]], "sort"), ([5, 11], "one row")],
)
def test_bad_positions_are_refused(positions: list[object], remedy: str) -> None:
    with pytest.raises(SettingsError, match=remedy):
        predict_retention(np.array(positions), 25)


def test_other_classes_have_no_alkane_index() -> None:
    with pytest.raises(SettingsError, match="'alcohol'"):
        retention_index_of(Chain(16, (15,), END_GROUPS["alcohol"]))


@pytest.mark.parametrize(
    "text",
    [
        "backbone_carbons,methyl_positions\n9,2\n",
        "backbone_carbons,methyl_positions,retention_index\n9,2,high\n",
    ],
)
def test_unreadable_tables_name_file_and_line(tmp_path: Path, text: str) -> None:
    table = tmp_path / "indices.csv"
    table.write_text(text)
    with pytest.raises(FormatError, match="no retention index") as caught:
        read_index_rows(table)
    assert "indices.csv: line 2:" in str(caught.value)


def test_all_tetramethyl_chains_of_one_backbone_are_quick() -> None:
    rows = np.array(list(combinations(range(2, 32), 4)))
    predict_retention(rows[:1], 32)
    yard = np.random.default_rng(1).random((len(rows), 100))

    def seconds(job: Callable[[], object]) -> float:
        start = time.perf_counter()
        job()
        return time.perf_counter() - start

    ours = min(seconds(lambda: predict_retention(rows, 32)) for _ in range(9))
    yardstick = min(seconds(lambda: np.sort(yard, axis=1)) for _ in range(9))
    assert ours < 4 * yardstick
