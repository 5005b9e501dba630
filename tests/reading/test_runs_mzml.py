"""mzML runs: files of an independent writer (psims), also read by an independent reader (pyteomics)."""

from __future__ import annotations

import base64
import gzip
import re
import tracemalloc
import warnings
import zlib
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from branchpos.errors import BranchposError, FormatError, TruncatedError
from branchpos.reading import read_run, read_spectra
from branchpos.reading.mzml import read_chunks
from branchpos.run import Run

SCANS = 12
LINEAR, COUNTS, LOGARITHMS = (
    "MS-Numpress linear prediction compression",
    "MS-Numpress positive integer compression",
    "MS-Numpress short logged float compression",
)
ZLIB_TERM = {
    "MS:1002312": ("MS:1002746", LINEAR + " followed by zlib compression"),
    "MS:1002313": ("MS:1002747", COUNTS + " followed by zlib compression"),
    "MS:1002314": ("MS:1002748", LOGARITHMS + " followed by zlib compression"),
}
"""Accessions of the PSI-MS vocabulary for the numeric packings without and with zlib on top."""

Scan = tuple[np.ndarray, np.ndarray]
Make = Callable[..., bytes]


def invented_scans(whole: bool = False) -> list[Scan]:
    """Return scans of peaks near whole mass numbers; one of them is empty."""
    rng = np.random.default_rng(20)
    scans = []
    for size in [40, 1, 0, *rng.integers(2, 60, SCANS - 3)]:
        mz = np.sort(rng.choice(np.arange(45, 600), size, replace=False)).astype(float)
        heights = np.round(rng.exponential(2e4, size)) + 1
        scans.append((mz if whole else mz + rng.normal(0.05, 0.02, size).round(5), heights))
    return scans


def write_mzml(
    path: Path,
    scans: list[Scan],
    *,
    compression: Any = "zlib",
    encoding: Any = None,
    unit: str = "minute",
    indexed: bool = True,
    groups: bool = False,
    centroided: bool = True,
    levels: list[int] | None = None,
    announced: int | None = None,
    ionisation: str = "electron ionization",
    window: bool = True,
) -> Path:
    """Write a run with psims; scan ``i`` from 1 stands at 60 i seconds and a bit."""
    from psims.mzml.writer import MzMLWriter, PlainMzMLWriter

    terms: dict[int, list[Any]] = {
        level: ["MS1 spectrum" if level == 1 else "MSn spectrum", {"ms level": level}] for level in (1, 2)
    }
    with warnings.catch_warnings():
        # The writer leaves its vocabulary files open.
        warnings.simplefilter("ignore")
        kind = MzMLWriter if indexed else PlainMzMLWriter
        with path.open("wb") as stream, kind(stream) as out:
            out.controlled_vocabularies()
            out.file_description(["MS1 spectrum"])
            if groups:
                shared = [*terms[1], "positive scan"]
                out.reference_param_group_list([{"id": "full scans", "params": shared}])
            out.software_list([{"id": "w", "version": "0", "params": ["custom unreleased software tool"]}])
            parts = [out.Source(1, [ionisation]), out.Analyzer(2, ["quadrupole"])]
            parts.append(out.Detector(3, ["electron multiplier"]))
            out.instrument_configuration_list([out.InstrumentConfiguration("IC1", parts)])
            steps = [out.ProcessingMethod(order=1, software_reference="w", params=["Conversion to mzML"])]
            out.data_processing_list([out.DataProcessing(steps, id="DP1")])
            with (
                out.run(id="r", instrument_configuration="IC1"),
                out.spectrum_list(count=len(scans) if announced is None else announced),
            ):
                for at, (mz, intensity) in enumerate(scans):
                    level = levels[at] if levels else 1
                    out.write_spectrum(
                        mz,
                        intensity,
                        id=f"controllerType=0 scan={at + 1}",
                        params=[{"ref": "full scans"}] if groups else terms[level],
                        polarity=None if groups else "positive scan",
                        centroided=centroided,
                        scan_start_time={
                            "name": "scan start time",
                            "value": start(at) / (60 if unit == "minute" else 1),
                            "unit_name": unit,
                        },
                        scan_window_list=[(40, 620)] if window else None,
                        compression=compression,
                        encoding=encoding or {"m/z array": np.float64, "intensity array": np.float64},
                    )
    return path


