"""The run itself, recognition of its file, and the numeric packings against their reference encoder."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import FrozenInstanceError
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from branchpos.errors import BranchposError, FormatError, InputError, SpectrumError
from branchpos.reading import numpress, read_run
from branchpos.run import Run

GOOD = {
    "times": [1.0, 2.0, 4.0],
    "offsets": [0, 2, 2, 5],
    "mz": [57, 71, 43, 57.4, 85],
    "intensity": [10, 5, 1, 2, 3],
}


def test_scans_and_traces() -> None:
    run = Run.from_arrays(**GOOD)
    assert len(run) == 3
    assert run.scan(1)[0].size == 0
    assert run.scan(-1)[0].tolist() == [43, 57.4, 85] and run.scan(2)[1].tolist() == [1, 2, 3]
    assert run.total_ion_current().tolist() == [15, 0, 6]
    assert run.ion_trace(57).tolist() == [10, 0, 2]
    assert run.ion_trace(57, 0.2).tolist() == [10, 0, 0]
    assert (run.first_mass, run.last_mass) == (43, np.inf)
    with pytest.raises(IndexError, match="scan 3 of a run of 3"):
        run.scan(3)
    with pytest.raises(FrozenInstanceError):
        run.complete = False


@given(st.data())
def test_windows_side_by_side_hold_each_point_once(data: st.DataObject) -> None:
    counts = data.draw(st.lists(st.integers(0, 6), min_size=1, max_size=6))
    rng = np.random.default_rng(data.draw(st.integers(0, 999)))
    scans = [np.sort(rng.integers(80, 140, count) / 2) for count in counts]
    mz, heights = np.concatenate([*scans, []]), rng.integers(1, 9, sum(counts))
    run = Run.from_arrays(np.arange(len(counts)), np.cumsum([0, *counts]), mz, heights)
    edges = np.arange(39.5, 72)
    matrix = run.matrix(edges)
    assert matrix.shape == (len(counts), edges.size - 1)
    for scan, points in enumerate(scans):
        expected = np.zeros(edges.size - 1)
        for mass, height in zip(points, run.scan(scan)[1], strict=True):
            expected[int(np.floor(mass - 39.5))] += height
        assert matrix[scan].tolist() == expected.tolist()
    for column in range(edges.size - 1):
        assert run.ion_trace(edges[column] + 0.5).tolist() == matrix[:, column].tolist()
    np.testing.assert_array_equal(matrix.sum(axis=1), run.total_ion_current())


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"times": [], "offsets": [0]}, "the run has no scans"),
        ({"times": [1.0, 2.0]}, "2 times, 2 scan numbers, 4 offsets"),
        ({"intensity": [1, 2]}, "5 m/z values and 2 intensities do not fit"),
        ({"scan_numbers": [1, 2]}, "3 times, 2 scan numbers"),
        ({"offsets": [0, 2, 2, 4]}, "offsets from 0 to 4 do not part 5 points"),
        ({"offsets": [0, 3, 2, 5]}, "offsets from 0 to 5 do not part 5 points"),
        ({"offsets": [1, 2, 2, 5]}, "offsets from 1 to 5 do not part 5 points"),
        ({"times": [1.0, 2.0, 2.0]}, "scan 3: retention time 2 s does not follow 2 s"),
        ({"times": [1.0, np.nan, 3.0]}, "scan 2: the retention time is not known"),
        ({"mz": [57, 71, 43, np.nan, 85]}, "scan 3: m/z is nan"),
        ({"mz": [0, 71, 43, 57, 85]}, "scan 1: m/z is 0"),
        ({"mz": [57, 71, 57, 43, 85]}, "scan 3: m/z 43 stands below the one before it"),
        ({"intensity": [1, 2, 3, -4, 5]}, "scan 3: intensity -4 at m/z 57.4"),
        ({"intensity": [1, np.inf, 3, 4, 5]}, "scan 1: intensity inf at m/z 71"),
    ],
)
def test_arrays_that_are_no_run(change: dict[str, object], words: str) -> None:
    with pytest.raises(SpectrumError, match=words):
        Run.from_arrays(**(GOOD | change))


def test_what_is_lost_makes_a_run_incomplete() -> None:
    run = Run.from_arrays(**GOOD, lost="the last scans")
    assert not run.complete and "incomplete" in repr(run)
    assert run.with_warning("one", "two").warnings == ("one", "two")
    assert not run.with_warning("one").complete


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "the file is empty; copy or export the run again"),
        (b" \n ", "the file is empty"),
        (b"\x1f\x8b", "the gzip data stop early, at byte 2; copy the file again"),
        (b"\x1f\x8b" + b"x" * 50, "the gzip data are damaged before byte 52"),
        (
            b"\x89HDF\r\n\x1a\n" + b"\0" * 50,
            "netCDF-4 or another HDF5 file, which is not read; save it in the classic",
        ),
        (b"PK\x03\x04" + b"\0" * 50, "a zip archive, which is not read; unpack it"),
        (b'<?xml version="1.0"?>\n<mzXML>', "a run in mzXML, which is not read; convert it to mzML"),
        (b"57 100\n71 60\n", "begins '57 100'; export or convert the run as mzML or ANDI netCDF"),
        (b"<html>", "no format of runs fits a file that begins '<html>'"),
        (bytes(range(256)), "no format of runs fits"),
        (b"CDF\x01", "the netCDF data stop early or are damaged"),
        (b"<mzML>", "no whole scan with points before the XML stops at line 1, column 7"),
        (b"<mzML></mzML>", "the file holds no scan of the first level"),
        (b'<?xml version="1.0" encoding="no-such"?><mzML></mzML>', "the XML "),
    ],
)
def test_what_is_no_run_is_refused_with_advice(
    content: bytes, words: str, write: Callable[..., Path]
) -> None:
    path = write(content)
    with pytest.raises(FormatError, match=words) as caught:
        read_run(path)
    assert str(caught.value).startswith(str(path))


def test_files_that_cannot_be_opened(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"cannot be read: No such file.*check the path"):
        read_run(tmp_path / "none")
    with pytest.raises(InputError, match="folder of the instrument's own format is not read: export"):
        read_run(tmp_path)
    with pytest.raises(InputError, match="cannot be read"):
        read_run("a\0b")


# Numeric packings -----------------------------------------------------------------------------------------

DECODERS = (numpress.decode_linear, numpress.decode_positive_integers, numpress.decode_short_logarithms)


def test_packed_numbers_as_the_reference_encoder_packs_them() -> None:
    """pynumpress wraps the code that the authors of the packing published."""
    reference = pytest.importorskip("pynumpress", reason="the reference encoder is not installed")
    rng = np.random.default_rng(3)
    for size in (2, 3, 4, 5, 64, 3000):
        mz, heights = np.sort(rng.uniform(40, 620, size)), rng.exponential(3e4, size)
        heights[0] = 0
        for values in (mz, rng.permutation(mz)):
            packed = bytes(reference.encode_linear(values, reference.optimal_linear_fixed_point(values)))
            decoded = numpress.decode_linear(packed)
            np.testing.assert_array_equal(decoded, reference.decode_linear(np.frombuffer(packed, np.uint8)))
            np.testing.assert_allclose(decoded, values, atol=1e-6)
        packed = bytes(reference.encode_pic(heights))
        np.testing.assert_array_equal(numpress.decode_positive_integers(packed), np.floor(heights + 0.5))
        packed = bytes(reference.encode_slof(heights, reference.optimal_slof_fixed_point(heights)))
        decoded = numpress.decode_short_logarithms(packed)
        expected = reference.decode_slof(np.frombuffer(packed, np.uint8))
        np.testing.assert_allclose(decoded, expected, rtol=1e-12, atol=1e-9)
        np.testing.assert_allclose(decoded, heights, rtol=2e-4)


@given(hnp.arrays(np.int64, st.integers(2, 40), elements=st.integers(0, 2**31 - 2)))
def test_whole_numbers_come_back_exactly(values: np.ndarray) -> None:
    reference = pytest.importorskip("pynumpress", reason="the reference encoder is not installed")
    packed = bytes(reference.encode_pic(values.astype(float)))
    assert numpress.decode_positive_integers(packed).tolist() == values.tolist()
    # Beyond this the encoder's own steps overflow, and it ends the whole process.
    small = values // 8
    packed = bytes(reference.encode_linear(small.astype(float), 1.0))
    assert numpress.decode_linear(packed).tolist() == small.tolist()


def test_packings_of_no_and_one_value() -> None:
    factor = bytes.fromhex("40f86a0000000000")
    assert numpress.decode_linear(factor).tolist() == []
    assert numpress.decode_linear(factor + bytes.fromhex("40420f00")).tolist() == [10.0]
    assert numpress.decode_positive_integers(b"").tolist() == []
    assert numpress.decode_short_logarithms(factor).tolist() == []


@pytest.mark.parametrize("decode", DECODERS)
@given(data=st.binary(max_size=60))
def test_arbitrary_bytes_never_raise_anything_else(
    decode: Callable[[bytes], np.ndarray], data: bytes
) -> None:
    try:
        assert decode(data).ndim == 1
    except BranchposError as fault:
        assert "packed numbers are damaged" in str(fault)


@pytest.mark.parametrize(
    ("decode", "data", "words"),
    [
        (numpress.decode_linear, b"\0" * 7, "7 bytes where the scaling factor alone takes 8"),
        (numpress.decode_linear, b"\0" * 16, "the scaling factor is 0"),
        (
            numpress.decode_linear,
            bytes.fromhex("40f86a0000000000ffff"),
            "2 bytes where the first value takes 4",
        ),
        (
            numpress.decode_linear,
            bytes.fromhex("40f86a0000000000ffffffffff"),
            "5 bytes where one or two first",
        ),
        (numpress.decode_positive_integers, b"\x12", "the data end inside a number"),
        (
            numpress.decode_short_logarithms,
            bytes.fromhex("40f86a0000000000ff"),
            "1 bytes where each value takes 2",
        ),
    ],
)
def test_damaged_packings_are_refused(decode: Callable[[bytes], np.ndarray], data: bytes, words: str) -> None:
    with pytest.raises(FormatError, match=words):
        decode(data)
