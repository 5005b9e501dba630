"""Work side by side: results, faults and settings of the environment."""

from __future__ import annotations

import math
import os

import pytest

from branchpos.errors import OverlapError
from branchpos.workflow.work_pool import count_done, open_pool


def refuse(name: str) -> None:
    raise OverlapError(f"{name} took part in the fit")


@pytest.mark.parametrize("workers", [1, 2])
def test_results_come_back_in_order_and_are_counted(workers: int) -> None:
    told: list[tuple[int, int]] = []
    with open_pool(workers) as pool:
        futures = [pool.submit(math.factorial, number) for number in (3, 4, 5)]
        count_done(futures, lambda done, total: told.append((done, total)))
        assert [future.result() for future in futures] == [6, 24, 120]
    assert told == [(1, 3), (2, 3), (3, 3)]


def test_a_fault_in_the_work_is_raised_and_the_environment_restored(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("OMP_NUM_THREADS", "7")
    monkeypatch.delenv("MKL_NUM_THREADS", raising=False)
    with pytest.raises(OverlapError, match="JP1 took part"), open_pool(1) as pool:
        pool.submit(refuse, "JP1").result()
    with pytest.raises(ValueError, match="negative"), open_pool(2) as pool:
        assert os.environ["OMP_NUM_THREADS"] == "1"
        count_done([pool.submit(math.factorial, -1)], lambda done, total: None)
    assert os.environ["OMP_NUM_THREADS"] == "7"
    assert "MKL_NUM_THREADS" not in os.environ
