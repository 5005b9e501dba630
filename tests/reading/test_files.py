"""What holds for every format: recognition, encodings, compression, several blocks, files of other kinds."""

from __future__ import annotations

import gzip

import pytest

from branchpos.errors import FormatError, InputError, SpectrumError, TruncatedError
from branchpos.reading import read_file, read_spectra, read_spectrum
from branchpos.reading.text_source import LARGEST_FILE

KEYED = "name: Größe\n57 100\n71 60\n\nname: b\n57 80\n85 3\n"
RECORDS = "".join(
    f"ACCESSION: {name}\nPK$PEAK: m/z int. rel.int.\n  57 100 999\n  71 50 500\n//\n"
    for name in ("A", "B", "C")
)


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "latin-1"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_encodings_and_line_ends(write, encoding, end):
    spectra = read_spectra(write(KEYED.replace("\n", end), encoding=encoding))
    assert [s.title for s in spectra] == ["Größe", "b"]


def test_gzip_is_transparent_and_the_suffix_tells_nothing(write):
    assert len(read_spectra(write(gzip.compress(KEYED.encode()), name="wrong.csv"))) == 2
    joined = gzip.compress(RECORDS.encode()) + gzip.compress(RECORDS.encode())
    assert len(read_spectra(write(joined))) == 6


def test_a_cut_gzip_file_keeps_whole_records(write):
    path = write(gzip.compress(RECORDS.encode(), compresslevel=0)[: -len(RECORDS) // 6 - 8])
    reading = read_file(path)
    assert [s.metadata["ACCESSION"] for s in reading.spectra] == ["A", "B"]
    assert all(isinstance(fault, TruncatedError) for fault in reading.faults)
    assert "the gzip data stop early" in str(reading.faults[-1])
    assert "another block of the file was left out" in read_spectra(path)[0].warnings[-1]


def test_a_cut_gzip_file_without_end_marks_loses_its_last_block(write):
    reading = read_file(write(gzip.compress(KEYED.encode(), compresslevel=0)[:-10]))
    assert [s.title for s in reading.spectra] == ["Größe"]
    assert "the block at the cut is left out" in str(reading.faults[0])


def test_damaged_gzip_data(write):
    data = bytearray(gzip.compress(KEYED.encode()))
    data[-8] ^= 0xFF
    with pytest.raises(FormatError, match="the gzip data are damaged; copy the file again"):
        read_file(write(bytes(data)))


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "the file is empty; export"),
        (b" \n\n ", "the file holds nothing but blanks; export"),
        (bytes(range(256)) * 4, "the file is binary, not text; export"),
        (
            b"CDF\x01rest",
            "the file is a GC-MS run in netCDF, not a spectrum in text form; give it to `branchpos screen`",
        ),
        (b"%PDF-1.7 x", "the file is a PDF document"),
        (b"PK\x03\x04 x", "the file is a zip archive or a spreadsheet"),
        (b"<?xml version='1.0'?>\n<mzML>", "the file is a GC-MS run in mzML"),
        (b"<!DOCTYPE html>", "the file is a web page"),
        (b'{"a": [57, 100]}', "the file is a JSON file"),
        (
            b"Dear colleague,\nthe spectrum is attached.\n",
            "no format fits a file that begins 'Dear colleague,'; give",
        ),
        (b"57 1\n" + b"1" * 300_000, "line 2: the line holds 300000 characters"),
    ],
)
def test_other_files_are_refused_in_one_line(write, content, words):
    path = write(content)
    with pytest.raises(FormatError) as caught:
        read_file(path)
    assert str(caught.value).startswith(f"{path}: {words}")
    assert "\n" not in str(caught.value)
    assert caught.value.remedy


@pytest.mark.parametrize("pack", [bytes, gzip.compress])
def test_a_file_too_large_is_refused(write, pack):
    with pytest.raises(FormatError, match=r"more than 32 MB.*split it"):
        read_file(write(pack(b"57 100\n" * (LARGEST_FILE // 7 + 2))))


def test_a_missing_file_and_a_folder(tmp_path):
    with pytest.raises(InputError, match=r"nothing\.txt: cannot be opened: .*; check the path"):
        read_file(tmp_path / "nothing.txt")
    with pytest.raises(InputError, match="cannot be opened"):
        read_file(tmp_path)


def test_one_spectrum_is_asked_of_a_file_of_several(write):
    path = write(KEYED)
    with pytest.raises(SpectrumError) as caught:
        read_spectrum(path)
    assert str(caught.value) == (
        f"{path}: the file holds 2 spectra, not one; "
        "pick one by number, read_spectra(path)[0] (0: 'Größe', 1: 'b')"
    )


def test_the_source_is_the_path_and_the_block_only_where_there_are_several(write):
    path = write("name: a\n57 1\n71 2\n")
    assert read_spectrum(path).source == str(path)
    assert [s.source for s in read_spectra(write(KEYED, name="two"))] == [
        str(path.with_name("two")) + ": spectrum at line 1",
        str(path.with_name("two")) + ": spectrum at line 5",
    ]
