"""Systematic names of chains, both ways.

Source: IUPAC Recommendations 2013, P-14 (locants, multipliers), P-31.1 (numbering), P-63 (alcohols, ethers),
P-65 (acids and esters). Where those rules would split a class into many patterns, one clear pattern is
written (``N-tetradecanoylpyrrolidine``). Older spellings of the trade are read as well
(``12-methyl-1-tridecanol``, ``tetradecanoic acid methyl ester``).
"""

from __future__ import annotations

import re
import unicodedata
from collections import Counter
from dataclasses import dataclass
from functools import cache

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.errors import NamingError
from branchpos.naming.numerals import LONGEST_NAMED, multiplier, multipliers, stem, stems
from branchpos.naming.trade_names import FATTY_ACIDS, ISOPRENOIDS

_BRANCHES = r"(?:(?P<where>\d+(?:,\d+)*)-?(?P<many>[a-z]*?)methyl-?)?"
_STEM = r"(?P<stem>[a-z]+?)"
_OXAZOLE = r"-?4,4-dimethyl-(?:4,5-dihydro-?(?:1,3-)?|2-)oxazol(?:e|ine)"
_PYRIDYLMETHYL = r"(?:3-pyridyl|pyridin-3-yl)methyl"
_CARBONYL = END_GROUPS["methyl ketone"].first_free - 1
"""Backbone number of a methyl ketone's carbonyl carbon, which the name calls 2."""


@dataclass(frozen=True, slots=True)
class _Pattern:
    """How the name of one class is written and read.

    Attributes
    ----------
    written : the name with the branches and the stem as ``{}``.
    read : patterns of the name without spaces and brackets; B stands for the branches, S for the stem.
    short : replaces ``written`` for backbones of one or two carbons, which need no locant.
    branched : replaces ``written`` for branched chains, whose substituents need parentheses.
    offset : how far the written numbers lie below the chain's own.
    shortest : the shortest backbone that has a name.
    """

    written: str
    read: tuple[str, ...]
    short: str = ""
    branched: str = ""
    offset: int = 0
    shortest: int = 1


def _ester(written: str, alkyl: str) -> _Pattern:
    """Return the pattern of an ester, read as ``alkyl ...anoate`` and as ``...anoic acid alkyl ester``."""
    return _Pattern(f"{written} {{}}anoate", (f"{alkyl}-?BSanoate", f"BSanoicacid,?-?{alkyl}ester"))


_PATTERNS = {
    "alkane": _Pattern("{}ane", ("BSane",)),
    "alcohol": _Pattern("{}an-1-ol", ("B(?:1-)?San(?:-1-)?ol", "(?:1-)?BSyl-?alcohol"), short="{}anol"),
    "methyl ether": _Pattern(
        "1-methoxy{}ane",
        ("(?:1-)?methoxy-?BSane", "B1-methoxy-?Sane", "BSyl-?methyl-?ether"),
        short="methoxy{}ane",
    ),
    "amine": _Pattern("{}an-1-amine", ("B(?:1-)?San(?:-1-)?amine", "B(?:1-)?Sylamine"), short="{}anamine"),
    "aldehyde": _Pattern("{}anal", ("B(?:1-)?San(?:-1-)?al",)),
    "methyl ketone": _Pattern(
        "{}an-2-one", ("BSan-2-one", "B2-Sanone"), offset=_CARBONYL - 2, shortest=_CARBONYL + 1
    ),
    "acid": _Pattern("{}anoic acid", ("BSanoicacid",)),
    "methyl ester": _ester("methyl", "methyl"),
    "ethyl ester": _ester("ethyl", "ethyl"),
    "trimethylsilyl ester": _ester("trimethylsilyl", "trimethylsilyl"),
    "3-pyridylcarbinol ester": _ester("3-pyridylmethyl", _PYRIDYLMETHYL),
    "acetate": _Pattern("{}yl acetate", ("BSyl-?acetate", "aceticacid,?-?BSylester")),
    "trimethylsilyl ether": _Pattern(
        "trimethyl({}yloxy)silane",
        ("trimethyl-?BSyloxysilane", "BSyloxytrimethylsilane", "BSyl-?trimethylsilyl-?ether"),
        branched="trimethyl[({}yl)oxy]silane",
    ),
    "pyrrolidide": _Pattern(
        "N-{}anoylpyrrolidine", ("(?:[1n]-)?BSanoylpyrrolidine",), branched="N-({}anoyl)pyrrolidine"
    ),
    "dimethyloxazoline": _Pattern(
        "2-{}yl-4,4-dimethyl-4,5-dihydro-1,3-oxazole",
        (f"2-BSyl{_OXAZOLE}",),
        branched="2-({}yl)-4,4-dimethyl-4,5-dihydro-1,3-oxazole",
        offset=1,
        shortest=2,
    ),
}
_DESCRIPTOR = r"\d*(?:rs|sr|r|s)\*?"
_STEREO = re.compile(rf"\({_DESCRIPTOR}(?:,{_DESCRIPTOR})*\)-?|\((?:±|\+/-|\+|-)\)-?|^(?:rac|meso|dl)-")
_UNSATURATED = re.compile(r"(?<!h)en(?:e|-|oic|oate|al|ol|yl|amine)|yn(?:e|-|oic|oate|al|ol)|diene")
_LONGER_BRANCH = re.compile(r"-(?:di|tri)?(?:ethyl|propyl|butyl|pentyl|hexyl|isopropyl)")
_HYPHENS = dict.fromkeys(map(ord, "‐‑‒–—−﹣-"), "-")
_PRIMES = dict.fromkeys(map(ord, "′’ʹ`´"), "'")


