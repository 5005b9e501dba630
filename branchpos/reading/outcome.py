"""What reading one file gives: the good spectra, and a fault for each block that is not good."""

from __future__ import annotations

from dataclasses import dataclass

from branchpos.errors import InputError
from branchpos.spectrum import Spectrum


@dataclass(frozen=True, slots=True)
class Reading:
    """All that one file holds, in the order of the file.

    Attributes
    ----------
    spectra : every spectrum that could be read.
    faults : one error, with file and place, for each block that could not.
    """

    spectra: tuple[Spectrum, ...]
    faults: tuple[InputError, ...] = ()
