"""Timing side by side, so that a busy machine slows the work and its yardstick alike."""

from __future__ import annotations

from collections.abc import Callable
from statistics import median
from time import perf_counter, process_time

import pytest

Medians = Callable[..., list[float]]
Waiting = Callable[..., float]


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


@pytest.fixture(scope="session")
def waiting() -> Waiting:
    """Return a function that gives the median time [s] for which a user waits for a call on an idle machine.

    On a busy one the clock runs on while other programs have the processor; the processor time does not,
    but counts every core. The smaller of the two is the better estimate.
    """

    def measure(function: Callable[[], object], rounds: int = 21) -> float:
        times: list[float] = []
        for _ in range(rounds):
            clock, processor = perf_counter(), process_time()
            function()
            times.append(min(perf_counter() - clock, process_time() - processor))
        return median(times)

    return measure
