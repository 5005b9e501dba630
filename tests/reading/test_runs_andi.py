"""ANDI/AIA netCDF runs: files written with scipy and the netCDF C library, and a real run read by both."""

from __future__ import annotations

import gzip
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from branchpos.errors import BranchposError, FormatError, TruncatedError
from branchpos.reading import read_run
from branchpos.reading.andi import read_chunks

COUNTS = [3, 0, 2, 4]
POINTS = sum(COUNTS)


def variables(**changes: Any) -> dict[str, tuple[str, Any, dict[str, Any]]]:
    """Return the variables of a small run: dimension, values, attributes; a change of None leaves one out."""
    given: dict[str, tuple[str, Any, dict[str, Any]]] = {
        "scan_acquisition_time": ("scan_number", np.array([2.5, 3.5, 4.5, 5.5]), {}),
        "actual_scan_number": ("scan_number", np.array([11, 12, 13, 14], "i4"), {}),
        "scan_index": ("scan_number", np.array([0, 3, 3, 5], "i4"), {}),
        "point_count": ("scan_number", np.array(COUNTS, "i4"), {}),
        "flag_count": ("scan_number", np.zeros(4, "i4"), {}),
        "mass_range_min": ("scan_number", np.full(4, 40.0), {}),
        "mass_range_max": ("scan_number", np.full(4, 620.0), {}),
        "mass_values": ("point_number", np.array([57.1, 71, 85, 43, 57, 41, 43, 55, 57], "f4"), {}),
        "intensity_values": ("point_number", np.array([9, 8, 7, 6, 5, 4, 3, 2, 1.0], "f4"), {}),
    }
    for name, change in changes.items():
        if isinstance(change, tuple):
            given[name] = change
        elif change is not None:
            given[name] = (given[name][0], np.asarray(change), given[name][2])
        else:
            del given[name]
    return given


def write_andi(
    path: Path, *, version: int = 1, attributes: dict[str, str] | None = None, **changes: Any
) -> Path:
    """Write a run with scipy."""
    from scipy.io import netcdf_file

    with netcdf_file(path, "w", version=version) as out:
        for name, text in (attributes or {"experiment_type": "Centroided Mass Spectrum"}).items():
            setattr(out, name, text)
        held = variables(**changes)
        for dimension in ("scan_number", "point_number"):
            sizes = [values.size for which, values, _ in held.values() if which == dimension]
            out.createDimension(dimension, max(sizes, default=0))
        for name, (dimension, values, extras) in held.items():
            if values.size != out.dimensions[dimension]:
                out.createDimension(f"of_{name}", values.size)
                dimension = f"of_{name}"
            variable = out.createVariable(name, values.dtype.newbyteorder(">"), (dimension,))
            variable[:] = values
            for key, value in extras.items():
                setattr(variable, key, value)
    return path


@pytest.fixture
def write_with_c(tmp_path: Path) -> Callable[..., Path]:
    """Return a function that writes a run with the netCDF C library."""
    netcdf4 = pytest.importorskip("netCDF4", reason="the second netCDF library is not installed")

    def put(form: str, **changes: Any) -> Path:
        path = tmp_path / "run"
        with netcdf4.Dataset(path, "w", format=form) as out:
            out.experiment_type = "Centroided Mass Spectrum"
            out.createDimension("scan_number", len(COUNTS))
            out.createDimension("point_number", None)
            for name, (dimension, values, extras) in variables(**changes).items():
                variable = out.createVariable(name, values.dtype, (dimension,))
                variable.set_auto_maskandscale(False)
                variable[:] = values
                variable.setncatts(extras)
        return path

    return put


@pytest.mark.parametrize("version", [1, 2], ids=["classic", "64-bit offset"])
@pytest.mark.parametrize("zipped", [False, True], ids=["", "gzip"])
def test_what_was_written_is_read(version: int, zipped: bool, tmp_path: Path) -> None:
    path = write_andi(tmp_path / "run", version=version)
    if zipped:
        path.write_bytes(gzip.compress(path.read_bytes()))
    run = read_run(path)
    assert run.times.tolist() == [2.5, 3.5, 4.5, 5.5]
    assert run.scan_numbers.tolist() == [11, 12, 13, 14]
    assert run.offsets.tolist() == [0, 3, 3, 5, 9]
    assert run.scan(3)[0].tolist() == [41, 43, 55, 57] and run.scan(3)[1].tolist() == [4, 3, 2, 1]
    assert run.mz[0] == float(np.float32(57.1))
    assert (run.first_mass, run.last_mass) == (40, 620)
    assert run.complete and run.warnings == ()
    assert run.mz.dtype == np.float64 and run.intensity.dtype == np.float32


