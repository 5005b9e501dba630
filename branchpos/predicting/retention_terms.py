"""The terms from which the retention index of a methylalkane is put together.

A methyl raises the index of its backbone by an increment that depends on its distance to the nearer chain end
and on the length of the chain. Each pair of methyls adds an interaction that depends on the gap between them,
dies off with every methyl in between, and varies with the chain length. What is left over is shared by
structures whose methyls sit nearly alike (``closeness``).

Every term is one column of a design matrix; columns that share one prior scale form a group.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

MEAN_INCREMENT = 40.0
"""Index units that a methyl adds before anything is known of its place."""

_MIDDLE = 30.0
"""Backbone [carbons] about which length slopes turn: the middle of the fitted set."""

_SHORTEST = 22.0
"""Backbone [carbons] below which no fitted chain carries two methyls."""

_FADE = 0.4
"""Share of a pair's interaction that survives each methyl standing in between."""

_END_CENTRES = np.log([2.0, 3.0, 4.0, 5.0, 6.5, 8.5, 11.0, 14.0, 18.0, 23.0])
_GAP_CENTRES = np.log([1.0, 1.6, 2.5, 4.0, 6.0, 8.0, 11.0, 15.0, 20.0, 28.0])
_PAIR_END_CENTRES = np.log([2.0, 3.0, 4.5, 7.0, 11.0, 17.0])
_END_TABLE = np.arange(2, 9)
_GAP_TABLE = np.array([4, 6, 8, 10, 12])

_CLOSE_MEAN = {0: -6.0, 1: 10.0, 2: -5.0, 3: 0.0}
_CLOSE_SD = np.array([10.0, 8.0, 6.0, 4.0])
"""Interaction [units] of methyls 0 to 3 carbons apart: only two fitted compounds bear on it.

From memory of light alkanes: vicinal methyls come late (2,3-dimethylhexane), geminal ones early
(2,2-dimethylhexane). Handbook boiling points of the dimethyloctanes agree within these deviations.
"""


@dataclass(frozen=True, slots=True)
class Group:
    """Columns that share one prior scale.

    Attributes
    ----------
    name : what the columns stand for.
    columns : how many there are.
    scale : prior standard deviation of their coefficients [index units].
    learned : whether the scale is fitted; false where the fitted compounds say little about it.
    """

    name: str
    columns: int
    scale: float
    learned: bool = True


MONO_GROUPS = (
    Group("methyl", 1, 30.0),
    Group("distance to the end, smooth", len(_END_CENTRES), 10.0),
    Group("distance to the end, single positions", len(_END_TABLE), 3.0),
    Group("chain length, and with 2- and 3-methyl", 3, 6.0, learned=False),
    Group("chain length by distance, straight", 1, 20.0, learned=False),
    Group("chain length by distance, smooth", len(_END_CENTRES), 1.5, learned=False),
    Group("chain length, curved", 1, 2.0),
    Group("distance to the end beside other methyls", len(_END_CENTRES), 3.0),
)
PAIR_GROUPS = (
    Group("pair by methyls in between", 3, 3.0),
    Group("pair by chain length", 1, 5.0),
    Group("pair by chain length and gap", len(_GAP_CENTRES), 3.0),
    Group("pair in a shorter chain than any fitted", 1, 10.0, learned=False),
    Group("pair closer than 4 carbons", 4, 1.0, learned=False),
    Group("pair by single gaps", len(_GAP_TABLE), 2.0),
    Group("pair by distance to the end", len(_PAIR_END_CENTRES), 2.0),
    Group("pair 4 apart by distance to the end", len(_PAIR_END_CENTRES), 2.0),
)
WHOLE_GROUPS = (
    Group("third and further methyls", 2, 2.0),
    Group("more methyls than any fitted", 1, 8.0, learned=False),
)
GROUPS = MONO_GROUPS + PAIR_GROUPS + WHOLE_GROUPS
MONO_COLUMNS, PAIR_COLUMNS, WHOLE_COLUMNS = (
    sum(group.columns for group in groups) for groups in (MONO_GROUPS, PAIR_GROUPS, WHOLE_GROUPS)
)
COLUMNS = MONO_COLUMNS + PAIR_COLUMNS + WHOLE_COLUMNS
CLOSENESS_SCALE = 1.5
"""First guess of the standard deviation [units] of what structures with like patterns share."""

