"""From the files a user gives to the spectra that may be scored."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

from branchpos.errors import InputError, SpectrumError
from branchpos.reading import read_file
from branchpos.reading.ionisation import NOT_ELECTRON
from branchpos.spectrum import Spectrum


def take_in(path: str | Path) -> Iterator[Spectrum | InputError]:
    """Yield every spectrum of a file that may be scored, and an error for each that may not.

    A file that cannot be read at all gives one error.
    """
    try:
        reading = read_file(path)
    except InputError as fault:
        yield fault
        return
    for spectrum in reading.spectra:
        try:
            yield require_electron_ionisation(spectrum)
        except SpectrumError as fault:
            yield fault
    yield from reading.faults


def require_electron_ionisation(spectrum: Spectrum) -> Spectrum:
    """Return the spectrum, unless its record says that the ions were made in another way.

    Raises
    ------
    SpectrumError : the record names another ionisation: its fragments do not follow the rules used here.
    """
    for warning in spectrum.warnings:
        if warning.startswith(NOT_ELECTRON):
            raise SpectrumError(
                warning,
                file=spectrum.source,
                place="ionisation",
                remedy="give an electron ionisation spectrum; a chemical ionisation spectrum tells the "
                "molecular weight: pass it as --formula",
            )
    return spectrum
