"""Shorthand of the trade, both ways: ``5,11-diMeC25``, ``n-C27``, ``i-15:0``, ``10-Me-18:0 methyl ester``.

Common practice. In hydrocarbons and in ``10-Me-18:0`` the number counts the backbone; in iso and anteiso
chains it counts the whole skeleton, so ``i-15:0`` is 13-methyltetradecanoic acid and ``a-17:0``
14-methylhexadecanoic acid.
"""

from __future__ import annotations

import re
from functools import cache

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.errors import NamingError
from branchpos.naming.numerals import multiplier, multipliers

_FREE_ACID = "acid"
_ISO, _ANTEISO = 1, 2
"""How far the branch of an iso and of an anteiso chain lies before its end."""

_METHYLS = r"(?P<where>\d+(?:,\d+)*)-?(?P<many>[a-z]*?)me(?:thyl)?-?"
_ALKANE = re.compile(rf"(?:n-?|{_METHYLS})c-?(?P<size>\d+)(?::0)?")
_ACYL = re.compile(
    rf"(?:(?P<kind>n|ai|a|i|anteiso|iso)-?|{_METHYLS})?c?-?(?P<size>\d+):(?P<double>\d+)(?P<group>[^\d].*)?"
)
_ABBREVIATED = {"me": "methyl ester", "fame": "methyl ester", "ee": "ethyl ester", "fatty acid": _FREE_ACID}


def shorthand(chain: Chain) -> str:
    """Write the shorthand of a chain; the class follows where it is neither alkane nor free acid.

    >>> [shorthand(Chain(*c)) for c in ((25, (5, 11)), (26, (2,)), (27,), (5, (2, 2, 4)))]
    ['5,11-diMeC25', '2-MeC26', 'n-C27', '2,2,4-triMeC5']
    >>> acid, ester = END_GROUPS["acid"], END_GROUPS["methyl ester"]
    >>> [shorthand(Chain(*c)) for c in ((14, (13,), acid), (16, (14,), acid), (18, (10,), ester))]
    ['i-15:0', 'a-17:0', '10-Me-18:0 methyl ester']
    """
    name = chain.end_group.name
    if name == "alkene":
        return f"alkene C{chain.carbons}"
    if name == "alkane":
        return f"{_methyls(chain)}C{chain.backbone}" if chain.is_branched else f"n-C{chain.backbone}"
    return _acyl(chain) if name == _FREE_ACID else f"{_acyl(chain)} {name}"


def _methyls(chain: Chain) -> str:
    return f"{','.join(map(str, chain.methyls))}-{multiplier(len(chain.methyls))}Me"


def _acyl(chain: Chain) -> str:
    """Write a chain with an end group without naming the group."""
    if not chain.is_branched:
        return f"n-{chain.backbone}:0"
    if chain.methyls == (chain.backbone - _ISO,):
        return f"i-{chain.carbons}:0"
    if chain.methyls == (chain.backbone - _ANTEISO,):
        return f"a-{chain.carbons}:0"
    return f"{_methyls(chain)}-{chain.backbone}:0"


def parse_shorthand(text: str) -> Chain:
    """Read a shorthand; case and spaces have no effect, and ``iso``, ``ai``, ``C15:0``, ``ME`` are taken too.

    Raises
    ------
    NamingError : the text is no shorthand, has a double bond or an unknown class, or its numbers disagree.

    >>> parse_shorthand("5,11-DiMeC25") == Chain(25, (5, 11))
    True
    >>> parse_shorthand("ai-C15:0 ME") == Chain(14, (12,), END_GROUPS["methyl ester"])
    True
    """
    plain = _plain(text)
    found = _ALKANE.fullmatch(plain)
    if found:
        return Chain(int(found["size"]), _positions(found, text))
    found = _ACYL.fullmatch(plain)
    if not found:
        raise NamingError(
            f"{text.strip()!r} is no shorthand of a chain",
            remedy="write it like 5,11-diMeC25, n-C27 or i-15:0",
        )
    if int(found["double"]):
        raise NamingError(f"{text.strip()!r} is unsaturated", remedy="only saturated chains can be placed")
    return _read_acyl(found, text)


def is_shorthand(text: str) -> bool:
    """Tell whether the text is built like a shorthand, right or wrong in its numbers."""
    plain = _plain(text)
    return bool(_ALKANE.fullmatch(plain) or _ACYL.fullmatch(plain))


def _plain(text: str) -> str:
    """Return the text in lower case, with plain hyphens and spaces only before the class."""
    plain = re.sub(r"[‐‑‒–—−]", "-", text).lower().strip()
    return re.sub(r"\s+", " ", re.sub(r"\s*([-,:])\s*", r"\1", plain))


def _positions(found: re.Match[str], text: str) -> tuple[int, ...]:
    """Read the methyl positions and check that there are as many as the prefix says."""
    if not found["where"]:
        return ()
    positions = tuple(map(int, found["where"].split(",")))
    if multipliers().get(found["many"]) != len(positions):
        raise NamingError(
            f"{text.strip()!r} gives {len(positions)} positions for {found['many'] + 'Me'!r}",
            remedy="give one position a methyl",
        )
    return positions


def _read_acyl(found: re.Match[str], text: str) -> Chain:
    group, size, kind = END_GROUPS[_class_name(found["group"] or "", text)], int(found["size"]), found["kind"]
    if kind in (None, "n"):
        return Chain(size, _positions(found, text), group)
    backbone = size - 1
    return Chain(backbone, (backbone - (_ISO if kind in ("i", "iso") else _ANTEISO),), group)


def _class_name(written: str, text: str) -> str:
    """Return the class that a suffix names; none means the free acid."""
    name = written.strip(" -")
    name = _ABBREVIATED.get(name, name) or _FREE_ACID
    if name not in _suffixes():
        raise NamingError(
            f"unknown chain class {name!r} in {text.strip()!r}",
            remedy=f"use one of: {', '.join(_suffixes())}",
        )
    return name


@cache
def _suffixes() -> tuple[str, ...]:
    return tuple(name for name in END_GROUPS if name not in ("alkane", "alkene"))
