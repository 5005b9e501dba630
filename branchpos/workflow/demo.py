"""The demonstration: an invented fraction written to files, read back, and judged peak by peak."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from branchpos.reading import read_spectrum
from branchpos.reporting.records import locate_document, verdict_record
from branchpos.retention_index import RetentionIndex
from branchpos.spectrum import Spectrum
from branchpos.verdict import Verdict
from branchpos.workflow.demo_data import INDEX_SD, INVENTED, ORIGIN, SEED, InventedPeak, invent_fraction
from branchpos.workflow.locate import locate_branches
from branchpos.workflow.method import Method
from branchpos.workflow.model import shipped_model
from branchpos.workflow.picture import picture_of

Progress = Callable[[str], None]
"""Called with one line of text for every step."""

SPECTRA, RESULTS, TABLE = "spectra", "results_invented.json", "peaks_invented.csv"
TRUTH, READ_ME = "invented_truth.csv", "README.txt"
_DRAWN = ("13-methylheptacosane", "5,15-dimethylheptacosane")
"""What the peaks were made from that a figure is drawn of."""


@dataclass(frozen=True, slots=True)
class JudgedPeak:
    """One invented peak, the file it was read back from, the spectrum in it, and the verdict."""

    peak: InventedPeak
    file: Path
    spectrum: Spectrum
    verdict: Verdict


def run_demo(out: Path, progress: Progress | None = None) -> list[Path]:
    """Invent a hydrocarbon fraction, judge every peak of it, and write data and results.

    Nothing in it was measured. It shows what the program does and says nothing of how well.

    Parameters
    ----------
    out : folder to write to; made where it is missing.
    progress : told each step in words.

    Returns
    -------
    the files written, those to look at first in front.
    """
    tell = progress or _say_nothing
    tell(f"{INVENTED}: {ORIGIN}")
    peaks = invent_fraction(shipped_model())
    (out / SPECTRA).mkdir(parents=True, exist_ok=True)
    judged = []
    for peak in peaks:
        judged.append(_judge(peak, out / SPECTRA))
        tell(_line(judged[-1]))
    return _write(judged, out)


def _say_nothing(line: str) -> None:
    del line


def _judge(peak: InventedPeak, folder: Path) -> JudgedPeak:
    file = folder / f"invented_peak_{peak.number:02d}.txt"
    file.write_text(peak.file_text(), encoding="utf-8")
    spectrum = read_spectrum(file)
    index = RetentionIndex(spectrum.retention_index or peak.index, INDEX_SD)
    verdict = locate_branches(spectrum, Method(chain=("alkane",)), index)
    return JudgedPeak(peak, file, spectrum, verdict)


def _line(one: JudgedPeak) -> str:
    return f"{one.peak.title}, index {one.peak.index:.1f}: {one.verdict.call} ({one.verdict.status.value})"


def _write(judged: Sequence[JudgedPeak], out: Path) -> list[Path]:
    paths = [out / name for name in (READ_ME, TABLE, RESULTS, TRUTH)]
    paths[0].write_text(_read_me(), encoding="utf-8")
    _write_table(judged, paths[1])
    _write_results(judged, paths[2], out)
    _write_truth(judged, paths[3])
    figures = [_draw(one, out) for one in judged if one.peak.truth in _DRAWN]
    return [*paths, *figures, *(one.file for one in judged)]


def _draw(one: JudgedPeak, out: Path) -> Path:
    from branchpos.reporting.figures import save_figure, verdict_figure

    path = out / f"invented_peak_{one.peak.number:02d}.svg"
    save_figure(verdict_figure(picture_of(one.spectrum, one.verdict), one.spectrum), path)
    return path


def _write_table(judged: Sequence[JudgedPeak], path: Path) -> None:
    heads = ("data", "peak", "retention_index", "status", "call", "probability", "none_of_these",
             "credible_set")  # fmt: skip
    rows = [
        (
            INVENTED,
            one.peak.number,
            f"{one.peak.index:.1f}",
            one.verdict.status.value,
            one.verdict.call,
            f"{one.verdict.hypotheses[0].posterior:.3f}",
            f"{one.verdict.none_of_these:.3f}",
            "; ".join(one.verdict.credible_set),
        )
        for one in judged
    ]
    _write_csv(path, heads, rows)


def _write_truth(judged: Sequence[JudgedPeak], path: Path) -> None:
    rows = [(INVENTED, one.peak.number, one.peak.truth) for one in judged]
    _write_csv(path, ("data", "peak", "made_from"), rows)


def _write_csv(path: Path, heads: Sequence[str], rows: Sequence[Sequence[object]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.writer(stream)
        writer.writerow(heads)
        writer.writerows(rows)


def _write_results(judged: Sequence[JudgedPeak], path: Path, out: Path) -> None:
    records = []
    for one in judged:
        record = verdict_record(one.verdict)
        records.append({**record, "source": one.file.relative_to(out).as_posix()})
    text = json.dumps(locate_document(records, Method().prior), indent=1, ensure_ascii=False)
    path.write_text(text + "\n", encoding="utf-8")


def _read_me() -> str:
    return f"""{INVENTED.upper()}

Everything in this folder was invented: {ORIGIN}.
No compound, spectrum or retention index here was measured.

How it was made: the program's own model predicted the ions and the index of each compound that
{TRUTH} names. The yields were drawn once from their covariance, every ion and index was given a random
error as large as the fitted errors are, and ions below 0.5 % of the base peak were dropped (seed {SEED}).
The alkene and the contaminant were made up by hand.

The program then read the files in {SPECTRA}/ like any others, with the index and a standard deviation
of {INDEX_SD:g} unit. {TABLE} holds one line a peak; {RESULTS} holds every hypothesis and its ions.

Since the program judges what it made itself, the outcome is never evidence of how accurate it is.
For that see the validation report, which rests on measured spectra.
"""
