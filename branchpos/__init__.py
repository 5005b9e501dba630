"""Places methyl branches on long saturated chains from GC-EI mass spectra and retention indices.

>>> import branchpos as bp
>>> bp.parse_chain("5,11-diMeC25").carbons
27
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from branchpos.chain import Chain as Chain
    from branchpos.errors import BranchposError as BranchposError
    from branchpos.interface import isomers as isomers
    from branchpos.interface import locate as locate
    from branchpos.interface import predict as predict
    from branchpos.naming import parse_chain as parse_chain
    from branchpos.reading import read_spectra as read_spectra
    from branchpos.reading import read_spectrum as read_spectrum
    from branchpos.retention_index import RetentionIndex as RetentionIndex
    from branchpos.spectrum import Spectrum as Spectrum
    from branchpos.verdict import Verdict as Verdict
    from branchpos.workflow.method import Method as Method

__version__ = "0.1.0"

_HOMES = {
    "BranchposError": "branchpos.errors",
    "Chain": "branchpos.chain",
    "Method": "branchpos.workflow.method",
    "RetentionIndex": "branchpos.retention_index",
    "Spectrum": "branchpos.spectrum",
    "Verdict": "branchpos.verdict",
    "isomers": "branchpos.interface",
    "locate": "branchpos.interface",
    "parse_chain": "branchpos.naming",
    "predict": "branchpos.interface",
    "read_spectra": "branchpos.reading",
    "read_spectrum": "branchpos.reading",
}
"""Where each public name lives; it is fetched on first use, so that ``import branchpos`` is quick."""

__all__ = [
    "BranchposError",
    "Chain",
    "Method",
    "RetentionIndex",
    "Spectrum",
    "Verdict",
    "__version__",
    "isomers",
    "locate",
    "parse_chain",
    "predict",
    "read_spectra",
    "read_spectrum",
]


def __getattr__(name: str) -> object:
    if name not in _HOMES:
        raise AttributeError(f"module 'branchpos' has no attribute {name!r}")
    value = getattr(import_module(_HOMES[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)