_CLOSENESS_REACH = 1.25
"""Distance [carbons] over which patterns still share their deviation."""


def group_of_column() -> NDArray[np.int_]:
    """Return the number of the group that each column belongs to, shape (COLUMNS,)."""
    return np.repeat(np.arange(len(GROUPS)), [group.columns for group in GROUPS])


def mono_terms(position: Array, backbone: int, several: bool) -> Array:
    """Return the columns of single methyls.

    Parameters
    ----------
    position : shape (n,), counted from either end.
    backbone : carbons of the main chain.
    several : whether the chain carries other methyls too.

    Returns
    -------
    shape (n, MONO_COLUMNS).
    """
    near = np.minimum(position, backbone + 1 - position)
    smooth = _bumps(np.log(near), _END_CENTRES, 0.35)
    length = np.log(backbone / _MIDDLE)
    slopes = np.stack([np.ones_like(near), near == 2, near == 3, near / 10], axis=1) * length
    table = near[:, None] == _END_TABLE
    one = np.ones((len(near), 1))
    parts = [one, smooth, table, slopes, smooth * length, one * length**2, smooth * several]
    return np.concatenate(parts, axis=1)


def pair_terms(first: Array, second: Array, between: int, backbone: int) -> Array:
    """Return the columns of pairs of methyls.

    Parameters
    ----------
    first, second : shape (n,), rising.
    between : methyls standing between the two.
    backbone : carbons of the main chain.

    Returns
    -------
    shape (n, PAIR_COLUMNS).
    """
    gap, near = second - first, np.minimum(first, backbone + 1 - second)
    # Beyond the fitted lengths the slope levels off: a straight line in log length would run away there.
    length = np.tanh(3 * np.log(backbone / _MIDDLE)) / 3
    one = np.ones((len(gap), 1))
    rank = np.arange(3)[None] == between
    ends = _bumps(np.log(near), _PAIR_END_CENTRES, 0.4)
    faded = [
        one * length,
        _bumps(np.log(np.maximum(gap, 0.7)), _GAP_CENTRES, 0.35) * length,
        one * max(0.0, float(np.log(_SHORTEST / backbone))),
        (gap[:, None] == np.arange(4)) * _CLOSE_SD,
        gap[:, None] == _GAP_TABLE,
        ends,
        ends * (gap == 4)[:, None],
    ]
    return np.concatenate([one * rank, _FADE**between * np.concatenate(faded, axis=1)], axis=1)


def close_offset(gap: Array) -> Array:
    """Return the expected interaction [units] of neighbours at this gap, in the shape of ``gap``."""
    return np.select([gap == close for close in _CLOSE_MEAN], list(_CLOSE_MEAN.values()), 0.0)


def whole_terms(positions: Array) -> Array:
    """Return the columns that belong to the structure as a whole: (S, k) to (S, WHOLE_COLUMNS)."""
    methyls = positions.shape[1]
    gaps = np.diff(positions, axis=1)
    runs = sum(((a == 4) & (b == 4) for a, b in pairwise(gaps.T)), start=np.zeros(len(positions)))
    constant = np.ones(len(positions))
    return np.stack([constant * max(methyls - 2, 0), runs, constant * max(methyls - 4, 0)], axis=1)


def lowest_locants(positions: Array, backbone: int) -> Array:
    """Return each row counted from the end that gives the lower locants; shape (S, k), rows rising."""
    mirror = backbone + 1 - positions[:, ::-1]
    different = positions != mirror
    column = np.argmax(different, axis=1)
    row = np.arange(len(positions))
    swap = mirror[row, column] < positions[row, column]
    return np.where(swap[:, None], mirror, positions)


def closeness(patterns: Array, others: Array) -> Array:
    """Return how alike two sets of patterns are: (S, k) and (T, k) to (S, T), 1 for equal, 0 for far apart.

    Patterns are counted from the end with the lower locants, so that the chain length does not matter.
    """
    squared = sum(
        ((patterns[:, i, None] - others[None, :, i]) ** 2 for i in range(patterns.shape[1])), start=0.0
    )
    return np.asarray(np.exp(-0.5 * squared / _CLOSENESS_REACH**2))


def _bumps(where: Array, centres: Array, width: float) -> Array:
    return np.asarray(np.exp(-0.5 * ((where[:, None] - centres) / width) ** 2))