@pytest.mark.parametrize("form", ["NETCDF3_CLASSIC", "NETCDF3_64BIT_OFFSET"])
def test_files_of_the_c_library(form: str, write_with_c: Callable[..., Path]) -> None:
    """Its point number is a record dimension, whose values lie interleaved in the file."""
    run = read_run(write_with_c(form))
    assert run.offsets.tolist() == [0, 3, 3, 5, 9]
    assert run.mz.tolist() == np.array([57.1, 71, 85, 43, 57, 41, 43, 55, 57], "f4").astype(float).tolist()
    assert run.total_ion_current().tolist() == [24, 0, 11, 10]


PACKED = {
    "mass_values": (
        "point_number",
        np.array([1142, 1420, 1700, 860, 1140, 820, 860, 1100, 1140], "i2"),
        {"scale_factor": np.float64(0.05)},
    ),
    "intensity_values": (
        "point_number",
        np.arange(9, 0, -1).astype("i4"),
        {"scale_factor": np.float32(4.0), "add_offset": np.float64(100.0)},
    ),
    "scan_acquisition_time": (
        "scan_number",
        np.array([25, 35, 45, 55], "i4"),
        {"scale_factor": np.float64(0.1)},
    ),
}


@pytest.mark.parametrize("form", ["scipy", "C library"])
def test_scale_factors_and_offsets_are_applied(
    form: str, tmp_path: Path, write_with_c: Callable[..., Path]
) -> None:
    """The C library applies them by itself when asked to; the two must agree."""
    import netCDF4

    path = (
        write_andi(tmp_path / "run", **PACKED)
        if form == "scipy"
        else write_with_c("NETCDF3_CLASSIC", **PACKED)
    )
    run = read_run(path)
    with netCDF4.Dataset(path) as data:
        np.testing.assert_allclose(run.mz, data["mass_values"][:], rtol=1e-12)
        np.testing.assert_allclose(run.intensity, data["intensity_values"][:], rtol=1e-6)
        np.testing.assert_allclose(run.times, data["scan_acquisition_time"][:], rtol=1e-12)
    assert run.mz[0] == pytest.approx(57.1) and run.intensity[0] == 136


def test_gaps_are_named_and_empty_scans_kept(tmp_path: Path) -> None:
    run = read_run(write_andi(tmp_path / "run", point_count=np.array([3, 0, -9999, 4], "i4")))
    assert run.scan_numbers.tolist() == [11, 12, 14]
    assert run.total_ion_current().tolist() == [24, 0, 10]
    assert run.warnings == ("1 scan not recorded, from scan 13 on; left out",)
    late = read_run(write_andi(tmp_path / "run", scan_acquisition_time=[2.5, -9999, 4.5, 5.5]))
    assert late.scan_numbers.tolist() == [11, 13, 14] and "from scan 12 on" in late.warnings[0]


def test_points_that_no_scan_claims_are_passed_over(tmp_path: Path) -> None:
    run = read_run(write_andi(tmp_path / "run", point_count=np.array([2, 0, 1, 3], "i4")))
    assert run.mz.tolist() == np.array([57.1, 71, 43, 41, 43, 55], "f4").astype(float).tolist()
    assert run.total_ion_current().tolist() == [17, 0, 6, 9]


def test_scans_in_another_order_of_points(tmp_path: Path) -> None:
    run = read_run(
        write_andi(
            tmp_path / "run",
            scan_index=np.array([6, 0, 4, 0], "i4"),
            point_count=np.array([3, 0, 2, 4], "i4"),
            mass_values=np.array([41, 43, 55, 57, 43, 57, 57.1, 71, 85], "f4"),
        )
    )
    assert run.scan(0)[0].tolist() == np.array([57.1, 71, 85], "f4").astype(float).tolist()
    assert run.scan(3)[0].tolist() == [41, 43, 55, 57]


def test_flagged_points_are_counted(tmp_path: Path) -> None:
    run = read_run(write_andi(tmp_path / "run", flag_count=np.array([0, 0, 1, 2], "i4")))
    assert run.warnings[0].startswith("3 points in 2 scans flagged by the instrument")
    assert run.complete and run.mz.size == POINTS


