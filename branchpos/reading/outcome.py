"""What reading one file gives: the good spectra, and a fault for each block that is not good."""

from __future__ import annotations

from dataclasses import dataclass

from branchpos.errors import FormatError, InputError
from branchpos.spectrum import Spectrum

MOST_BLOCKS = 20_000
"""Blocks that are read of one file; it bounds time (some seconds) and memory."""


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


def too_many_blocks() -> FormatError:
    """Return the fault that stands for all blocks beyond ``MOST_BLOCKS``."""
    return FormatError(
        f"the file holds more than {MOST_BLOCKS} blocks; the rest was not read",
        place=f"block {MOST_BLOCKS + 1}",
        remedy="split the file",
    )
