"""A retention index on the n-alkane scale, with how far it may be trusted."""

from __future__ import annotations

import math
from dataclasses import dataclass
from statistics import NormalDist

from branchpos.errors import SettingsError

EXACT = 1e-6
"""Standard deviation [index units] of what holds by definition: an n-alkane has 100 times its carbons."""


@dataclass(frozen=True, slots=True)
class RetentionIndex:
    """A measured or predicted retention index.

    Attributes
    ----------
    value : the index [units; n-alkane = 100 times its carbons].
    sd : standard deviation of the value [units].

    Raises
    ------
    SettingsError : the value is not a positive number, or the standard deviation is not above zero.

    >>> RetentionIndex(2581.0, sd=1.0)
    RetentionIndex(value=2581.0, sd=1.0)
    """

    value: float
    sd: float

    def __post_init__(self) -> None:
        _require_positive("retention index", self.value, "give it on the n-alkane scale, e.g. 2581.0")
        _require_positive("standard deviation of the retention index", self.sd, "give one, e.g. 1.0")

    def interval(self, level: float = 0.95) -> tuple[float, float]:
        """Return the ends [units] of the central interval that holds the value with probability ``level``.

        >>> low, high = RetentionIndex(2581.0, sd=2.0).interval(0.95)
        >>> round(low, 2), round(high, 2)
        (2577.08, 2584.92)
        """
        if not 0.0 < level < 1.0:
            raise SettingsError(f"an interval level of {level}", remedy="give a level between 0 and 1")
        reach = NormalDist().inv_cdf(0.5 + level / 2) * self.sd
        return self.value - reach, self.value + reach


def _require_positive(what: str, number: float, remedy: str) -> None:
    if not (math.isfinite(number) and number > 0):
        raise SettingsError(f"{what} is {number}", remedy=remedy)
