"""The Python interface: the commands as functions that take plain values."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from branchpos.chain import Chain
from branchpos.isomer import Isomer
from branchpos.naming import parse_chain
from branchpos.retention_index import RetentionIndex
from branchpos.spectrum import Spectrum
from branchpos.verdict import Verdict
from branchpos.workflow.intake import require_electron_ionisation
from branchpos.workflow.isomers import list_isomers
from branchpos.workflow.locate import locate_branches
from branchpos.workflow.method import Method, parse_range
from branchpos.workflow.predict import LEAST, Prediction, predict_chain

Span = str | int | range
"""A number, a range as text that includes both ends (``"20-40"``), or a Python range."""


def locate(
    spectrum: Spectrum,
    *,
    chain: str | Sequence[str] | None = None,
    retention_index: RetentionIndex | None = None,
    carbons: Span | None = None,
    methyls: Span = "0-4",
    formula: str | None = None,
    prior: str = "flat",
    level: float = 0.95,
    everything: bool = False,
) -> Verdict:
    """Say where the methyl branches of the compound behind a spectrum sit, and how sure that is.

    Parameters
    ----------
    spectrum : an electron ionisation spectrum, as ``read_spectrum`` gives it.
    chain : chain classes to consider, as text with commas or one by one; all when not given.
    retention_index : the measured index with its standard deviation [units].
    carbons, methyls : what to consider; carbons as the spectrum allows when not given.
    formula : molecular formula, if known; overrules ``carbons``.
    prior : name of the prior.
    level : probability that the credible set has to reach.
    everything : list every hypothesis, not only the leading ones.

    Raises
    ------
    SpectrumError : the record says that the ions were made in another way.
    SettingsError : a setting is out of range or unknown.

    >>> import branchpos as bp
    >>> peaks = {43: 80, 57: 100, 71: 60, 85: 45, 99: 12, 113: 9, 127: 7, 141: 6, 155: 5, 169: 4, 226: 9}
    >>> verdict = bp.locate(bp.Spectrum.from_peaks(list(peaks), list(peaks.values())))
    >>> verdict.hypotheses[0].chain.carbons
    16
    """
    method = Method(
        chain=Method().chain if chain is None else _classes(chain),
        carbons=None if carbons is None else _span(carbons, "carbons"),
        methyls=_span(methyls, "methyls"),
        formula=formula,
        prior=prior,
        level=level,
    )
    require_electron_ionisation(spectrum)
    return locate_branches(spectrum, method, retention_index, everything=everything)


def predict(chain: Chain | str, *, least: float = LEAST) -> Prediction:
    """Predict the ions and the retention index of a chain, given as such or by any of its names.

    Parameters
    ----------
    chain : the structure.
    least : abundance relative to the base peak below which ions are left out.

    Raises
    ------
    NamingError : the name cannot be read.
    SettingsError : the class or the size cannot be predicted.

    >>> import branchpos as bp
    >>> round(bp.predict("2-MeC26").retention_index.value)
    2662
    """
    return predict_chain(parse_chain(chain) if isinstance(chain, str) else chain, least=least)


def isomers(carbons: int, methyls: Span, *, chain: str = "alkane") -> Iterator[Isomer]:
    """Stream every structure once, with what would tell it from the isomer most like it.

    Parameters
    ----------
    carbons : carbons of the skeleton, branches included.
    methyls : number of methyl branches, or a range of it.
    chain : the chain class.

    Raises
    ------
    SettingsError : a value is out of range or unknown.

    >>> import branchpos as bp
    >>> len(list(bp.isomers(27, methyls=1)))
    12
    """
    return list_isomers(carbons, _span(methyls, "methyls"), chain)


def _classes(chain: str | Sequence[str]) -> tuple[str, ...]:
    return tuple(name.strip() for name in chain.split(",")) if isinstance(chain, str) else tuple(chain)


def _span(given: Span, name: str) -> range:
    return given if isinstance(given, range) else parse_range(str(given), name)
