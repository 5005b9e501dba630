"""A first look at every chain, cheap enough for hundreds of thousands of them.

One linear fit of scale, tilt and contrast in place of the full adjustment; single precision. Its only task is
to say which chains deserve the full likelihood.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from branchpos.ion_series import SeriesBatch
from branchpos.mass_channels import ChannelView
from branchpos.scoring.error_model import (
    NOISE_OF_THRESHOLD,
    SHIFTED_SHARE,
    TEN,
    ErrorModel,
    log_density,
)
from branchpos.scoring.likelihood import tilt_coordinate

FloatTable = NDArray[np.float32]

_CHUNK = 1024


def screen_batch(view: ChannelView, batch: SeriesBatch, errors: ErrorModel) -> NDArray[np.float64]:
    """Return an approximate log likelihood of every chain, shape (chains,).

    Parameters
    ----------
    view : what was observed at ``batch.masses``.
    batch : expected ions, shape (chains, ions).
    errors : scales of errors and instrument effects.
    """
    usable = np.flatnonzero(view.recorded)
    screen = _Screen(view, batch, errors, usable)
    scores = np.empty(len(batch))
    for start in range(0, len(batch), _CHUNK):
        rows = slice(start, start + _CHUNK)
        scores[rows] = screen.score(batch.abundance[rows, usable], batch.steered[rows, usable])
    return scores


class _Screen:
    """What the chunks share: observations and weights of the usable ions, in single precision."""

    def __init__(self, view: ChannelView, batch: SeriesBatch, errors: ErrorModel, usable: NDArray[np.intp]):
        seen = view.seen[usable]
        log_seen = np.log(np.where(seen, view.intensity[usable], view.threshold))
        log_seen += np.where(view.doubtful[usable], SHIFTED_SHARE * TEN, 0.0)
        scale = np.array(errors.scales)[batch.kinds[usable]]
        scale = np.where(view.doubtful[usable], scale + 0.5 * TEN, scale)
        self.tilt = tilt_coordinate(batch.masses[usable]).astype(np.float32)
        self.observed = log_seen.astype(np.float32)
        self.inverse_scale = (1 / scale).astype(np.float32)
        self.unseen = np.flatnonzero(~seen)
        self.noise = np.float32(NOISE_OF_THRESHOLD * view.threshold)
        strength = np.where(seen, view.intensity[usable], 0.0)
        self.strength = (strength / max(float(strength.sum()), 1e-12)).astype(np.float32)
        weight = np.where(seen, scale**-2.0, 0.0)
        self.moments = np.stack([weight, weight * self.tilt, weight * self.tilt**2], axis=1).astype(
            np.float32
        )
        self.precision = errors.effect_sds[:2] ** -2.0
        self.constant = np.float32((log_density(np.zeros(1))[0] - np.log(scale[seen])).sum())

    def score(self, abundance: FloatTable, steered: FloatTable) -> FloatTable:
        """Return the approximate log likelihood of each row."""
        scale = np.exp(np.log(np.maximum(abundance, np.float32(1e-7))) @ -self.strength)
        scale *= np.float32(np.exp(self.observed @ self.strength))
        residual = self.observed - np.log(abundance * scale[:, None] + self.noise)
        np.clip(residual, -3.0, 3.0, out=residual)
        effects = self._effects(residual, steered)
        residual -= effects[:, :1]
        residual -= effects[:, 1:2] * self.tilt
        residual -= effects[:, 2:3] * steered
        residual *= self.inverse_scale
        residual[:, self.unseen] = np.minimum(residual[:, self.unseen], 0.0)
        residual *= residual
        residual *= np.float32(0.25)
        np.log1p(residual, out=residual)
        penalty = 0.5 * (effects[:, 1:] ** 2 @ self.precision.astype(np.float32))
        return np.asarray(self.constant - np.float32(2.5) * residual.sum(axis=1) - penalty, dtype=np.float32)

    def _effects(self, residual: FloatTable, steered: FloatTable) -> FloatTable:
        """Solve the ridge least squares for scale, tilt and contrast, shape (chains, 3)."""
        weight, tilt_weight = self.moments[:, 0], self.moments[:, 1]
        weighted = steered * weight
        normal = np.empty((len(residual), 3, 3))
        normal[:, 0, 0], normal[:, 0, 1], normal[:, 1, 1] = self.moments.sum(axis=0)
        normal[:, 0, 2] = weighted.sum(axis=1)
        normal[:, 1, 2] = weighted @ self.tilt
        normal[:, 2, 2] = np.einsum("hi,hi->h", weighted, steered)
        normal[:, 1, 0], normal[:, 2, 0], normal[:, 2, 1] = (
            normal[:, 0, 1], normal[:, 0, 2], normal[:, 1, 2],
        )  # fmt: skip
        normal[:, [0, 1, 2], [0, 1, 2]] += np.array([1e-6, *self.precision])
        moment = np.stack(
            [residual @ weight, residual @ tilt_weight, np.einsum("hi,hi->h", weighted, residual)], axis=1
        )
        return np.asarray(np.linalg.solve(normal, moment[:, :, None])[:, :, 0], dtype=np.float32)
