"""JCAMP-DX runs: pages of an n-tuple block.

The layout follows section 5.5.3 of Lampen et al., Appl. Spectrosc. 48 (1994) 1545 (from memory); no second
library reads such runs whole, so the numbers are compared with those that were written.
"""

from __future__ import annotations

import gzip
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from branchpos.errors import BranchposError, FormatError
from branchpos.reading import read_run, read_spectra
from branchpos.reading.jcamp_runs import read_chunks
from branchpos.reading.text_source import LONGEST_LINE

HEAD = """##TITLE= wax of an invented beetle $$ comment
##JCAMP-DX= 5.00
##DATA TYPE= MASS SPECTRUM
##DATA CLASS= NTUPLES
##ORIGIN= here
##OWNER= nobody
##.IONIZATION MODE= EI+
##NTUPLES= MASS SPECTRUM
##VAR_NAME= MASS, INTENSITY, RETENTION TIME
##SYMBOL= X, Y, T
##VAR_TYPE= INDEPENDENT, DEPENDENT, INDEPENDENT
##VAR_FORM= AFFN, AFFN, AFFN
##UNITS= M/Z, RELATIVE ABUNDANCE, SECONDS
"""
SCANS = [([57.0, 71.0, 85.0], [100, 60, 40]), ([43.0, 57.0], [9, 8]), ([55.0], [3.5]), ([41.0, 69.0], [4, 2])]
Write = Callable[..., Path]


def page(at: int, *, time: str = "T= {}") -> str:
    mz, intensity = SCANS[at]
    rows = "".join(f"{x:g},{y:g}\n" for x, y in zip(mz, intensity, strict=True))
    return (
        f"##PAGE= {time.format(10 * (at + 1))}\n##NPOINTS= {len(mz)}\n##DATA TABLE= (XY..XY), PEAKS\n{rows}"
    )


def text(**options: str) -> str:
    pages = "".join(page(at, **options) for at in range(len(SCANS)))
    return f"{HEAD}{pages}##END NTUPLES= MASS SPECTRUM\n##END=\n"


def check_whole(run, factor: float = 1.0) -> None:
    assert run.times.tolist() == pytest.approx([10 * factor, 20 * factor, 30 * factor, 40 * factor])
    assert run.scan_numbers.tolist() == [1, 2, 3, 4]
    for at, (mz, intensity) in enumerate(SCANS):
        assert run.scan(at)[0].tolist() == mz
        assert run.scan(at)[1].tolist() == intensity
    assert run.complete


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("zipped", [False, True], ids=["", "gzip"])
def test_what_was_written_is_read(end: str, zipped: bool, write: Write) -> None:
    data = text().replace("\n", end).encode()
    run = read_run(write(gzip.compress(data) if zipped else data))
    check_whole(run)
    assert run.warnings == ()
    assert run.metadata["TITLE"] == "wax of an invented beetle"


def test_times_in_minutes_and_on_the_clock(write: Write) -> None:
    check_whole(read_run(write(text().replace("SECONDS", "MINUTES"))), 60)
    check_whole(read_run(write(text(time="T= {} min"))), 60)
    check_whole(read_run(write(text(time="T={}:00"))), 60)
    unknown = read_run(write(text().replace(", SECONDS", "")))
    check_whole(unknown)
    assert unknown.warnings == ("the unit of the retention times is not stated; taken as seconds",)


def test_times_in_a_record_of_their_own(write: Write) -> None:
    given = text(time="N= {}").replace("##NPOINTS", "##RETENTION_TIME= later\n##NPOINTS")
    for time in (10, 20, 30, 40):
        given = given.replace("= later", f"= {time}", 1)
    check_whole(read_run(write(given)))


def test_factors_separators_and_several_pairs_a_line(write: Write) -> None:
    factors = text().replace("##UNITS", "##FACTOR= 0.1, 2, 1\n##UNITS")
    run = read_run(write(factors))
    assert run.scan(0)[0].tolist() == pytest.approx([5.7, 7.1, 8.5]) and run.scan(0)[1].tolist() == [
        200,
        120,
        80,
    ]
    joined = (
        text()
        .replace("57,100\n71,60\n85,40", "57,100 71,60;\t85 40 $$ comment")
        .replace("(XY..XY)", "(XI..XI)")
    )
    check_whole(read_run(write(joined)))


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("43,9\n57,8\n", "43,9\n57\n", "page 2, line 24: '57' is no list of m/z and intensity"),
        ("43,9\n57,8\n", "43,9\n57,8x\n", "page 2, line 24: '57,8x' is no list"),
        ("43,9\n57,8\n", "43,9\n57,1_0\n", "page 2, line 24: '57,1_0' is no list"),
        ("43,9\n57,8\n", "43,,9\n57\n", "page 2, line 23: '43,,9' is no list"),
        ("43,9\n57,8\n", "43,9\n57,nan\n", "scan 2: intensity nan at m/z 57"),
        ("43,9\n57,8\n", "43,9\n", "page 2, line 22: 1 pair where the page announces 2"),
        ("##PAGE= T= 20", "##PAGE= T= soon", "page 2, line 22: retention time is 'soon'"),
        ("##PAGE= T= 20", "##PAGE=", "page 2, line 22: the page has no retention time"),
        (
            "##NPOINTS= 2\n##DATA TABLE= (XY..XY)",
            "##NPOINTS= 2\n##DATA TABLE= (X++(Y..Y))",
            "is of the form '(X++(Y",
        ),
    ],
)
def test_a_damaged_page_is_named_and_costs_itself_only(old: str, new: str, words: str, write: Write) -> None:
    assert old in text()
    run = read_run(write(text().replace(old, new, 1)))
    assert run.scan_numbers.tolist() == [1, 3, 4]
    assert not run.complete
    assert words in run.lost


