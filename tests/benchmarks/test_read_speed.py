"""How long reading a run takes, against unpacking alone, and how much memory, against its arrays."""

from __future__ import annotations

import base64
import tracemalloc
import zlib
from collections.abc import Callable
from pathlib import Path
from xml.etree import ElementTree as ET

import numpy as np
import pytest

from branchpos.reading import read_run

SCANS = 3000
Quickest = Callable[..., list[float]]
Waiting = Callable[..., float]


def spectrum(at: int, rng: np.random.Generator) -> str:
    """Return one scan of about 175 peaks as converters write it."""
    mz = np.arange(45.05, 600)[rng.random(555) < 175 / 555]
    arrays = ""
    for values, kind in ((mz, "MS:1000514"), (rng.exponential(2e4, mz.size), "MS:1000515")):
        text = base64.b64encode(zlib.compress(values.tobytes())).decode()
        terms = "".join(
            f'<cvParam cvRef="MS" accession="{one}"/>' for one in ("MS:1000523", "MS:1000574", kind)
        )
        arrays += (
            f'<binaryDataArray encodedLength="{len(text)}">{terms}<binary>{text}</binary></binaryDataArray>'
        )
    terms = "".join(
        f'<cvParam cvRef="MS" accession="{one}" value="{value}"/>'
        for one, value in (("MS:1000579", ""), ("MS:1000511", 1), ("MS:1000130", ""), ("MS:1000127", ""))
    )
    time = f'<cvParam cvRef="MS" accession="MS:1000016" value="{at + 1}" unitAccession="UO:0000010"/>'
    return (
        f'<spectrum index="{at}" id="scan={at + 1}" defaultArrayLength="{mz.size}">{terms}'
        f'<scanList count="1"><scan>{time}</scan></scanList>'
        f'<binaryDataArrayList count="2">{arrays}</binaryDataArrayList></spectrum>\n'
    )


def write_mzml(path: Path, scans: int) -> Path:
    rng = np.random.default_rng(1)
    body = "".join(spectrum(at, rng) for at in range(scans))
    path.write_text(
        '<?xml version="1.0"?>\n<mzML xmlns="http://psi.hupo.org/ms/mzml" version="1.1.0">'
        f'<run id="r"><spectrumList count="{scans}">{body}</spectrumList></run></mzML>'
    )
    return path


@pytest.fixture(scope="module")
def mzml(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write_mzml(tmp_path_factory.mktemp("speed") / "run", SCANS)


def unpack_only(path: Path) -> int:
    """Do what no reader can leave out: parse the XML, undo base64 and zlib."""
    size = 0
    for _, element in ET.iterparse(path):
        if element.tag.endswith("}binary"):
            size += len(zlib.decompress(base64.b64decode(element.text or "")))
        element.clear()
    return size


def test_mzml_takes_little_more_than_unpacking_it(mzml: Path, quickest: Quickest, waiting: Waiting) -> None:
    ours, bare = quickest(lambda: read_run(mzml), lambda: unpack_only(mzml), rounds=3)
    alone = waiting(lambda: read_run(mzml), rounds=3)
    print(f"\nmzML of {SCANS} scans: {alone:.2f} s, {ours / bare:.1f} times parsing and unpacking alone")
    assert ours < 4 * bare


def test_reading_mzml_holds_three_times_the_arrays_at_most(mzml: Path) -> None:
    tracemalloc.start()
    run = read_run(mzml)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    arrays = run.mz.nbytes + run.intensity.nbytes + run.times.nbytes + run.offsets.nbytes
    print(f"\nmzML of {SCANS} scans: {peak / arrays:.2f} times the {arrays / 1e6:.1f} MB of the run's arrays")
    assert peak < 3 * arrays


def test_mzml_reading_time_is_linear(tmp_path: Path, quickest: Quickest) -> None:
    short, long = (write_mzml(tmp_path / f"run{scans}", scans) for scans in (300, 1200))
    few, many = quickest(lambda: read_run(short), lambda: read_run(long), rounds=5)
    print(f"\n4 times the scans take {many / few:.1f} times as long")
    assert many / few < 6.5


def test_the_real_netcdf_run(shared: Path, waiting: Waiting) -> None:
    path = shared / "runs" / "sediment_pyrolysate.cdf"
    run = read_run(path)
    reading = waiting(lambda: read_run(path), rounds=5)
    tracemalloc.start()
    read_run(path)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    arrays = run.mz.nbytes + run.intensity.nbytes
    trace, matrix = (
        waiting(action, rounds=5)
        for action in (lambda: run.ion_trace(57), lambda: run.matrix(np.arange(44.5, 601)))
    )
    print(
        f"\nnetCDF of {len(run)} scans: {reading * 1e3:.0f} ms, {peak / arrays:.1f} times its arrays; "
        f"an ion trace {trace * 1e3:.1f} ms, all mass numbers {matrix * 1e3:.0f} ms"
    )
    assert peak < 3 * arrays
    assert reading < 0.5
