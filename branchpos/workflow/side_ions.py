"""The side ions of alkanes: set to the robust middle of what the records show."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from branchpos.mass_channels import MassChannels
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.parameters import PARAMETERS, YieldParameters
from branchpos.predicting.yields import side_ions
from branchpos.scoring.error_model import ErrorModel
from branchpos.scoring.likelihood import TILT_PIVOT, linearise
from branchpos.scoring.remainder import isotopes_below

_PRIOR_STRENGTH = 3.0
"""How many records the prior counts for."""


class KnownChain(Protocol):
    """A chain whose side ions are looked at."""

    @property
    def backbone(self) -> int:
        """Carbons of the main chain."""

    @property
    def positions(self) -> NDArray[np.int16]:
        """Methyl positions, shape (1, methyls)."""


def with_side_ions(
    records: Sequence[tuple[KnownChain, MassChannels]], parameters: YieldParameters, errors: ErrorModel
) -> YieldParameters:
    """Set the side ions to the robust middle of what the records show above their carbon-13 neighbours."""
    names = [parameter.name for parameter in PARAMETERS]
    values, variances = parameters.values.copy(), np.diag(parameters.covariance).copy()
    found: dict[str, list[float]] = {name: [] for name in names if name.startswith("side_")}
    for chain, channels in records:
        for name, ratio in _side_ratios(chain, channels, parameters, errors).items():
            found[name].append(ratio)
    for name, ratios in found.items():
        index = names.index(name)
        spread = 1.48 * float(np.median(np.abs(np.array(ratios) - np.median(ratios)))) if ratios else 0.0
        weight = len(ratios) / (len(ratios) + _PRIOR_STRENGTH)
        middle = float(np.median(ratios)) if ratios else 0.0
        values[index] = (1 - weight) * PARAMETERS[index].mean + weight * middle
        variances[index] = max(spread, 0.1) ** 2 / (len(ratios) + 1)
    covariance = parameters.covariance.copy()
    np.fill_diagonal(covariance, variances)
    return replace(parameters, values=values, covariance=covariance)


def _side_ratios(
    chain: KnownChain, channels: MassChannels, parameters: YieldParameters, errors: ErrorModel
) -> dict[str, float]:
    """Return, by parameter, the log of an observed side ion over the daughter ion it is predicted from."""
    batch = predict_alkanes(parameters, chain.backbone, chain.positions)
    named = parameters.named()
    effects = linearise(channels.at(batch.masses), batch, errors).effects
    observed = channels.at(batch.side_masses)
    excess = observed.intensity - isotopes_below(channels, batch.side_masses)
    usable = observed.seen & observed.recorded & ~observed.doubtful & (excess > 0)
    ratios = {}
    for column, (series, size) in enumerate(side_ions(batch.skeleton_carbons)):
        if usable[column]:
            name = f"side_{series}_{size}"
            tilted = effects[0] + effects[1] * (size - TILT_PIVOT) / TILT_PIVOT
            bare = np.log(batch.side_abundance[column]) - named[name]
            ratios[name] = float(np.log(excess[column]) - tilted - bare)
    return ratios