def test_profiles_are_refused_with_advice(write: Write) -> None:
    with pytest.raises(FormatError, match=r"page 1, line 16: the scan is a profile.*pick the peaks"):
        read_run(write(text().replace("PEAKS", "PROFILE")))


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("##TITLE= a\n##DATA TYPE= MASS SPECTRUM\n##END=\n", "no block holds scans in pages"),
        (
            text().replace("= MASS SPECTRUM\n##DATA C", "= INFRARED SPECTRUM\n##DATA C"),
            "type is 'INFRARED SPECTRUM'",
        ),
        ("##TITLE= a\n##PEAK TABLE= (XY..XY)\n57,1\n##END=\n", "the page has no retention time"),
        ("##TITLE= a\n" + "1" * 3 * LONGEST_LINE + "\n##END=\n", "a line holds more than 200000 characters"),
    ],
)
def test_what_cannot_be_a_run_is_refused(content: str, words: str, write: Write) -> None:
    path = write(content)
    with pytest.raises(BranchposError, match=words) as caught:
        read_run(path)
    assert str(caught.value).startswith(str(path))


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(cut=st.integers(len(HEAD), len(text()) - 1), size=st.sampled_from([1, 7, 64, 65_536]))
def test_a_cut_file_keeps_every_whole_page(cut: int, size: int) -> None:
    """A page is whole when the next label has begun: its last number may else have lost its end."""
    data = text().encode()
    kept = data[:cut]
    tables = kept.split(b"(XY..XY), PEAKS\n")[1:]
    whole = sum(b"\n##" in table and b"=" in table.partition(b"\n##")[2] for table in tables)
    pieces = (kept[at : at + size] for at in range(0, len(kept), size))
    if whole == 0:
        with pytest.raises(FormatError, match="no whole scan with points before the text stops at line"):
            read_chunks(pieces, "run")
        return
    run = read_chunks(pieces, "run")
    assert len(run) == whole
    for at in range(whole):
        assert run.scan(at)[0].tolist() == SCANS[at][0] and run.scan(at)[1].tolist() == SCANS[at][1]
    assert run.complete == kept.endswith((b"##END=", b"##END=\n"))
    if not run.complete:
        assert "the text stops at line" in run.lost and "without ##END=" in run.lost


def test_a_cut_in_the_second_of_joined_blocks_is_a_loss(write: Write) -> None:
    joined = f"##TITLE= both\n##DATA TYPE= LINK\n##BLOCKS= 2\n{text()}##TITLE= notes\n"
    run = read_run(write(joined))
    assert len(run) == 4 and not run.complete


def test_a_cut_gzip_file_keeps_whole_pages(write: Write) -> None:
    packed = gzip.compress(text().encode(), compresslevel=0)
    run = read_run(write(packed[: -8 - len("##END NTUPLES= MASS SPECTRUM\n##END=\n") - 3]))
    assert len(run) == 3
    assert "the gzip data stop early" in run.lost and "at line" in run.lost


@settings(max_examples=150, deadline=None)
@given(data=st.data())
def test_changed_bytes_never_raise_anything_else(data: st.DataObject) -> None:
    changed = bytearray(text().encode())
    for _ in range(data.draw(st.integers(1, 6))):
        changed[data.draw(st.integers(0, len(changed) - 1))] = data.draw(st.integers(0, 255))
    try:
        run = read_chunks([bytes(changed)], "run")
    except BranchposError as fault:
        assert str(fault).startswith("run: ")
    else:
        assert 0 < len(run) <= len(SCANS)


def test_the_pages_are_also_read_as_single_spectra(write: Write) -> None:
    spectra = read_spectra(write(text()))
    run = read_run(write(text()))
    assert [one.mz.tolist() for one in spectra] == [run.scan(at)[0].tolist() for at in range(len(run))]
    assert np.concatenate([one.intensity for one in spectra]).tolist() == run.intensity.tolist()
