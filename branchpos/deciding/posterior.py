"""Posterior probabilities over all chains and rivals."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from branchpos.hypothesis import Rival

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Posterior:
    """Probabilities that sum to one.

    Attributes
    ----------
    chains : one array for each batch of chains, in the order given.
    rivals : probability of each rival.
    """

    chains: tuple[FloatArray, ...]
    rivals: Mapping[Rival, float]

    @property
    def none_of_these(self) -> float:
        """Probability of all rivals together."""
        return sum(self.rivals.values())


def normalise(log_joints: Sequence[FloatArray], rivals: Mapping[Rival, float]) -> Posterior:
    """Turn logs of prior times likelihood into probabilities.

    Parameters
    ----------
    log_joints : one array for each batch of chains, each of shape (chains,).
    rivals : the same for each rival.

    >>> found = normalise([np.log([3.0, 1.0])], {Rival.NO_CHAIN: 0.0})
    >>> found.chains[0].round(2).tolist(), round(found.none_of_these, 2)
    ([0.6, 0.2], 0.2)
    """
    everything = np.concatenate([*log_joints, list(rivals.values())])
    total = float(np.logaddexp.reduce(everything))
    return Posterior(
        tuple(np.exp(joint - total) for joint in log_joints),
        {rival: float(np.exp(joint - total)) for rival, joint in rivals.items()},
    )