def test_an_index_beyond_the_points_costs_its_scan(tmp_path: Path) -> None:
    run = read_run(write_andi(tmp_path / "run", point_count=np.array([3, 0, 2, 40], "i4")))
    assert run.scan_numbers.tolist() == [11, 12, 13]
    assert not run.complete
    assert "1 damaged scan left out (scan 14: its points 5 to 45 lie outside the 9 of the file)" in run.lost
    before = read_run(write_andi(tmp_path / "run", scan_index=np.array([-3, 3, 3, 5], "i4")))
    assert "scan 11: its points -3 to 0 lie outside" in before.lost


def test_one_of_index_and_count_is_enough(tmp_path: Path) -> None:
    for left_out in ("scan_index", "point_count"):
        run = read_run(write_andi(tmp_path / "run", **{left_out: None}))
        assert run.offsets.tolist() == [0, 3, 3, 5, 9]


def test_scan_numbers_not_recorded_are_counted_from_one(tmp_path: Path) -> None:
    for numbers in (np.full(4, -9999, "i4"), np.array([1, 1, 2, 3], "i4"), None):
        run = read_run(write_andi(tmp_path / "run", actual_scan_number=numbers))
        assert run.scan_numbers.tolist() == [1, 2, 3, 4]


def test_times_in_minutes(tmp_path: Path) -> None:
    minutes = ("scan_number", np.array([1.0, 2, 3, 4]), {"units": "Minutes"})
    run = read_run(write_andi(tmp_path / "run", scan_acquisition_time=minutes))
    assert run.times.tolist() == [60, 120, 180, 240]


def test_mass_ranges_that_differ_or_do_not_hold(tmp_path: Path) -> None:
    run = read_run(write_andi(tmp_path / "run", mass_range_min=[40.0, 40, 42, 40]))
    assert (run.first_mass, run.last_mass) == (42, 620)
    assert "within m/z 40 to 620; common to all of them is m/z 42 to 620" in run.warnings[0]
    run = read_run(write_andi(tmp_path / "run", mass_range_max=np.full(4, 80.0)))
    assert (run.first_mass, run.last_mass) == (41, np.inf)
    assert "the stated mass range m/z 40 to 80 does not hold all points" in run.warnings[0]
    unknown = read_run(write_andi(tmp_path / "run", mass_range_max=np.full(4, -9999.0)))
    assert unknown.last_mass == np.inf and unknown.warnings == ()


REFUSED = {
    "profile": ({"attributes": {"experiment_type": "Continuum Mass Spectrum"}}, "profile.*pick the peaks"),
    "no run": ({"mass_values": None}, "no variable mass_values: it is no mass spectrometric run"),
    "no times": ({"scan_acquisition_time": None}, "no variable scan_acquisition_time"),
    "no index": ({"scan_index": None, "point_count": None}, "neither scan_index nor point_count"),
    "lengths": ({"intensity_values": np.ones(8, "f4")}, "9 mass values but 8 intensities"),
    "too few counts": ({"point_count": np.ones(3, "i4")}, "4 scan times, 4 scan indices and 3 point counts"),
    "shared points": (
        {"scan_index": np.array([0, 3, 2, 5], "i4")},
        "scan 11 and scan 13 claim the same points",
    ),
    "times fall": (
        {"scan_acquisition_time": [2.5, 3.5, 3.0, 5.5]},
        "scan 13: retention time 3 s does not follow",
    ),
    "times stand": (
        {"scan_acquisition_time": [2.5, 3.5, 3.5, 5.5]},
        "scan 13: retention time 3.5 s does not",
    ),
    "nothing recorded": ({"point_count": np.full(4, -9999, "i4")}, "the file holds no whole scan"),
    "no intensities": ({"intensity_values": np.full(9, -1, "f4")}, "scan 11: intensity -1 at m/z 57.1"),
    "factor of nothing": (
        {"mass_values": ("point_number", np.ones(9, "f4"), {"scale_factor": np.float64(0)})},
        "scale_factor of mass_values is 0",
    ),
}


