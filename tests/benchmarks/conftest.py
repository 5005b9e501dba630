"""Timing side by side, so that a busy machine slows the work and its yardstick alike."""

from __future__ import annotations

from collections.abc import Callable
from statistics import median
from time import perf_counter

import pytest

Medians = Callable[..., list[float]]


@pytest.fixture(scope="session")
def medians() -> Medians:
    """Return a function that runs several callables in turn and gives the median time [s] of each."""

    def measure(*functions: Callable[[], object], rounds: int = 7) -> list[float]:
        times: list[list[float]] = [[] for _ in functions]
        for _ in range(rounds):
            for function, taken in zip(functions, times, strict=True):
                start = perf_counter()
                function()
                taken.append(perf_counter() - start)
        return [median(taken) for taken in times]

    return measure
