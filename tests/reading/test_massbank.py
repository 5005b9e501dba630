"""MassBank records: invented ones for the faults, real ones for check values."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

from branchpos.errors import FormatError, SpectrumError, TruncatedError
from branchpos.reading import read_file, read_spectrum


def record(
    rows: str = "  57 100 999\n  71 60 600\n",
    *,
    number: int = 2,
    accession: str = "T1",
    extra: str = "",
    end: str = "//\n",
) -> str:
    return (
        f"ACCESSION: {accession}\nRECORD_TITLE: invented; EI\n{extra}PK$NUM_PEAK: {number}\n"
        f"PK$PEAK: m/z int. rel.int.\n{rows}{end}"
    )


def test_all_records_of_a_file_are_read(write):
    reading = read_file(write(record() + record(accession="T2")))
    assert [s.mz.tolist() for s in reading.spectra] == [[57, 71], [57, 71]]
    assert reading.faults == ()
    assert reading.spectra[1].source.endswith("record T2 (line 8)")
    assert reading.spectra[0].title == "invented; EI"


def test_a_missing_end_mark_is_a_fault_and_the_rest_is_kept(write):
    path = write(record() + record(accession="T2", end=""))
    reading = read_file(path)
    assert len(reading.spectra) == 1
    (fault,) = reading.faults
    assert isinstance(fault, TruncatedError)
    assert str(fault).startswith(f"{path}: record T2 (line 8): the record stops without //")


def test_a_record_that_runs_into_the_next_costs_only_itself(write):
    reading = read_file(write(record(end="") + record(accession="T2")))
    assert [type(fault) for fault in reading.faults] == [TruncatedError]
    assert reading.spectra[0].metadata["ACCESSION"] == "T2"


@pytest.mark.parametrize("number", [1, 3])
def test_a_wrong_peak_count_is_a_warning(write, number):
    assert (
        f"2 peak rows where the record announces {number}"
        in read_spectrum(write(record(number=number))).warnings
    )


@pytest.mark.parametrize(
    ("rows", "kind", "words"),
    [
        ("  57 nan 999\n", SpectrumError, "line 5: intensity is nan; correct"),
        ("  57 inf 999\n", SpectrumError, "line 5: intensity is inf; correct"),
        ("  57 10 99\n  71 -3 30\n", SpectrumError, "line 6: intensity is -3, not a finite amount"),
        ("  0.5 10 99\n", SpectrumError, "line 5: m/z is 0.5, outside 1 to 5000"),
        ("  57 10 99\n  71 x 30\n", FormatError, "line 6: intensity is 'x', not a number"),
        ("  57 10\n", FormatError, "line 5: 2 values where the table has 3 columns"),
        ("  57 0 0\n", SpectrumError, "line 5: no peak has an intensity above zero"),
        ("", SpectrumError, "record T1 (line 1): the record has no peaks"),
    ],
)
def test_faults_name_file_line_value_and_remedy(write, rows, kind, words):
    path = write(record(rows))
    with pytest.raises(kind) as caught:
        read_spectrum(path)
    assert str(caught.value).startswith(f"{path}: {words}")
    assert caught.value.remedy


def test_the_finer_intensity_column_is_taken(write):
    coarse = read_spectrum(write(record("  57 100 999\n  71 6 64\n  85 6 58\n", number=3)))
    assert coarse.intensity.tolist() == [999, 64, 58]
    fine = read_spectrum(write(record("  57 100 999\n  71 6.44 64\n  85 6.36 64\n", number=3)))
    assert fine.intensity.tolist() == [100, 6.44, 6.36]


@pytest.mark.parametrize(
    ("extra", "words"),
    [
        ("AC$MASS_SPECTROMETRY: IONIZATION CI\n", "not electron ionisation: the record says 'CI'"),
        ("AC$INSTRUMENT_TYPE: LC-ESI-QTOF\n", "not electron ionisation: the record says 'LC-ESI-QTOF'"),
        ("AC$MASS_SPECTROMETRY: ION_MODE NEGATIVE\n", "not electron ionisation of positive ions"),
        ("AC$MASS_SPECTROMETRY: MS_TYPE MS2\n", "not a full scan: MS_TYPE MS2"),
        ("AC$MASS_SPECTROMETRY: IONIZATION_ENERGY 20 eV\n", "electron energy 20 eV"),
        ("AC$CHROMATOGRAPHY: RETENTION_INDEX 0.0000\n", "retention index '0.0000' is not one"),
    ],
)
def test_unfit_conditions_are_warnings(write, extra, words):
    assert any(note.startswith(words) for note in read_spectrum(write(record(extra=extra))).warnings)


def test_electron_ionisation_and_the_index_pass_without_a_word(write):
    extra = (
        "AC$INSTRUMENT_TYPE: GC-EI-TOF\nAC$MASS_SPECTROMETRY: IONIZATION EI\n"
        "AC$MASS_SPECTROMETRY: SCAN_RANGE_M/Z 40-550\nAC$CHROMATOGRAPHY: KOVATS_RTI 1889.5\n"
    )
    spectrum = read_spectrum(write(record(extra=extra)))
    assert (spectrum.retention_index, spectrum.warnings) == (1889.5, ())
    assert (spectrum.first_mass, spectrum.last_mass) == (40, 550)


def test_shifted_decimals_are_marked_and_do_not_lower_the_threshold(write):
    rows = "  43 9.77 98\n  55 1.5 15\n  57 99.99 999\n  71 12.3 123\n  83 2.6 26\n  84 0.28 3\n"
    spectrum = read_spectrum(write(record(rows, number=6)))
    assert spectrum.doubtful.tolist() == [True, False, False, False, False, True]
    assert spectrum.threshold == 1.5
    assert "2 peaks may be ten times too small (a shifted decimal)" in spectrum.warnings


def test_two_decimals_throughout_are_not_doubtful(write):
    rows = "  43 9.77 98\n  55 1.52 15\n  57 99.99 999\n  71 12.3 123\n"
    assert not read_spectrum(write(record(rows, number=4))).doubtful.any()


# ---- real records; the accession is the source of each check value ----


def real(shared: Path, accession: str) -> Path:
    return next((shared / "spectra").glob(f"*/*{accession}.txt"))


def test_a_dimethylpentacosane(shared):
    spectrum = read_spectrum(real(shared, "MSJ00076"))  # MSBNK-MSSJ-MSJ00076
    assert spectrum.mz.size == 78
    assert spectrum.accurate
    at = {round(mz): height for mz, height in zip(spectrum.mz, spectrum.intensity, strict=True)}
    assert (at[57], at[71], at[85]) == (999, 629, 679)
    assert spectrum.warnings == ()


def test_tetradecane_with_shifted_decimals(shared):
    spectrum = read_spectrum(real(shared, "JP007688"))  # MSBNK-Fac_Eng_Univ_Tokyo-JP007688
    assert spectrum.mz[spectrum.doubtful].tolist() == [43, 71, 84, 98, 113]
    assert spectrum.threshold == 0.1
    assert not spectrum.accurate


def test_an_iso_ester_with_its_index(shared):
    spectrum = read_spectrum(real(shared, "LIB-FAME-0003"))  # LIB-FAME-0003
    assert spectrum.retention_index == 1889.5
    assert spectrum.mz[spectrum.intensity.argmax()] == 74


def test_every_real_record_reads_or_says_that_it_is_empty(shared):
    files = sorted((shared / "spectra").glob("*/*.txt"))
    readings = [read_file(path) for path in files]
    faults = [fault for reading in readings for fault in reading.faults]
    # Seven records of the series LIB-FAME announce no peaks (PK$NUM_PEAK: 0) and hold none.
    assert (len(files), sum(len(reading.spectra) for reading in readings)) == (801, 794)
    assert [fault.problem for fault in faults] == ["the record has no peaks"] * 7


def test_marks_agree_with_the_flags_of_the_chains(shared):
    """The flag also covers records of two decimals throughout, where no value stands out: 87 of 148."""
    with (shared / "spectra" / "truth.csv").open(encoding="utf-8") as table:
        flagged = {row["accession"]: "decimal shift" in row["quality"] for row in csv.DictReader(table)}
    marked = {
        path.stem: bool(spectrum.doubtful.any())
        for path in (shared / "spectra" / "chains").glob("*.txt")
        for spectrum in read_file(path).spectra
    }
    pairs = [(flagged[name], mark) for name, mark in marked.items()]
    assert (pairs.count((False, True)), pairs.count((True, True))) == (0, 61)