@pytest.mark.parametrize(("changes", "words"), REFUSED.values(), ids=REFUSED)
def test_what_cannot_be_a_run_is_refused(changes: dict[str, Any], words: str, tmp_path: Path) -> None:
    path = write_andi(tmp_path / "run", **changes)
    with pytest.raises(BranchposError, match=words) as caught:
        read_run(path)
    assert str(caught.value).startswith(str(path))


def test_other_ionisations_are_noted(tmp_path: Path) -> None:
    stated = {"test_ionization_mode": "Chemical Ionization", "test_ionization_polarity": "Positive Polarity"}
    run = read_run(write_andi(tmp_path / "run", attributes=stated))
    assert run.warnings == ("not electron ionisation: the record says 'Chemical Ionization'",)
    assert run.metadata["test_ionization_mode"] == "Chemical Ionization"


def test_netcdf_4_is_refused_with_advice(write_with_c: Callable[..., Path]) -> None:
    with pytest.raises(FormatError, match=r"netCDF-4 or another HDF5 file.*classic netCDF format"):
        read_run(write_with_c("NETCDF4"))
    with pytest.raises(FormatError, match=r"netCDF with 64-bit data.*classic netCDF format"):
        read_run(write_with_c("NETCDF3_64BIT_DATA"))


@pytest.fixture(scope="module")
def intact(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    return write_andi(tmp_path_factory.mktemp("andi") / "run").read_bytes()


def test_a_cut_at_every_byte_is_refused_or_harmless(intact: bytes) -> None:
    """The end of the last variable may be filled up to 4 bytes; nothing else may be missing."""
    whole = read_chunks([intact])
    refused = 0
    for cut in range(4, len(intact)):
        try:
            run = read_chunks([intact[:cut]], "run")
        except TruncatedError as fault:
            refused += 1
            assert str(fault).startswith("run: the netCDF data stop early or are damaged")
            assert str(fault).endswith("copy the file again, or export the run again")
        else:
            assert len(intact) - cut < 4
            np.testing.assert_array_equal(run.intensity, whole.intensity)
    assert refused >= len(intact) - 8


def test_a_cut_gzip_file_says_so(intact: bytes, write: Callable[..., Path]) -> None:
    with pytest.raises(TruncatedError, match="the gzip data stop early, at byte"):
        read_run(write(gzip.compress(intact)[:-30]))


@settings(max_examples=200, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_changed_bytes_never_raise_anything_else(intact: bytes, data: st.DataObject) -> None:
    changed = bytearray(intact)
    for _ in range(data.draw(st.integers(1, 6))):
        changed[data.draw(st.integers(4, len(changed) - 1))] = data.draw(st.integers(0, 255))
    try:
        run = read_chunks([bytes(changed)], "run")
    except BranchposError as fault:
        assert str(fault).startswith("run: ")
    else:
        assert 0 < len(run) <= len(COUNTS)


# The real run ---------------------------------------------------------------------------------------------


def test_the_real_run(shared: Path) -> None:
    """Check values taken from the file with the netCDF C library."""
    run = read_run(shared / "runs" / "sediment_pyrolysate.cdf")
    assert len(run) == 2698 and run.mz.size == 473_720
    assert run.times[0] == pytest.approx(2.52204806, abs=1e-7)
    assert run.times[-1] == pytest.approx(2699.69924927, abs=1e-7)
    assert run.scan(0)[0].tolist()[:2] == pytest.approx([45.121094, 46.091797], abs=1e-6)
    assert run.complete and run.warnings == ()
    assert run.metadata["test_ionization_mode"] == "Electron Impact"


def test_the_real_run_as_another_library_reads_it(shared: Path) -> None:
    netcdf4 = pytest.importorskip("netCDF4", reason="the second netCDF library is not installed")
    path = shared / "runs" / "sediment_pyrolysate.cdf"
    run = read_run(path)
    with netcdf4.Dataset(path) as data:
        np.testing.assert_array_equal(run.times, data["scan_acquisition_time"][:])
        np.testing.assert_array_equal(run.offsets[:-1], data["scan_index"][:])
        np.testing.assert_array_equal(np.diff(run.offsets), data["point_count"][:])
        np.testing.assert_array_equal(run.mz, data["mass_values"][:].astype(np.float64))
        np.testing.assert_array_equal(run.intensity, data["intensity_values"][:])
        # The instrument's own sums hold up to 0.023 % more than the points that it kept.
        np.testing.assert_allclose(run.total_ion_current(), data["total_intensity"][:], rtol=3e-4)
