"""How likely each structure was before the spectrum was seen: explicit, printable, switchable.

Both priors give every number of methyls k the weight 2^-(k+1), the price of one further methyl, and share
that weight among all structures with the same carbons and k: equally (``flat``) or by what living cells build
(``biogenic``). Every number of carbons weighs the same. A structure's prior does not depend on which others
are looked at.

The numbers of ``biogenic`` are a judgement, not measured. Its grounds: chains grow by two carbons (acetate),
and a methyl comes in where methylmalonate (propionate) replaces malonate, so that methyls stand an even
number of carbons apart; isoprene units leave gaps of 4, with 5 or 3 where two chains were joined tail to tail
or head to head (Blomquist, Nelson and de Renobales, Arch. Insect Biochem. Physiol. 6 (1987) 227; from
memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.end_group import ALKANE, EndGroup

_METHYL_PRICE = 0.5
_ISOPRENOID_GAPS = (3, 5)


@dataclass(frozen=True, slots=True)
class Prior:
    """Prior weights of structures.

    Attributes
    ----------
    name : as spelt in options and results.
    reason : one line that says what the prior holds to be rarer.
    geminal, adjacent, odd_gap : factor on the weight for each pair of neighbouring methyls 0, 1, or an odd
    number of
        carbons apart, other than the isoprenoid gaps 3 and 5; even gaps have the factor 1.

    >>> print(PRIORS["flat"])
    flat: all structures alike; each further methyl halves the weight
    """

    name: str
    reason: str
    geminal: float = 1.0
    adjacent: float = 1.0
    odd_gap: float = 1.0

    def __str__(self) -> str:
        return f"{self.name}: {self.reason}; each further methyl halves the weight"

    def log_prior(
        self, positions: NDArray[np.int16], backbone: int, end_group: EndGroup = ALKANE
    ) -> NDArray[np.float64]:
        """Return the natural log of the prior weight of each structure.

        Summed over all structures with the same backbone and number of methyls the weights give 2^-(k+1);
        where only some are given, the rest of that weight stays with those left out.

        Parameters
        ----------
        positions : shape (structures, k), canonical rows as ``chain_positions`` makes them.
        backbone : carbons of the main chain.

        Returns
        -------
        array of shape (structures,).

        >>> import numpy as np
        >>> np.exp(PRIORS["flat"].log_prior(np.array([[2], [3], [4]], dtype=np.int16), 7)).round(4).tolist()
        [0.0833, 0.0833, 0.0833]
        """
        count, methyls = positions.shape
        if count == 0:
            return np.empty(0)
        factors = np.log(self.gap_factors(backbone))
        raw: NDArray[np.float64] = factors[np.diff(positions, axis=1)].sum(axis=1)
        raw += log_methyl_weight(methyls) - np.log(group_weight(self, backbone, methyls, end_group))
        return raw

    def log_prior_of(self, chain: Chain) -> float:
        """Return the natural log of the prior weight of one chain."""
        row = np.array([chain.methyls], dtype=np.int16).reshape(1, -1)
        return float(self.log_prior(row, chain.backbone, chain.end_group)[0])

    def gap_factors(self, longest: int) -> NDArray[np.float64]:
        """Return the factor for each distance between neighbouring methyls, shape (longest + 1,)."""
        gaps = np.arange(longest + 1)
        factors = np.where(gaps % 2 == 1, self.odd_gap, 1.0)
        factors[[gap for gap in _ISOPRENOID_GAPS if gap <= longest]] = 1.0
        factors[:2] = (self.geminal, self.adjacent)[: longest + 1]
        return factors


def log_methyl_weight(methyls: int) -> float:
    """Return the natural log of the weight of a number of methyls; the weights of 0, 1, 2, ... sum to one.

    >>> [float(round(np.exp(log_methyl_weight(k)), 4)) for k in range(4)]
    [0.5, 0.25, 0.125, 0.0625]
    """
    return float(methyls * np.log(_METHYL_PRICE) + np.log1p(-_METHYL_PRICE))


@cache
def group_weight(prior: Prior, backbone: int, methyls: int, end_group: EndGroup = ALKANE) -> float:
    """Return the summed factors of all structures with this backbone and number of methyls.

    Transfer matrix over positions, so nothing is enumerated. Where a chain can be numbered from either end,
    each pair of mirror images counts once: half the sum over all choices and over those that are their own
    mirror image.
    """
    if methyls == 0:
        return 1.0
    factors = prior.gap_factors(backbone)
    places = np.arange(end_group.first_free, backbone)
    total = float(_by_last_place(places, factors, methyls)[methyls].sum())
    if not end_group.symmetric:
        return total
    return (total + _own_mirror_images(places, factors, backbone, methyls)) / 2


def _by_last_place(
    places: NDArray[np.int_], factors: NDArray[np.float64], methyls: int
) -> list[NDArray[np.float64]]:
    """Return, for 0 to k methyls, the summed factors of rows that end on each place; entry 0 is unused."""
    gaps = places[None, :] - places[:, None]
    steps = np.where(gaps > 0, factors[np.abs(gaps)], 0.0)
    ones = np.ones(len(places))
    sums = [np.zeros(len(places)), ones]
    for count in range(2, methyls + 1):
        before = ones if count == 2 else sums[count - 2] @ steps
        sums.append(sums[count - 1] @ steps + factors[0] * before)
    return sums


def _own_mirror_images(
    places: NDArray[np.int_], factors: NDArray[np.float64], backbone: int, methyls: int
) -> float:
    """Return the summed factors of rows that are their own mirror image; the gaps of a half count twice."""
    left = places[2 * places < backbone + 1]
    halves = _by_last_place(left, factors**2, methyls // 2)
    across = backbone + 1 - 2 * left
    has_middle = backbone % 2 == 1 and backbone > 2
    if methyls % 2 == 1:
        return _around_middle(halves[methyls // 2], factors, across, methyls - 1) if has_middle else 0.0
    doubled = _around_middle(halves[methyls // 2 - 1], factors, across, methyls - 2) if has_middle else 0.0
    return float(halves[methyls // 2] @ factors[across]) + float(factors[0]) * doubled


def _around_middle(
    half: NDArray[np.float64], factors: NDArray[np.float64], across: NDArray[np.int_], outside: int
) -> float:
    """Return the summed factors of mirrored rows with one methyl on the middle carbon."""
    return float(half @ factors[across // 2] ** 2) if outside else 1.0


PRIORS = {
    prior.name: prior
    for prior in (
        Prior("flat", "all structures alike"),
        Prior(
            "biogenic",
            "geminal methyls 50, adjacent 20, odd distances but 3 and 5 carbons 5 times rarer (judgement)",
            geminal=1 / 50,
            adjacent=1 / 20,
            odd_gap=1 / 5,
        ),
    )
}
"""Every prior by its name."""
