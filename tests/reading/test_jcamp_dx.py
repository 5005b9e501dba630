"""JCAMP-DX files after Lampen et al., Appl. Spectrosc. 48 (1994) 1545; all invented here."""

from __future__ import annotations

import pytest

from branchpos.errors import FormatError, SpectrumError, TruncatedError
from branchpos.reading import read_file, read_spectrum


def block(
    table: str = "43,50 57,100\n71,60 $$ a remark\n",
    extra: str = "",
    title: str = "invented",
    end: str = "##END=\n",
) -> str:
    return (
        f"##TITLE= {title}\n##JCAMP-DX= 5.00 $$ version\n##DATA TYPE= MASS SPECTRUM\n{extra}"
        f"##NPOINTS= 3\n##PEAK TABLE= (XY..XY)\n{table}{end}"
    )


PAGES = (
    "##TITLE= run\n##DATA TYPE= MASS SPECTRUM\n##DATA CLASS= NTUPLES\n##NTUPLES= MASS SPECTRUM\n"
    "##VAR_NAME= MASS, INTENSITY, RETENTION TIME\n##SYMBOL= X, Y, T\n##FACTOR= 0.1, 2, 1\n"
    "##PAGE= T = 5\n##NPOINTS= 2\n##DATA TABLE= (XY..XY), PEAKS\n570,10; 710,5\n"
    "##PAGE= T = 6\n##NPOINTS= 2\n##DATA TABLE= (XY..XY), PEAKS\n570,8; {last}\n"
    "##END NTUPLES= MASS SPECTRUM\n##END=\n"
)


def test_a_peak_table(write):
    spectrum = read_spectrum(write(block(extra="##.IONIZATION MODE= EI+\n##$RETENTION INDEX= 1500\n")))
    assert spectrum.mz.tolist() == [43, 57, 71]
    assert spectrum.intensity.tolist() == [50, 100, 60]
    assert (spectrum.title, spectrum.retention_index, spectrum.warnings) == ("invented", 1500, ())


def test_factors_apply(write):
    spectrum = read_spectrum(write(block("430,5 570,10 710,6\n", extra="##XFACTOR= 0.1\n##YFACTOR= 10\n")))
    assert spectrum.mz.tolist() == pytest.approx([43, 57, 71])
    assert spectrum.intensity.tolist() == [50, 100, 60]


def test_xy_points(write):
    assert read_spectrum(write(block().replace("PEAK TABLE", "XYPOINTS"))).mz.size == 3


def test_each_page_is_a_spectrum(write):
    first, second = read_file(write(PAGES.format(last="710,4"))).spectra
    assert first.mz.tolist() == pytest.approx([57, 71])
    assert (first.intensity.tolist(), second.intensity.tolist()) == ([20, 10], [16, 8])
    assert second.title == "run, T = 6"
    assert second.source.endswith("page 2")


def test_a_bad_page_costs_only_itself(write):
    reading = read_file(write(PAGES.format(last="710,abc")))
    assert len(reading.spectra) == 1
    assert "line 15" in str(reading.faults[0])
    assert "'abc', not a number" in str(reading.faults[0])


def test_compound_and_joined_blocks(write):
    inner = block(title="a") + block(title="b")
    structure = "##TITLE= s\n##JCAMP-CS= 3.7\n##END=\n"
    text = f"##TITLE= outer\n##DATA TYPE= LINK\n##BLOCKS= 3\n{inner}{structure}##END=\n{block(title='c')}"
    reading = read_file(write(text))
    assert [s.title for s in reading.spectra] == ["a", "b", "c"]
    assert reading.faults == ()
    assert "1 block of another kind left out (line 20: structure)" in reading.spectra[0].warnings


def test_lost_inner_blocks_are_reported(write):
    text = f"##TITLE= outer\n##DATA TYPE= LINK\n##BLOCKS= 5\n{block()}##END=\n"
    assert "##BLOCKS= announces 5, but 1 are there" in str(read_file(write(text)).faults[0])


def test_a_missing_end_is_truncation(write):
    path = write(block(title="a") + block(title="b", end=""))
    reading = read_file(path)
    assert [s.title for s in reading.spectra] == ["a"]
    assert isinstance(reading.faults[0], TruncatedError)
    assert str(reading.faults[0]).startswith(f"{path}: block at line 9: the block stops without ##END=")


def test_a_wrong_count_is_a_warning(write):
    assert "2 peak rows where the record announces 3" in read_spectrum(write(block("57,1 71,2\n"))).warnings


@pytest.mark.parametrize(
    ("table", "kind", "words"),
    [
        ("57,1\n71,\n", FormatError, "line 7: a value is missing among the pairs '71,'"),
        ("57,1 71\n", FormatError, "line 6: a value is missing"),
        ("57,1\n71,?\n", FormatError, "line 7: a value of the peak table is '?', not a number"),
        ("57,nan\n", SpectrumError, "line 6: intensity is nan"),
        ("57,-2\n", SpectrumError, "line 6: intensity is -2"),
    ],
)
def test_bad_values_are_named_with_their_line(write, table, kind, words):
    path = write(block(table))
    with pytest.raises(kind) as caught:
        read_spectrum(path)
    assert str(caught.value).startswith(f"{path}: {words}")
    assert caught.value.remedy


def test_another_table_form_is_refused(write):
    with pytest.raises(FormatError, match=r"of the form '\(X\+\+\(Y..Y\)\)'.*export the peaks"):
        read_spectrum(write(block().replace("(XY..XY)", "(X++(Y..Y))")))


def test_an_infrared_spectrum_is_refused(write):
    with pytest.raises(FormatError, match=r"no block is a mass spectrum \(line 1: INFRARED SPECTRUM\)"):
        read_spectrum(write(block().replace("MASS SPECTRUM", "INFRARED SPECTRUM")))


@pytest.mark.parametrize(
    "label", [".IONIZATION MODE= CI+", ".Ionization_Mode=CI-", "SPECTRUM TYPE= chemical ionization"]
)
def test_chemical_ionisation_is_a_warning(write, label):
    notes = read_spectrum(write(block(extra=f"##{label}\n"))).warnings
    assert [note[:23] for note in notes] == ["not electron ionisation"]
