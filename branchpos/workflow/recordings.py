"""How a spectrum was recorded: the readings of its quality that matter for a verdict."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import END_GROUPS, EndGroup
from branchpos.ion_series import SeriesBatch
from branchpos.mass_channels import MassChannels
from branchpos.scoring.error_model import POOR, SOUND, ErrorModel, Quality
from branchpos.scoring.likelihood import Fit, fit_batch
from branchpos.scoring.remainder import Remainder, score_remainder
from branchpos.scoring.screening import screen_batch
from branchpos.workflow.candidates import Screened, SizeGroup
from branchpos.workflow.model import Model

FloatArray = NDArray[np.float64]

ALKENE = END_GROUPS["alkene"]
_MARGIN = 6.0
"""Natural-log margin within which a reading of the quality counts."""


@dataclass(frozen=True, slots=True, eq=False)
class Recording:
    """The observations read as of one quality.

    Attributes
    ----------
    channels : observations of that quality.
    model : the fitted model.
    widening : factor on all error scales.
    log_prior : natural log of its prior.
    heaviest : last mass number that any hypothesis of the comparison speaks of.
    """

    channels: MassChannels
    model: Model
    widening: float
    log_prior: float
    heaviest: int

    def fit(self, batch: SeriesBatch) -> Fit:
        """Score a batch on its own ions."""
        view = self.channels.for_class(batch.end_group).at(batch.masses)
        return fit_batch(view, batch, self._errors(batch.end_group))

    def screen(self, screened: Screened) -> FloatArray:
        """Return the approximate log likelihood of every chain of a batch on its own ions."""
        if self.widening == 1:
            return screened.scores
        batch = screened.batch
        view = self.channels.for_class(batch.end_group).at(batch.masses)
        return screen_batch(view, batch, self._errors(batch.end_group))

    def remainder(self, batch: SeriesBatch, effects: FloatArray) -> Remainder:
        """Score the masses that are no ions of the batch."""
        channels = self.channels.for_class(batch.end_group)
        return score_remainder(channels, batch, effects, self.heaviest, self._errors(batch.end_group))

    def widened(self, factor: float) -> Recording:
        """Return the reading with every error scale multiplied."""
        return replace(self, widening=self.widening * factor)

    def _errors(self, end_group: EndGroup) -> ErrorModel:
        known = self.model.errors if end_group == ALKENE else self.model.of(end_group).errors
        return known.widened(self.widening)

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
        model,
        quality.widening,
        float(np.log(quality.prior)),
        heaviest,
    )
