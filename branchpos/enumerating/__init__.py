"""Every isomer once, and how likely it was before the spectrum was seen."""

from __future__ import annotations

from branchpos.enumerating.alkanes import (
    alkane_positions,
    chain_positions,
    count_alkanes,
    count_chains,
    enumerate_alkanes,
    enumerate_chains,
)
from branchpos.enumerating.isoprenoids import regular_isoprenoids
from branchpos.enumerating.priors import PRIORS, Prior

__all__ = [
    "PRIORS",
    "Prior",
    "alkane_positions",
    "chain_positions",
    "count_alkanes",
    "count_chains",
    "enumerate_alkanes",
    "enumerate_chains",
    "regular_isoprenoids",
]
