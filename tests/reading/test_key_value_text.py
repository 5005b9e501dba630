"""Plain text with key lines above pairs, all invented here."""

from __future__ import annotations

import pytest

from branchpos.errors import FormatError, SpectrumError, TruncatedError
from branchpos.reading import read_file, read_spectrum


@pytest.mark.parametrize(
    "pairs",
    [
        "43 50\n57 100\n71 60\n",
        "43 50; 57 100;\n71 60;\n",
        "43,50\n57,100\n71,60\n",
        "43:50; 57:100; 71:60\n",
        "m/z intensity\n43\t50\n57\t100\n71\t60\n",
        "Peaks: 43 50; 57 100; 71 60\n",
        "Peaks:\n\n43 50\n57 100\n71 60\n",
    ],
)
def test_pairs_below_keys(write, pairs):
    spectrum = read_spectrum(write(f"NAME: peak 14\nRetention Index: 2581.3\nNum Peaks: 3\n{pairs}"))
    assert spectrum.mz.tolist() == [43, 57, 71]
    assert spectrum.intensity.tolist() == [50, 100, 60]
    assert (spectrum.title, spectrum.retention_index, spectrum.warnings) == ("peak 14", 2581.3, ())
    assert spectrum.metadata["NAME"] == "peak 14"


@pytest.mark.parametrize("gap", ["", "\n", "\n\n"])
def test_several_spectra(write, gap):
    reading = read_file(write(f"name: a\n57 100\n71 60\n{gap}Name = b\n57 80\n"))
    assert [s.title for s in reading.spectra] == ["a", "b"]
    assert reading.faults == ()


def test_a_bad_spectrum_costs_only_itself(write):
    path = write("name: a\n57 100\n71 x\n\nname: b\n57 80\n71 3\n")
    reading = read_file(path)
    assert [s.title for s in reading.spectra] == ["b"]
    assert str(reading.faults[0]).startswith(f"{path}: line 3: intensity is 'x', not a number")


def test_fewer_peaks_than_announced(write):
    text = "name: a\nnum peaks: 3\n57 100\n71 60\n"
    with pytest.raises(TruncatedError, match="spectrum at line 1: the file stops after 2 peaks of 3; export"):
        read_spectrum(write(text))
    inside = read_file(write(f"{text}\nname: b\n57 1\n")).spectra[0]
    assert "2 peak rows where the record announces 3" in inside.warnings


@pytest.mark.parametrize(
    ("rows", "kind", "words"),
    [
        ("57 nan\n", SpectrumError, "line 2: intensity is nan"),
        ("57 1\n71 -4\n", SpectrumError, "line 3: intensity is -4"),
        ("57 1\n0.1 4\n", SpectrumError, "line 3: m/z is 0.1"),
        ("57,07 100,5\n", FormatError, "line 2: '57,07 100,5' is not one m/z and one intensity"),
        (
            "57,07;100,5\n71,08;60,1\n",
            FormatError,
            "line 2: '57,07; 100,5' may be two pairs, or one with decimal",
        ),
        ("57 1\n71\n", FormatError, "line 3: '71' is not one m/z and one intensity"),
        (
            "intensity m/z\n100 57\n",
            FormatError,
            "line 2: the columns are headed 'intensity m/z'; put m/z first",
        ),
    ],
)
def test_faults_name_file_line_value_and_remedy(write, rows, kind, words):
    path = write(f"name: a\n{rows}")
    with pytest.raises(kind) as caught:
        read_spectrum(path)
    assert str(caught.value).startswith(f"{path}: {words}")
    assert caught.value.remedy


@pytest.mark.parametrize("key", ["ionization: CI", "Ionisation mode: chemical", "IONIZATION_MODE: CI+"])
def test_chemical_ionisation_is_a_warning(write, key):
    notes = read_spectrum(write(f"name: a\n{key}\n57 1\n71 2\n")).warnings
    assert [note[:23] for note in notes] == ["not electron ionisation"]


def test_remarks_beside_peaks_are_counted(write):
    assert "remarks beside 1 peak not read" in read_spectrum(write('name: a\n57 1 "C4H9"\n71 2\n')).warnings