def start(at: int) -> float:
    return 60.0 * (at + 1) + 0.25


def read_independently(path: Path) -> list[tuple[float, np.ndarray, np.ndarray]]:
    """Return time [s], m/z and intensity of every scan as pyteomics reads them."""
    from pyteomics import mzml

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        with mzml.MzML(str(path), use_index=False) as reader:
            return [
                (
                    seconds(one["scanList"]["scan"][0]["scan start time"]),
                    one["m/z array"],
                    one["intensity array"],
                )
                for one in reader
            ]


def seconds(value: Any) -> float:
    return float(value) * {"minute": 60.0, "second": 1.0}[value.unit_info]


def with_zlib(path: Path) -> Path:
    """Put zlib on top of the numeric packing of every array, which psims does not write."""
    text = path.read_text()

    def change(match: re.Match[str]) -> str:
        array = match.group()
        for plain, (packed, name) in ZLIB_TERM.items():
            if f'"{plain}"' in array:
                array = re.sub(
                    rf'accession="{plain}" name="[^"]*"', f'accession="{packed}" name="{name}"', array
                )
                binary = re.search(r"<binary>(.*?)</binary>", array)
                inner = base64.b64encode(zlib.compress(base64.b64decode(binary.group(1)))).decode()
                array = array.replace(binary.group(), f"<binary>{inner}</binary>")
        return array

    path.write_text(re.sub(r"<binaryDataArray .*?</binaryDataArray>", change, text, flags=re.DOTALL))
    return path


ENCODINGS = {
    "64 bit, zlib": {},
    "64 bit, plain": {"compression": "none"},
    "32 bit, zlib": {"encoding": {"m/z array": np.float32, "intensity array": np.float32}},
    "32 bit, plain, no index": {
        "encoding": {"m/z array": np.float32, "intensity array": np.float32},
        "compression": "none",
        "indexed": False,
    },
    "whole numbers of 32 and 64 bit": {"encoding": {"m/z array": np.int32, "intensity array": np.int64}},
    "whole numbers of 64 and 32 bit, plain": {
        "encoding": {"m/z array": np.int64, "intensity array": np.int32},
        "compression": "none",
    },
    "seconds, no index": {"unit": "second", "indexed": False},
    "parameter groups": {"groups": True},
    "numeric, linear and counts": {"compression": {"m/z array": LINEAR, "intensity array": COUNTS}},
    "numeric, linear and logarithms": {"compression": {"m/z array": LINEAR, "intensity array": LOGARITHMS}},
}


@pytest.mark.parametrize("options", ENCODINGS.values(), ids=ENCODINGS)
def test_every_encoding_reads_as_another_library_reads_it(options: dict[str, Any], tmp_path: Path) -> None:
    whole = "whole numbers" in str([name for name, one in ENCODINGS.items() if one is options])
    numeric = "MS-Numpress" in str(options)
    scans = [scan for scan in invented_scans(whole) if scan[0].size > 2 or not numeric]
    path = write_mzml(tmp_path / "run", scans, **options)
    compare_with_another_library(path)
    if numeric:
        compare_with_another_library(with_zlib(path))


def compare_with_another_library(path: Path) -> None:
    expected = read_independently(path)
    compare(read_run(path), expected)
    packed = path.with_name("packed")
    packed.write_bytes(gzip.compress(path.read_bytes()))
    compare(read_run(packed), expected)


