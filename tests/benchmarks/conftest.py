"""Timing side by side, so that a busy machine slows the work and its yardstick alike."""

from __future__ import annotations

from collections.abc import Callable
from time import perf_counter, process_time

import numpy as np
import pytest

Quickest = Callable[..., list[float]]
Waiting = Callable[..., float]

_YARDSTICK_SECONDS = 0.0026
"""What the yardstick below takes at best on the two-core machine that the limits were set on."""


@pytest.fixture(scope="session")
def quickest() -> Quickest:
    """Return a function that runs several callables in turn and gives the least time [s] of each.

    Other programs can only lengthen a run, so that the quickest of many tells most of the program itself.
    """

    def measure(*functions: Callable[[], object], rounds: int = 7) -> list[float]:
        times: list[list[float]] = [[] for _ in functions]
        for _ in range(rounds):
            for function, taken in zip(functions, times, strict=True):
                start = perf_counter()
                function()
                taken.append(perf_counter() - start)
        return [min(taken) for taken in times]

    return measure


def yardstick() -> float:
    """Return a sum that costs a fixed amount of numpy's and the interpreter's time."""
    table = np.linspace(0.1, 2.0, 8192)
    return float(sum(np.log(table + step).sum() for step in range(60)))


@pytest.fixture(scope="session")
def waiting() -> Waiting:
    """Return a function that gives the time [s] a user waits for a call on the machine of the limits.

    The least of many runs, where the processor time stands in for the clock if it is smaller, divided by how
    much slower than there the yardstick runs here, in turn with the call.
    """

    def measure(function: Callable[[], object], rounds: int = 21) -> float:
        calls: list[float] = []
        sticks: list[float] = []
        for _ in range(rounds):
            for work, times in ((function, calls), (yardstick, sticks)):
                clock, processor = perf_counter(), process_time()
                work()
                times.append(min(perf_counter() - clock, process_time() - processor))
        return min(calls) / max(1.0, min(sticks) / _YARDSTICK_SECONDS)

    return measure
