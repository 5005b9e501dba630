"""Cleavage of every backbone bond with both choices of charge site, for many chains at once.

Bond i joins backbone carbons i and i + 1. The left ion holds carbons 1 to i with their methyls, the right ion
the rest. What decides a yield is the ion's size, the methyls on its own end carbon (0: primary, 1: secondary,
2: tertiary site), those on the radical's end carbon, and whether a further methyl lies inside the ion.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

IntArray = NDArray[np.int32]

DEGREES = 3
"""Methyls that an end carbon can carry: 0, 1, 2."""
SURROUNDINGS = 3
"""No methyl in the ion; only on its end carbon; one or more further inside."""


@dataclass(frozen=True, slots=True, eq=False)
class Side:
    """The ions that keep the charge on one side of each bond; arrays of shape (chains, bonds).

    Attributes
    ----------
    size : carbons of the ion.
    state : index of (end carbon's methyls, radical's methyls, surroundings), see ``state_index``.
    """

    size: IntArray
    state: IntArray


@dataclass(frozen=True, slots=True, eq=False)
class Cleavages:
    """All single cleavages of a batch of chains.

    Attributes
    ----------
    left, right : the ions on either side of each bond.
    single, geminal : backbone carbons with one and with two methyls, shape (chains,).
    """

    left: Side
    right: Side
    single: IntArray
    geminal: IntArray


def state_index(own: IntArray, other: IntArray, surroundings: IntArray) -> IntArray:
    """Pack the three small numbers that decide a yield into one index below ``STATES``."""
    return (own * DEGREES + other) * SURROUNDINGS + surroundings


STATES = DEGREES * DEGREES * SURROUNDINGS
"""How many values ``state_index`` can take."""


def states() -> tuple[IntArray, IntArray, IntArray]:
    """Return the three small numbers of every state, each of shape (STATES,)."""
    every = np.arange(STATES, dtype=np.int32)
    return every // (DEGREES * SURROUNDINGS), every // SURROUNDINGS % DEGREES, every % SURROUNDINGS


def cleave(backbone: int, positions: NDArray[np.int16]) -> Cleavages:
    """Return every single cleavage of chains that share a backbone.

    Parameters
    ----------
    backbone : carbons of the main chain, n.
    positions : methyl positions, shape (chains, methyls).

    >>> import numpy as np
    >>> cleave(25, np.array([[5, 11]], dtype=np.int16)).left.size[0, [4, 10]].tolist()
    [6, 13]
    """
    chains, methyls = positions.shape
    on_carbon = np.zeros((chains, backbone + 2), dtype=np.int32)
    rows = np.arange(chains)
    for column in range(methyls):
        on_carbon[rows, positions[:, column]] += 1
    inside = np.cumsum(on_carbon, axis=1, dtype=np.int32)[:, 1:backbone]
    left_end, right_end = on_carbon[:, 1:backbone], on_carbon[:, 2 : backbone + 1]
    left_size = np.arange(1, backbone, dtype=np.int32) + inside
    return Cleavages(
        left=Side(left_size, _state(left_end, right_end, inside)),
        right=Side(backbone + methyls - left_size, _state(right_end, left_end, methyls - inside)),
        single=(on_carbon == 1).sum(axis=1, dtype=np.int32),
        geminal=(on_carbon == 2).sum(axis=1, dtype=np.int32),
    )


def _state(own: IntArray, other: IntArray, inside: IntArray) -> IntArray:
    surroundings = np.where(inside > own, 2, np.minimum(own, 1)).astype(np.int32)
    return state_index(own, other, surroundings)
