"""Reading spectra and runs: a file is recognised by its content, and every good spectrum in it is kept."""

from __future__ import annotations

from dataclasses import replace
from itertools import islice
from pathlib import Path

from branchpos.errors import InputError, SpectrumError, TruncatedError
from branchpos.reading.formats import recognise
from branchpos.reading.numerals import counted, quoted
from branchpos.reading.outcome import MOST_BLOCKS, Reading, too_many_blocks
from branchpos.reading.runs import read_run
from branchpos.reading.text_source import SourceText, load_text
from branchpos.spectrum import Spectrum

__all__ = ["Reading", "read_file", "read_run", "read_spectra", "read_spectrum"]


def read_file(path: str | Path) -> Reading:
    """Read all that a file holds; what is wrong inside it comes back as faults beside the good spectra.

    Raises
    ------
    InputError : the file cannot be opened.
    FormatError : the file as a whole is in no format that is read.
    """
    source = load_text(path)
    form = recognise(source)
    found = list(islice(form.read_lines(source.lines), MOST_BLOCKS + 1))
    faults = _cut_short(source, found, form.has_end_mark) if source.cut else []
    if len(found) > MOST_BLOCKS:
        found[MOST_BLOCKS:] = [too_many_blocks()]
    total = len(found)
    spectra = tuple(_with_source(item, source.file, total) for item in found if isinstance(item, Spectrum))
    faults = [*(item.located(file=source.file) for item in found if isinstance(item, InputError)), *faults]
    if not spectra and not faults:
        faults = [SpectrumError("the file holds no spectrum", file=source.file, remedy="export it again")]
    return Reading(spectra, tuple(faults))


def read_spectra(path: str | Path) -> list[Spectrum]:
    """Read every good spectrum of a file; blocks that are not good are named in the spectra's warnings.

    Raises
    ------
    InputError : the file cannot be read, or holds nothing but faults; the first of them.
    """
    reading = read_file(path)
    if not reading.spectra:
        raise reading.faults[0]
    notes = [f"another block of the file was left out: {fault}" for fault in reading.faults]
    return [spectrum.with_warning(*notes) for spectrum in reading.spectra]


def read_spectrum(path: str | Path) -> Spectrum:
    """Read the one spectrum of a file.

    Raises
    ------
    SpectrumError : the file holds several blocks.
    InputError : the file or its one block cannot be read.
    """
    reading = read_file(path)
    spectra, faults = reading.spectra, reading.faults
    if not spectra:
        raise faults[0]
    if len(spectra) == 1 and not faults:
        return spectra[0]
    titles = ", ".join(f"{at}: {quoted(spectrum.title)}" for at, spectrum in enumerate(spectra[:3]))
    bad = f" and {counted(len(faults), 'fault')}" if faults else ""
    raise SpectrumError(
        f"the file holds {counted(len(spectra), 'spectrum').replace('spectrums', 'spectra')}{bad}, not one",
        file=str(path),
        remedy=f"pick one by number, read_spectra(path)[0] ({titles})",
    )


def _cut_short(
    source: SourceText, found: list[Spectrum | InputError], has_end_mark: bool
) -> list[InputError]:
    """Report compressed data that stop early; drop the last block where nothing shows that it is whole."""
    dropped = ""
    if found and not has_end_mark:
        found.pop()
        dropped = ", the block at the cut is left out"
    return [
        TruncatedError(
            f"the gzip data stop early{dropped}",
            file=source.file,
            place=f"line {len(source.lines) + 1}",
            remedy="copy the file again",
        )
    ]


def _with_source(spectrum: Spectrum, file: str, total: int) -> Spectrum:
    return replace(spectrum, source=f"{file}: {spectrum.source}" if total > 1 else file)
