"""Delimited peak lists, all invented here."""

from __future__ import annotations

import pytest

from branchpos.errors import FormatError, SpectrumError
from branchpos.reading import read_spectrum


@pytest.mark.parametrize(
    "text",
    [
        "57.07,100.5\n71.08,60\n",
        "57.07, 100.5\n71.08, 60\n",
        "57,07;100,5\n71,08;60\n",
        "57,07\t100,5\n71,08\t60\n",
        "57,07 100,5\n71,08 60\n",
        "57.07  100.5\r\n71.08  60\r\n",
        "57.07\t100.5\r71.08\t60\r",
        "m/z;Intensity\n57,07;100,5\n71,08;60\n",
        "Abundance,Mass (u)\n100.5,57.07\n60,71.08\n",
        '"No","m/z","Rel. Int. (%)"\n1,57.07,100.5\n2,71.08,60\n',
        "# a remark\n\nmz intensity\n57.07 100.5\n71.08 60",
    ],
)
def test_delimiters_headers_and_decimal_commas(write, text):
    spectrum = read_spectrum(write(text))
    assert spectrum.mz.tolist() == [57.07, 71.08]
    assert spectrum.intensity.tolist() == [100.5, 60]
    assert spectrum.warnings == ()


@pytest.mark.parametrize(
    ("text", "kind", "words"),
    [
        ("m/z,intensity\n57,nan\n71,2\n", SpectrumError, "line 2: intensity is nan"),
        ("57,1\n71,-2\n", SpectrumError, "line 2: intensity is -2"),
        ("57,1\n0.2,2\n", SpectrumError, "line 2: m/z is 0.2"),
        ("57,1\n71,2\nend,3\n", FormatError, "line 3: m/z is 'end', not a number"),
        ("57,1\n71,2\n85\n", FormatError, "line 3: '85' has no intensity"),
        (
            "time,intensity\n5.1,100\n5.2,90\n",
            FormatError,
            "line 1: no column is named m/z among 'time, intensity'",
        ),
        ("1,57\n2,71\n3,85\n4,99\n5,113\n", SpectrumError, "line 1: the first column counts from 1 to 5"),
        ("9,57\n2,71\n3,85\n4,99\n5,113\n", SpectrumError, "line 1: the second column rises"),
        ("57;1.234\n71;2,5\n", FormatError, "line 1: '1.234' stands in a list with both a decimal comma and"),
        (
            "\n".join(f"{5 + k / 10:.1f},{k % 3}" for k in range(30)),
            SpectrumError,
            "line 1: the m/z column rises evenly",
        ),
        (
            "57,07,100,5\n71,08,60,1\n",
            FormatError,
            "line 1: the commas of '57,07,100,5' may be decimal commas",
        ),
        ("57,07,100\n71,08,60\n", FormatError, "line 1: the commas of '57,07,100' may be decimal commas"),
        ("57000,1\n71,2\n", SpectrumError, "line 1: m/z is 57000, outside 1 to 5000"),
    ],
)
def test_faults_name_file_line_value_and_remedy(write, text, kind, words):
    path = write(text)
    with pytest.raises(kind) as caught:
        read_spectrum(path)
    assert str(caught.value).startswith(f"{path}: {words}")
    assert caught.value.remedy


def test_more_rows_than_a_spectrum_has(write):
    text = "".join(f"{50 + (k * 7919) % 900},{k % 97 + 1}\n" for k in range(100_002))
    with pytest.raises(SpectrumError, match="more than 100000 rows for one spectrum"):
        read_spectrum(write(text))


@pytest.mark.parametrize(
    ("text", "note"),
    [
        ("71,60\n57,100\n", "peaks not in the order of m/z; sorted"),
        ("57,60\n57,40\n71,5\n", "1 peak of repeated m/z summed into the first"),
        ("57,60\n71,0\n", "1 peak of zero intensity left out"),
        ("57,60\n", "only one peak"),
        ("41,60\n43,100\n", "no peak above m/z 50: nothing to place a branch on"),
        (
            "# chemical ionisation\n57,60\n71,5\n",
            "not electron ionisation: the record says 'chemical ionisation'",
        ),
    ],
)
def test_oddities_are_warnings(write, text, note):
    assert note in read_spectrum(write(text)).warnings
