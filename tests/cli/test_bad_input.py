"""Whatever is wrong with one file: one line that names it, the right exit status, and the others are done."""

from __future__ import annotations

import gzip
import json
import subprocess
import sys
from pathlib import Path

import pytest

from tests.cli.conftest import Run

MASSBANK = """ACCESSION: X-1
RECORD_TITLE: {title}
AC$INSTRUMENT_TYPE: {kind}
AC$MASS_SPECTROMETRY: IONIZATION {ionisation}
PK$NUM_PEAK: {count}
PK$PEAK: m/z int. rel.int.
  57.0 100 999
  71.0 60 599
  85.0 40 399
//
"""

JUNK = bytes(range(256)) * 40

FAILING = {
    "empty": (b"", "empty"),
    "binary junk": (JUNK, "text"),
    "truncated record": (
        MASSBANK.format(title="t", kind="GC-EI-Q", ionisation="EI", count=3)[:-30].encode(),
        "",
    ),
    "negative intensity": (b"57\t100\n71\t-60\n85\t40\n", "-60"),
    "not a number": (b"57\t100\n71\tnan\n85\t40\n", "nan"),
    "chemical ionisation": (
        MASSBANK.format(title="t", kind="GC-CI-Q", ionisation="CI", count=3).encode(),
        "--formula",
    ),
    "cut gzip": (gzip.compress(b"57\t100\n71\t60\n85\t40\n" * 50)[:-20], "gzip"),
}


@pytest.mark.parametrize("what", FAILING)
def test_a_bad_file_is_one_line_and_the_next_file_is_done(
    what: str, tmp_path: Path, good: Path, run: Run
) -> None:
    content, word = FAILING[what]
    bad = tmp_path / "bad.txt"
    bad.write_bytes(content)
    out = tmp_path / "out.json"
    result = run("locate", bad, good, "--quiet", "--json", out)
    assert result.exit_code == 1
    lines = result.stderr.splitlines()
    assert len(lines) == 1
    assert str(bad) in lines[0]
    assert word.lower() in lines[0].lower()
    assert ";" in lines[0], "a remedy follows the semicolon"
    assert [one["source"] for one in json.loads(out.read_text())["results"]] == [str(good)]


@pytest.mark.parametrize("place", ["missing", "folder"])
def test_a_path_that_is_no_file(place: str, tmp_path: Path, good: Path, run: Run) -> None:
    path = tmp_path if place == "folder" else tmp_path / "nothing.txt"
    result = run("locate", path, good)
    assert result.exit_code == 1
    assert result.stderr.startswith(f"branchpos: {path}: cannot be opened")
    assert "check the path" in result.stderr
    assert str(good) in result.stdout


DOUBTFUL = {
    "unsorted and duplicate": "85\t40\n57\t100\n71\t60\n57\t20\n99\t8\n43\t80\n",
    "one peak": "57\t100\n",
    "nothing above m/z 50": "27\t40\n29\t60\n39\t20\n41\t70\n43\t100\n",
}


@pytest.mark.parametrize("what", DOUBTFUL)
def test_thin_spectra_give_a_result_that_is_not_sure_or_a_failure(
    what: str, tmp_path: Path, run: Run
) -> None:
    path = tmp_path / "thin.txt"
    path.write_text(DOUBTFUL[what], encoding="utf-8")
    result = run("locate", path, "--json", "-")
    if result.exit_code == 0:
        verdict = json.loads(result.stdout)["results"][0]["verdict"]
        assert verdict["status"] not in ("assigned", "narrowed")
    else:
        assert result.exit_code == 1
        assert result.stderr.startswith(f"branchpos: {path}")


def test_a_wrong_count_of_peaks_is_a_doubt_in_the_result(tmp_path: Path, run: Run) -> None:
    path = tmp_path / "nine.txt"
    path.write_text(MASSBANK.format(title="t", kind="GC-EI-Q", ionisation="EI", count=9), encoding="utf-8")
    result = run("locate", path, "--json", "-")
    assert result.exit_code == 0
    assert any("9" in warning for warning in json.loads(result.stdout)["results"][0]["warnings"])


def test_a_text_file_of_a_hundred_megabytes_is_refused_quickly(tmp_path: Path, good: Path, run: Run) -> None:
    path = tmp_path / "large.txt"
    with path.open("wb") as stream:
        for _ in range(100):
            stream.write(b"57\t100\n71\t60\n" * 77_000)
    assert path.stat().st_size > 100_000_000
    result = run("locate", path, good)
    assert result.exit_code == 1
    assert len(result.stderr.splitlines()) == 1
    assert str(path) in result.stderr
    assert str(good) in result.stdout


