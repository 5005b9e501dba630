"""How a spectrum was recorded: the readings of its quality that matter for a verdict."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from branchpos.ion_series import SeriesBatch
from branchpos.mass_channels import MassChannels
from branchpos.scoring.error_model import POOR, SOUND, ErrorModel, Quality
from branchpos.scoring.likelihood import Fit, fit_batch
from branchpos.scoring.remainder import Remainder, score_remainder
from branchpos.workflow.candidates import SizeGroup
from branchpos.workflow.model import Model

FloatArray = NDArray[np.float64]

_MARGIN = 6.0
"""Natural-log margin within which a reading of the quality counts."""


@dataclass(frozen=True, slots=True, eq=False)
class Recording:
    """The observations read as of one quality.

    Attributes
    ----------
    channels, errors : observations and error scales of that quality.
    log_prior : natural log of its prior.
    heaviest : last mass number that any hypothesis of the comparison speaks of.
    """

    channels: MassChannels
    errors: ErrorModel
    log_prior: float
    heaviest: int

    def fit(self, batch: SeriesBatch) -> Fit:
        """Score a batch on its own ions."""
        return fit_batch(self.channels.at(batch.masses), batch, self.errors)

    def remainder(self, batch: SeriesBatch, effects: FloatArray) -> Remainder:
        """Score the masses that are no ions of the batch."""
        return score_remainder(self.channels, batch, effects, self.heaviest, self.errors)

    def evidence(self, batch: SeriesBatch) -> float:
        """Return log prior times likelihood of the best chain of a batch on all masses."""
        fit = self.fit(batch)
        best = int(fit.log_likelihood.argmax())
        rest = self.remainder(batch, fit.effects[best])
        return float(fit.log_likelihood[best]) + rest.total + self.log_prior


def judge_quality(
    channels: MassChannels, groups: Sequence[SizeGroup], heaviest: int, model: Model
) -> list[Recording]:
    """Return the readings of the quality that matter, likeliest first.

    The poor reading is kept only where the best chain speaks for it, since it costs a second scoring.
    """
    leading = max(groups, key=lambda group: group.standing)
    options = [_recorded_as(channels, quality, heaviest, model) for quality in (SOUND, POOR)]
    if leading.best is None:
        return options
    evidence = [option.evidence(leading.best) for option in options]
    ranked = sorted(range(len(options)), key=lambda index: -evidence[index])
    return [options[index] for index in ranked if evidence[index] > max(evidence) - _MARGIN]


def _recorded_as(channels: MassChannels, quality: Quality, heaviest: int, model: Model) -> Recording:
    return Recording(
        channels.with_omission(quality.omission),
        model.errors.widened(quality.widening),
        float(np.log(quality.prior)),
        heaviest,
    )