def systematic_name(chain: Chain) -> str:
    """Write the systematic name of a chain.

    In a dimethyloxazoline the alkyl group on the ring starts at the acid's C2, so its numbers are lower by
    one. An alkene's double bond is not placed, so it is called by its size.

    Raises
    ------
    NamingError : the backbone is longer than the stems reach, or too short for its class.

    >>> systematic_name(Chain(25, (5, 11))), systematic_name(Chain(5, (2, 2, 4)))
    ('5,11-dimethylpentacosane', '2,2,4-trimethylpentane')
    >>> systematic_name(Chain(15, (14,), END_GROUPS["methyl ester"]))
    'methyl 14-methylpentadecanoate'
    >>> systematic_name(Chain(16, (10,), END_GROUPS["dimethyloxazoline"]))
    '2-(9-methylpentadecyl)-4,4-dimethyl-4,5-dihydro-1,3-oxazole'
    """
    name = chain.end_group.name
    if name == "alkene":
        return f"alkene C{chain.carbons}"
    pattern = _PATTERNS[name]
    if chain.backbone < pattern.shortest:
        raise NamingError(
            f"a {name} with a backbone of {chain.backbone}",
            remedy=f"give at least {pattern.shortest} carbons",
        )
    core = _branches(tuple(p - pattern.offset for p in chain.methyls)) + stem(chain.backbone - pattern.offset)
    written = (pattern.branched if chain.is_branched else "") or pattern.written
    if chain.backbone <= 2 and pattern.short:
        written = pattern.short
    return re.sub(r"(?<=[a-z])(?=\d)", "-", written.format(core))


def _branches(positions: tuple[int, ...]) -> str:
    """Write the methyl prefix, ``5,11-dimethyl``."""
    if not positions:
        return ""
    return f"{','.join(map(str, positions))}-{multiplier(len(positions))}methyl"


def parse_systematic(text: str) -> Chain:
    """Read a systematic name.

    Case, spaces, kinds of hyphen, a leading ``n-`` and stereodescriptors have no effect; trade names of
    isoprenoids and of fatty acids are read as well.

    Raises
    ------
    NamingError : the text names no methyl-branched chain; says what stands in the way and what comes nearest.

    >>> parse_systematic("(5R,11S)-5,11-Dimethyl-pentacosane") == Chain(25, (5, 11))
    True
    >>> parse_systematic("methyl palmitate").backbone
    16
    """
    plain = _plain(text)
    if plain in ISOPRENOIDS:
        return Chain(*ISOPRENOIDS[plain])
    for name, expression in _readers():
        found = expression.fullmatch(plain)
        if found and found["stem"] in stems() and (found["many"] or "") in multipliers():
            return _chain(name, found, text)
    raise NamingError(_obstacle(plain, text), remedy=_remedy(plain))


def _plain(text: str) -> str:
    """Return the name without case, spaces, brackets, stereodescriptors and a leading ``n-``."""
    plain = unicodedata.normalize("NFKC", text.translate(_HYPHENS).translate(_PRIMES)).lower()
    plain = re.sub(r"[\[\](){}]", "", _STEREO.sub("", re.sub(r"\s+", "", plain)))
    for acid, carbons in FATTY_ACIDS.items():
        plain = re.sub(rf"{acid}(?=icacid|ate$)", f"{stem(carbons)}ano", plain)
    return plain.removeprefix("n-")


@cache
def _readers() -> tuple[tuple[str, re.Pattern[str]], ...]:
    """Return (class, expression) for every pattern that can be read."""
    return tuple(
        (name, re.compile(read.replace("B", _BRANCHES).replace("S", _STEM)))
        for name, pattern in _PATTERNS.items()
        for read in pattern.read
    )


def _chain(name: str, found: re.Match[str], text: str) -> Chain:
    """Build the chain that a matched name describes."""
    offset = _PATTERNS[name].offset
    written = tuple(int(number) for number in (found["where"] or "").split(",") if number)
    told = multipliers()[found["many"]] if written else 0
    if told != len(written):
        raise NamingError(
            f"{text.strip()!r} gives {len(written)} positions for {told} methyls",
            remedy="give one position a methyl",
        )
    backbone = stems()[found["stem"]] + offset
    return Chain(backbone, tuple(p + offset for p in written), END_GROUPS[name])


def _obstacle(plain: str, text: str) -> str:
    """Say what kind of structure stands in the way."""
    given = repr(text.strip())
    if plain.startswith("alkene"):
        return f"{given} does not say where the double bond is"
    if "cyclo" in plain:
        return f"{given} has a ring"
    if _UNSATURATED.search(plain):
        return f"{given} is unsaturated"
    if _LONGER_BRANCH.search(plain) and "ate" not in plain:
        return f"{given} has a branch longer than methyl"
    return f"{given} is not the name of a methyl-branched chain"


def _remedy(plain: str) -> str:
    """Suggest the nearest name, or say how a name is built."""
    from difflib import get_close_matches

    head = re.match(r"[\d,]+-", plain)
    many = multiplier(min(Counter(head[0])[","] + 1, LONGEST_NAMED)) + "methyl" if head else ""
    known = {many + name: (head[0] if head else "") + many + shown for name, shown in _unbranched().items()}
    near = get_close_matches(plain[head.end() :] if head else plain, known, n=1, cutoff=0.8)
    return f"did you mean {known[near[0]]!r}?" if near else "write it like 5,11-dimethylpentacosane"


@cache
def _unbranched() -> dict[str, str]:
    """Return the name of every unbranched chain by what ``_plain`` makes of it."""
    groups = [END_GROUPS[name] for name in _PATTERNS]
    chains = [Chain(n, (), group) for group in groups for n in range(3, LONGEST_NAMED)]
    return {_plain(systematic_name(chain)): systematic_name(chain) for chain in chains}