def test_faults_inside_a_file_leave_its_good_spectra(tmp_path: Path, run: Run) -> None:
    text = MASSBANK.format(title="good", kind="GC-EI-Q", ionisation="EI", count=3)
    path = tmp_path / "three.txt"
    path.write_text(text + text.replace("71.0 60", "71.0 -60") + text, encoding="utf-8")
    result = run("locate", path, "--json", "-")
    assert result.exit_code == 1
    assert "line" in result.stderr
    assert len(json.loads(result.stdout)["results"]) == 2


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--carbon", "20"], "--carbons"),
        (["--carbons", "forty"], "write a number"),
        (["--carbons", "40-20"], "20-40"),
        (["--methyls", "0-9"], "within"),
        (["--prior", "flatt"], "did you mean 'flat'"),
        (["--chain", "alkan"], "did you mean 'alkane'"),
        (["--formula", "C27H"], "C27H"),
        (["--level", "2"], "level 2"),
        (["--index-sd", "1"], "--index"),
        (["--index", "-5"], "retention index is -5"),
        (["--figure", "out.gif"], ".svg"),
        (["--json", "no-such-folder/out.json"], "no-such-folder"),
        (["--method", "no-such.toml"], "no-such.toml"),
    ],
)
def test_bad_use_is_one_line_and_exit_status_2(
    arguments: list[str], words: str, good: Path, run: Run
) -> None:
    result = run("locate", good, *arguments)
    assert result.exit_code == 2
    assert len(result.stderr.splitlines()) == 1
    assert words in result.stderr
    assert result.stdout == ""


def test_a_method_file_names_the_line_that_is_wrong(tmp_path: Path, good: Path, run: Run) -> None:
    method = tmp_path / "method.toml"
    method.write_text('methyls = "0-2"\ncarbon = "20-30"\n', encoding="utf-8")
    result = run("locate", good, "--method", method)
    assert result.exit_code == 2
    assert f"{method}: line 2" in result.stderr
    assert "carbons" in result.stderr


def test_the_index_goes_with_one_spectrum_only(two: Path, good: Path, run: Run) -> None:
    for arguments in ([two], [good, good]):
        result = run("locate", *arguments, "--index", "1260")
        assert result.exit_code == 2
        assert "one spectrum" in result.stderr
        assert result.stdout == ""


def test_an_unknown_command_suggests_the_nearest(run: Run) -> None:
    result = run("locat")
    assert result.exit_code == 2
    assert "locate" in result.stderr


def test_unknown_names_fail_one_by_one(run: Run) -> None:
    result = run("predict", "5,11-dimethylpentacosane", "5,11-dimethylpentacosan", "2-MeC26", "--json", "-")
    assert result.exit_code == 1
    assert len(result.stderr.splitlines()) == 1
    assert "5,11-dimethylpentacosan:" in result.stderr
    assert [one["shorthand"] for one in json.loads(result.stdout)["results"]] == ["5,11-diMeC25", "2-MeC26"]


@pytest.mark.parametrize(
    "arguments",
    [
        ["--carbons", "27", "--methyls", "x"],
        ["--carbons", "4", "--methyls", "1"],
        ["--carbons", "27", "--methyls", "9"],
        ["--carbons", "27", "--methyls", "2", "--chain", "alkan"],
    ],
)
def test_isomers_refuses_what_it_cannot_list(arguments: list[str], run: Run) -> None:
    result = run("isomers", *arguments)
    assert result.exit_code == 2
    assert len(result.stderr.splitlines()) == 1


def test_a_file_that_cannot_be_written_is_told(tmp_path: Path, good: Path, run: Run) -> None:
    (tmp_path / "taken").mkdir()
    result = run("locate", good, "--json", tmp_path / "taken")
    assert result.exit_code == 2
    assert "folder" in result.stderr


def test_the_exit_status_reaches_the_shell(tmp_path: Path) -> None:
    command = [sys.executable, "-m", "branchpos", "locate", str(tmp_path / "none.txt")]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert done.returncode == 1
    assert done.stdout == ""
    assert done.stderr.startswith("branchpos: ")
    assert len(done.stderr.splitlines()) == 1
