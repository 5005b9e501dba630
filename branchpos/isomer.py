"""One structure among its isomers, and what would tell it from the one most like it."""

from __future__ import annotations

from dataclasses import dataclass

from branchpos.chain import Chain
from branchpos.retention_index import RetentionIndex


@dataclass(frozen=True, slots=True)
class TellingIon:
    """An ion that parts two isomers.

    Attributes
    ----------
    mz : whole mass number.
    expected, expected_of_nearest : abundance relative to the base peak, of this structure and of the other.
    bits : evidence that the ion would be expected to give.
    """

    mz: int
    expected: float
    expected_of_nearest: float
    bits: float


@dataclass(frozen=True, slots=True)
class Difference:
    """How a structure differs from the isomer that is hardest to tell from it.

    Attributes
    ----------
    chain : that isomer.
    bits : expected evidence of spectrum and retention index together.
    index_bits : the retention index's part of it.
    index_difference : predicted index of the structure minus that of the isomer [index units].
    ions : the most telling ions, most telling first.
    """

    chain: Chain
    bits: float
    index_bits: float
    index_difference: float
    ions: tuple[TellingIon, ...]


@dataclass(frozen=True, slots=True)
class Isomer:
    """One structure.

    Attributes
    ----------
    chain : the structure.
    retention_index : its predicted index.
    nearest : how it differs from the isomer most like it; None where none was looked for or there is none.
    """

    chain: Chain
    retention_index: RetentionIndex
    nearest: Difference | None
