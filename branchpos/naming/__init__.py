"""Names of chains, both ways: systematic name, shorthand of the trade, line notation."""

from __future__ import annotations

import re

from branchpos.chain import Chain
from branchpos.errors import NamingError
from branchpos.naming.line_notation import parse_smiles, smiles
from branchpos.naming.shorthand import is_shorthand, parse_shorthand, shorthand
from branchpos.naming.systematic import parse_systematic, systematic_name

__all__ = [
    "parse_chain",
    "parse_shorthand",
    "parse_smiles",
    "parse_systematic",
    "shorthand",
    "smiles",
    "systematic_name",
]

_LINE_NOTATION = re.compile(r"(?:\[[^\]]*\]|Br|Cl|[BCNOPSFI]|[cnos]|[()=#/\\.:\d%@+-])+")


def parse_chain(text: str) -> Chain:
    """Read a chain from whichever of the three ways of writing it the text follows.

    Raises
    ------
    NamingError : the text is empty, or cannot be read in the way that it is written.

    >>> parse_chain("5,11-diMeC25") == parse_chain("5,11-dimethylpentacosane")
    True
    >>> parse_chain("CCC(C)CC") == parse_chain("3-methylpentane")
    True
    """
    if not text.strip():
        raise NamingError("an empty name", remedy="write it like 5,11-dimethylpentacosane")
    if is_shorthand(text):
        return parse_shorthand(text)
    if _LINE_NOTATION.fullmatch(text.strip()):
        return parse_smiles(text)
    return parse_systematic(text)
