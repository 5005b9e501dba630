"""Which cleavages give an ion, in words."""

from __future__ import annotations

from branchpos.chain import Chain
from branchpos.end_group import ALKANE
from branchpos.predicting.headed_labels import headed_labels

_SITES = ("primary", "secondary", "tertiary")
_MOST_NAMED = 3
NEIGHBOUR = "neighbour of stronger ions"
"""Route of an ion that no cleavage gives: isotopes and stray losses."""


def cleavage_labels(chain: Chain) -> dict[int, str]:
    """Return, by ion size [carbons], the cleavages of an alkane that give it, steered ones first.

    Sizes that single cleavages cannot reach are missing.

    >>> cleavage_labels(Chain(25, (5, 11)))[6]
    'C5|C6, charge on C5 (secondary)'
    """
    found: dict[int, list[tuple[int, str]]] = {}
    for bond in range(1, chain.backbone):
        left = bond + sum(position <= bond for position in chain.methyls)
        for size, end in ((left, bond), (chain.carbons - left, bond + 1)):
            degree = chain.methyls.count(end)
            text = f"C{bond}|C{bond + 1}, charge on C{end} ({_SITES[degree]})"
            found.setdefault(size, []).append((-degree, text))
    if chain.methyls:
        where = ", ".join(f"C{position}" for position in dict.fromkeys(chain.methyls))
        found.setdefault(chain.carbons - 1, []).append((-1, f"loss of the methyl on {where}"))
    return {size: _joined(sorted(routes)) for size, routes in found.items()}


def _joined(routes: list[tuple[int, str]]) -> str:
    """Name the routes of the best site only: the others are the unbranched background."""
    best = [text for degree, text in routes if degree == routes[0][0]]
    rest = f" and {len(best) - _MOST_NAMED} more" if len(best) > _MOST_NAMED else ""
    return "; ".join(best[:_MOST_NAMED]) + rest


def mass_labels(chain: Chain) -> dict[int, str]:
    """Return, by mass number, the words for every ion of a chain of any class.

    >>> mass_labels(Chain(25, (5, 11)))[84]
    'C5|C6, charge on C5 (secondary), with hydrogen transfer'
    """
    if chain.end_group != ALKANE:
        return headed_labels(chain)
    labels = cleavage_labels(chain)
    masses = [mass for size in range(1, chain.carbons) for mass in (14 * size, 14 * size + 1)]
    named = {mass: ion_label(chain, mass // 14, mass, labels) for mass in masses}
    return named | {14 * chain.carbons + 2: "molecular ion"}


def ion_label(chain: Chain, size: int, mass: int, labels: dict[int, str]) -> str:
    """Return the words for one ion of an alkane: cleavage, hydrogen transfer, or molecular ion."""
    if mass == 14 * chain.carbons + 2:
        return "molecular ion"
    route = labels.get(size, "daughter ions only")
    return f"{route}, with hydrogen transfer" if mass == 14 * size else route