def compare(run: Run, expected: list[tuple[float, np.ndarray, np.ndarray]]) -> None:
    assert len(run) == len(expected) >= SCANS - 3
    assert run.complete and not run.warnings
    assert (run.first_mass, run.last_mass) == (40, 620)
    for at, (time, mz, intensity) in enumerate(expected):
        assert run.times[at] == pytest.approx(time, abs=1e-9)
        np.testing.assert_array_equal(run.scan(at)[0], mz)
        np.testing.assert_allclose(run.scan(at)[1], intensity, rtol=1e-6)


def test_what_was_written_is_read(tmp_path: Path) -> None:
    scans = invented_scans()
    run = read_run(write_mzml(tmp_path / "run", scans))
    assert run.times.tolist() == pytest.approx([start(at) for at in range(SCANS)])
    assert run.scan_numbers.tolist() == list(range(1, SCANS + 1))
    for at, (mz, intensity) in enumerate(scans):
        np.testing.assert_array_equal(run.scan(at)[0], mz)
        np.testing.assert_array_equal(run.scan(at)[1], intensity)
    assert run.total_ion_current().tolist() == [intensity.sum() for _, intensity in scans]
    assert run.metadata["format"] == "mzML"
    assert run.centroided


def test_fragment_spectra_are_counted_and_left_out(tmp_path: Path) -> None:
    run = read_run(write_mzml(tmp_path / "run", invented_scans(), levels=[1, 2, 2] * (SCANS // 3)))
    assert run.scan_numbers.tolist() == [1, 4, 7, 10]
    assert run.warnings == ("8 of level 2 (fragments of chosen ions) left out",)
    assert run.complete
    with pytest.raises(FormatError, match="no scan of the first level, only 12 of level 2"):
        read_run(write_mzml(tmp_path / "run", invented_scans(), levels=[2] * SCANS))


def test_profiles_are_refused_with_advice(tmp_path: Path) -> None:
    with pytest.raises(FormatError, match=r"run: scan 1: .*profile.*pick the peaks of all scans"):
        read_run(write_mzml(tmp_path / "run", invented_scans(), centroided=False))


def test_a_profile_that_claims_to_be_peaks_is_refused(tmp_path: Path) -> None:
    mz = np.arange(50, 60, 0.02)
    with pytest.raises(FormatError, match=r"scan 1: .*profile"):
        read_run(write_mzml(tmp_path / "run", [(mz, np.ones(mz.size))] * 3))


def test_another_ionisation_is_noted(tmp_path: Path) -> None:
    run = read_run(write_mzml(tmp_path / "run", invented_scans(), ionisation="chemical ionization"))
    assert run.warnings == ("not electron ionisation: the record says 'chemical ionization'",)


def test_without_word_of_the_mass_range_it_begins_at_the_lightest_point(tmp_path: Path) -> None:
    scans = invented_scans()
    run = read_run(write_mzml(tmp_path / "run", scans, window=False))
    assert run.first_mass == min(mz.min() for mz, _ in scans if mz.size)
    assert run.last_mass == np.inf


def test_fewer_scans_than_announced_are_a_loss(tmp_path: Path) -> None:
    run = read_run(write_mzml(tmp_path / "run", invented_scans(), announced=20))
    assert not run.complete
    assert (
        "the file holds only 12 of 20 spectra announced; 12 whole scans kept, the last at 720.25 s"
        in run.lost
    )
    assert run.warnings == (f"incomplete run: {run.lost}",)
    more = read_run(write_mzml(tmp_path / "run", invented_scans(), announced=5))
    assert more.complete and more.warnings == ("12 spectra where the file announces 5; all were read",)


@pytest.fixture(scope="module")
def plain(tmp_path_factory: pytest.TempPathFactory) -> str:
    """Return the text of a run without fault, times in seconds."""
    return write_mzml(tmp_path_factory.mktemp("plain") / "run", invented_scans(), unit="second").read_text()


def damaged(text: str, scan: int, change: Callable[[str], str]) -> str:
    """Change the text of one spectrum."""
    found = re.search(rf'<spectrum [^>]*scan={scan}".*?</spectrum>', text, re.DOTALL)
    assert found and change(found.group()) != found.group()
    return text.replace(found.group(), change(found.group()))


DAMAGES = {
    "no base64": (lambda text: text.replace("<binary>", "<binary>é", 1), "the array is no base64 text"),
    "base64 cut": (
        lambda text: re.sub(r"<binary>\w", "<binary>", text, count=1),
        "the array is no base64 text",
    ),
    "zlib broken": (
        lambda text: re.sub(r"<binary>.{8}", "<binary>AAAAAAAA", text, count=1),
        "the zlib data are damaged",
    ),
    "length": (
        lambda text: re.sub('defaultArrayLength="[0-9]+"', 'defaultArrayLength="7777"', text),
        "values where the file announces 7777",
    ),
    "length no number": (
        lambda text: re.sub('defaultArrayLength="[0-9]+"', 'defaultArrayLength="-3"', text),
        "an array length is '-3', not a number",
    ),
    "no array": (
        lambda text: text.replace("MS:1000514", "MS:1000786"),
        "an array of m/z or intensity is missing",
    ),
    "no type": (
        lambda text: text.replace("MS:1000523", "MS:1999999", 1),
        "0 number types are named, not one",
    ),
    "half floats": (lambda text: text.replace("MS:1000523", "MS:1000520", 1), "16-bit floats are not read"),
    "another compression": (
        lambda text: text.replace("MS:1000574", "MS:1003780", 1),
        "compression MS:1003780 is not read",
    ),
    "no compression named": (
        lambda text: text.replace("MS:1000574", "MS:1999999", 1),
        "no compression is named",
    ),
    "no time": (lambda text: text.replace("MS:1000016", "MS:1999999"), "the scan has no start time"),
    "no unit": (
        lambda text: re.sub(r'unitAccession="UO:0000010" unitName="second"', "", text),
        "is in '', neither seconds nor minutes",
    ),
    "time no number": (
        lambda text: re.sub(r'(name="scan start time" value=")[^"]*', r"\1soon", text),
        "the start time is 'soon', not a number",
    ),
}


@pytest.mark.parametrize(("change", "words"), DAMAGES.values(), ids=DAMAGES)
def test_a_damaged_scan_is_named_and_costs_itself_only(
    change: Callable[[str], str], words: str, plain: str, write: Callable[..., Path]
) -> None:
    run = read_run(write(damaged(plain, 5, change)))
    assert run.scan_numbers.tolist() == [number for number in range(1, SCANS + 1) if number != 5]
    assert not run.complete
    assert "1 damaged scan left out (scan 5: " in run.lost
    assert words in run.lost
    assert run.warnings == (f"incomplete run: {run.lost}",)


def test_numbers_that_cannot_be_peaks_cost_their_scan(tmp_path: Path) -> None:
    scans = invented_scans()
    scans[4][1][0], scans[6][0][0] = -1.0, np.nan
    scans[8] = (scans[8][0], scans[8][1] * 1e40)
    run = read_run(write_mzml(tmp_path / "run", scans, compression="none"))
    assert set(range(1, SCANS + 1)) - set(run.scan_numbers.tolist()) == {5, 7, 9}
    assert "scan 5: intensity -1 at" in run.lost and "scan 9: intensity inf at" in run.lost


def test_points_out_of_order_are_sorted_and_noted(tmp_path: Path) -> None:
    scans = invented_scans()
    turned = [(mz[::-1], intensity[::-1]) for mz, intensity in scans]
    run = read_run(write_mzml(tmp_path / "run", turned))
    for at, (mz, intensity) in enumerate(scans):
        np.testing.assert_array_equal(run.scan(at)[0], mz)
        np.testing.assert_array_equal(run.scan(at)[1], intensity)
    assert "points not in the order of m/z in 10 scans; sorted" in run.warnings


def test_a_file_of_damaged_scans_only_raises_the_first(tmp_path: Path) -> None:
    path = write_mzml(tmp_path / "run", invented_scans()[3:])
    path.write_text(path.read_text().replace("<binary>", "<binary>!"))
    with pytest.raises(FormatError, match="run: scan 1: the array is no base64 text"):
        read_run(path)


def test_times_that_fall_are_refused(plain: str, write: Callable[..., Path]) -> None:
    later = write(damaged(plain, 3, lambda text: text.replace(f'value="{start(2)}"', 'value="1.5"')))
    with pytest.raises(BranchposError, match=r"scan 3: retention time 1.5 s does not follow 120.25 s"):
        read_run(later)


# Cut files ------------------------------------------------------------------------------------------------


@pytest.fixture(scope="module", params=[True, False], ids=["index", "no index"])
def intact(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> bytes:
    path = tmp_path_factory.mktemp("cut") / "run"
    return write_mzml(path, invented_scans(), indexed=request.param).read_bytes()


def whole_scans_before(data: bytes, cut: int) -> int:
    return data.count(b"</spectrum>", 0, cut)


def in_pieces(data: bytes, size: int) -> Iterator[bytes]:
    return (data[at : at + size] for at in range(0, len(data), size))


def check_cut(run: Callable[[], Run], whole: int, full: Run, list_ended: bool) -> None:
    if whole == 0:
        with pytest.raises(FormatError, match="no whole scan with points"):
            run()
        return
    got = run()
    assert len(got) == whole
    np.testing.assert_array_equal(got.mz, full.mz[: got.mz.size])
    np.testing.assert_array_equal(got.intensity, full.intensity[: got.mz.size])
    np.testing.assert_array_equal(got.times, full.times[:whole])
    assert got.complete == list_ended
    if not list_ended:
        assert f"{whole} whole scan" in got.lost
        assert f"{whole} of {SCANS} spectra announced" in got.lost or whole == SCANS


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_a_cut_file_keeps_every_whole_scan(intact: bytes, data: st.DataObject) -> None:
    cut = data.draw(st.integers(0, len(intact) - 1))
    size = data.draw(st.sampled_from([1_000, 4_096, 65_536]))
    full = read_chunks([intact])
    ended = b"</spectrumList>" in intact[:cut]
    whole = whole_scans_before(intact, cut)
    check_cut(lambda: read_chunks(in_pieces(intact[:cut], size)), whole, full, ended)


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_a_cut_gzip_file_keeps_every_whole_scan_that_unpacks(
    intact: bytes, tmp_path_factory: pytest.TempPathFactory, data: st.DataObject
) -> None:
    packed = gzip.compress(intact, compresslevel=data.draw(st.sampled_from([0, 6])))
    cut = data.draw(st.integers(20, len(packed) - 1))
    unpacked = zlib.decompressobj(wbits=31).decompress(packed[:cut])
    path = tmp_path_factory.getbasetemp() / "cut.gz"
    path.write_bytes(packed[:cut])
    if not unpacked.strip() or b"mzML" not in unpacked:
        with pytest.raises(FormatError):
            read_run(path)
        return
    ended = b"</spectrumList>" in unpacked
    check_cut(
        lambda: read_run(path), whole_scans_before(unpacked, len(unpacked)), read_chunks([intact]), ended
    )


def test_the_place_of_a_cut_is_told(intact: bytes, write: Callable[..., Path]) -> None:
    cut = intact.index(b"</spectrum>", intact.index(b"scan=7"))
    run = read_run(write(intact[:cut]))
    line = intact.count(b"\n", 0, cut) + 1
    assert f"the XML stops at line {line}, column " in run.lost
    assert "6 of 12 spectra announced; 6 whole scans kept, the last at 360.25 s" in run.lost


def test_broken_xml_keeps_the_scans_before(intact: bytes, write: Callable[..., Path]) -> None:
    at = intact.index(b"<binary>", intact.index(b"scan=7"))
    run = read_run(write(intact[:at] + b"<<" + intact[at:]))
    assert len(run) == 6
    assert "the XML is broken: not well-formed" in run.lost


def test_a_cut_behind_the_last_scan_costs_nothing(intact: bytes, write: Callable[..., Path]) -> None:
    run = read_run(write(intact[: intact.index(b"</spectrumList>") + 20]))
    assert run.complete and len(run) == SCANS
    assert "behind the last scan; no scan is missing" in run.warnings[0]


def test_gzip_data_in_several_members(intact: bytes, write: Callable[..., Path]) -> None:
    """Block-wise compressed files are many members one after another, and may be filled up with zeros."""
    packed = b"".join(gzip.compress(piece) for piece in in_pieces(intact, 3_000)) + bytes(512)
    run = read_run(write(packed))
    assert len(run) == SCANS and run.complete and run.warnings == ()


def test_damaged_gzip_data_keep_the_scans_before(intact: bytes, write: Callable[..., Path]) -> None:
    packed = gzip.compress(intact, compresslevel=0)
    run = read_run(write(packed[:-8] + bytes(8)))
    assert len(run) >= whole_scans_before(intact, len(intact) - 10_000) > 6
    assert "the gzip data are damaged before byte" in " ".join(run.warnings)


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_changed_bytes_never_raise_anything_else(intact: bytes, data: st.DataObject) -> None:
    changed = bytearray(intact)
    for _ in range(data.draw(st.integers(1, 8))):
        changed[data.draw(st.integers(0, len(changed) - 1))] = data.draw(st.integers(0, 255))
    try:
        run = read_chunks([bytes(changed)], "run")
    except BranchposError as fault:
        assert str(fault).startswith("run: ")
    else:
        assert 0 < len(run) <= SCANS


def test_memory_follows_the_arrays_not_the_xml(plain: str) -> None:
    """User parameters swell the XML; what is held at once stays near the arrays."""
    filler = "".join(f'<userParam name="{at}" value="{"x" * 200}"/>' for at in range(200))
    one = re.search(r"<spectrum .*?</spectrum>", plain, re.DOTALL).group()
    swollen = one.replace("<scanList", filler + "<scanList")
    head, tail = plain[: plain.index("<spectrum ")], "</spectrumList></run></mzML></indexedmzML>"

    def chunks(count: int) -> Iterator[bytes]:
        yield head.replace('count="12"', f'count="{count}"').encode()
        for at in range(count):
            yield swollen.replace(f'value="{start(0)}"', f'value="{at + 1}"').encode()
        yield tail.encode()

    def peak(count: int) -> tuple[int, Run]:
        tracemalloc.start()
        run = read_chunks(chunks(count))
        held = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        return held, run

    (small, _), (large, run) = peak(20), peak(220)
    assert len(run) == 220 and run.complete
    xml = 200 * len(swollen)
    arrays = 200 * (run.mz.nbytes + run.intensity.nbytes + run.times.nbytes) / 220
    assert xml > 8_000_000
    assert large - small < 3 * arrays + 200 * 600 < xml / 20


def test_single_spectra_are_not_sought_in_a_run(plain: str, write: Callable[..., Path]) -> None:
    with pytest.raises(FormatError, match="a GC-MS run in mzML, not a spectrum; give it to"):
        read_spectra(write(plain))


def test_truncation_is_an_input_error_of_the_tree() -> None:
    """A source of bytes says that it stops by ``TruncatedError``, wherever that happens."""

    def stopping() -> Iterator[bytes]:
        yield b'<?xml version="1.0"?><mzML><run><spectrumList count="1">'
        raise TruncatedError("the line went dead", remedy="try again")

    with pytest.raises(FormatError, match="no whole scan with points before the line went dead; 0 of 1"):
        read_chunks(stopping(), "run")
