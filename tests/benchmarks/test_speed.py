"""Speed against yardsticks measured in the same run, and the limits that a user waits for.

Figures are printed (``pytest -s``) and kept by pytest-benchmark; what is asserted are the limits promised.
"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path
from textwrap import dedent

import numpy as np
import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from branchpos.chain import Chain
from branchpos.cleaning.nominal import to_channels
from branchpos.enumerating import alkane_positions, count_alkanes
from branchpos.ion_series import SeriesBatch
from branchpos.mass_channels import ChannelView
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.parameters import fitted_parameters
from branchpos.reading import read_spectrum
from branchpos.scoring.error_model import fitted_errors
from branchpos.scoring.likelihood import fit_batch
from branchpos.scoring.screening import screen_batch
from branchpos.spectrum import Spectrum
from branchpos.workflow.locate import locate_branches
from branchpos.workflow.method import Method

ERRORS = fitted_errors()
MARGIN, FEWEST, MOST = 14.0, 30, 500
"""Natural-log margin within which chains get the full likelihood, and how many, as in ``workflow.scores``."""


@pytest.fixture(scope="module")
def batch() -> SeriesBatch:
    """All alkanes of 40 carbons with four methyls."""
    rows = alkane_positions(36, 4)
    assert len(rows) == count_alkanes(40, 4)
    return predict_alkanes(fitted_parameters(), 36, rows)


def observed(batch: SeriesBatch, row: int) -> ChannelView:
    """Return one row of the batch as a spectrum cut at 0.3 % with errors of 20 %."""
    rng = np.random.default_rng(4)
    heights = batch.abundance[row] * np.exp(rng.normal(0, 0.2, batch.masses.size))
    kept = heights > 0.003 * heights.max()
    peaks = Spectrum.from_peaks(batch.masses[kept], heights[kept], first_mass=40, last_mass=600)
    return to_channels(peaks)[0].at(batch.masses)


def leading(rough: np.ndarray) -> np.ndarray:
    """Return the rows that ``locate`` gives the full likelihood."""
    within = int(np.clip((rough >= rough.max() - MARGIN).sum(), FEWEST, MOST))
    return np.argpartition(rough, -within)[-within:]


def score(view: ChannelView, batch: SeriesBatch) -> np.ndarray:
    """Screen every chain, then give the leading ones the full likelihood."""
    rows = leading(screen_batch(view, batch, ERRORS))
    return fit_batch(view, batch.take(rows), ERRORS).log_likelihood


def test_scoring_against_a_matrix_vector_product(
    batch: SeriesBatch, benchmark: BenchmarkFixture, quickest
) -> None:
    """H hypotheses by I ions take at most 30 times one numpy product of an H by I array with a vector."""
    view = observed(batch, len(batch) // 3)
    matrix = np.random.default_rng(1).random((len(batch), batch.masses.size))
    vector = np.random.default_rng(2).random(batch.masses.size)
    score(view, batch), matrix @ vector
    scored, product = quickest(lambda: score(view, batch), lambda: matrix @ vector, rounds=25)
    benchmark.extra_info["ratio"] = scored / product
    benchmark.pedantic(score, (view, batch), rounds=1)
    print(f"\n{len(batch)} by {batch.masses.size}: {1e3 * scored:.1f} ms, {scored / product:.1f} products")
    assert scored <= 30 * product


def test_time_grows_no_faster_than_the_hypotheses(batch: SeriesBatch, quickest) -> None:
    """Eight times the chains take at most eight times as long, a quarter allowed for a busy machine."""
    part = batch.take(np.arange(0, len(batch), 8))
    view = observed(batch, 5)
    some, every = quickest(
        lambda: screen_batch(view, part, ERRORS), lambda: screen_batch(view, batch, ERRORS), rounds=25
    )
    growth = (every / some) / (len(batch) / len(part))
    print(f"\n{len(part)}: {1e3 * some:.1f} ms, {len(batch)}: {1e3 * every:.1f} ms, growth {growth:.2f}")
    assert growth <= 1.25


def test_warm_locate_of_a_c27_spectrum(shared: Path, benchmark: BenchmarkFixture, waiting) -> None:
    """MassBank MSBNK-MSSJ-MSJ00076, up to three methyls: at most 60 ms."""
    spectrum = read_spectrum(shared / "spectra" / "chains" / "MSBNK-MSSJ-MSJ00076.txt")
    method = Method(chain=("alkane",), methyls=range(4))
    verdict = locate_branches(spectrum, method)
    assert verdict.considered >= sum(count_alkanes(27, methyls) for methyls in range(4))
    taken = waiting(lambda: locate_branches(spectrum, method))
    benchmark.pedantic(locate_branches, (spectrum, method), rounds=3)
    print(f"\nwarm locate: {1e3 * taken:.1f} ms over {verdict.considered} chains")
    assert taken <= 0.060


_FORTY_CARBONS = dedent(
    """
    import resource, sys, time
    import numpy as np
    from branchpos.enumerating import count_alkanes
    from branchpos.predicting.alkanes import predict_alkanes
    from branchpos.predicting.parameters import fitted_parameters
    from branchpos.spectrum import Spectrum
    from branchpos.workflow.locate import locate_branches
    from branchpos.workflow.method import Method

    batch = predict_alkanes(fitted_parameters(), 36, np.array([[7, 13, 19, 25]], dtype=np.int16))
    heights = batch.abundance[0] * np.exp(np.random.default_rng(3).normal(0, 0.2, batch.masses.size))
    kept = heights > 0.002 * heights.max()
    spectrum = Spectrum.from_peaks(batch.masses[kept], heights[kept], first_mass=40, last_mass=600)
    method = Method(chain=("alkane",), carbons=range(40, 41))
    clock, processor = time.perf_counter(), time.process_time()
    verdict = locate_branches(spectrum, method)
    taken = min(time.perf_counter() - clock, time.process_time() - processor)
    every = sum(count_alkanes(40, methyls) for methyls in range(5))
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    print(taken, peak / (1024 if sys.platform != "darwin" else 1024**2), verdict.considered >= every)
    """
)


def test_forty_carbons_with_up_to_four_methyls() -> None:
    """All of them in one cold ``locate``: at most 2 s and 500 MB (median of three processes)."""
    runs = [
        subprocess.run(
            [sys.executable, "-c", _FORTY_CARBONS], capture_output=True, text=True, check=True
        ).stdout.split()
        for _ in range(3)
    ]
    seconds = float(np.median([float(run[0]) for run in runs]))
    megabytes = max(float(run[1]) for run in runs)
    print(f"\n40 carbons, 0 to 4 methyls: {seconds:.2f} s, {megabytes:.0f} MB")
    assert all(run[2] == "True" for run in runs)
    assert seconds <= 2.0
    assert megabytes <= 500


def test_help_is_quick(quickest) -> None:
    """At most twice the time of importing numpy, runs alternated."""

    def run(*arguments: str) -> None:
        subprocess.run([sys.executable, *arguments], capture_output=True, check=True)

    helped, imported = quickest(
        lambda: run("-m", "branchpos", "--help"), lambda: run("-c", "import numpy"), rounds=25
    )
    print(f"\n--help {1e3 * helped:.0f} ms, import numpy {1e3 * imported:.0f} ms")
    assert helped <= 2 * imported


def test_the_planted_chain_is_among_the_fitted(batch: SeriesBatch) -> None:
    """The speed is that of scoring which finds what it should."""
    row = len(batch) // 3
    view = observed(batch, row)
    rows = leading(screen_batch(view, batch, ERRORS))
    assert row in rows and len(rows) < MOST
    assert batch.chain(row) == Chain(36, tuple(batch.positions[row].tolist()))
