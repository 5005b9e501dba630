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

_STRONGEST = 12
"""Tallest ions that set the scale from which the linear fit starts."""
_FARTHEST = np.float32(3.0)
"""Largest residual [natural log] that the linear fit looks at."""
_FOLDS = 3
"""Halvings that multiply columns together before the log: 8 factors below 1e4 each fit single precision."""
_CHUNK = 512
"""Rows at a time, so that the temporaries stay in the processor's cache."""


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
    columns: slice | NDArray[np.intp] = slice(None) if view.recorded.all() else usable
    scores = np.empty(len(batch))
    for start in range(0, len(batch), _CHUNK):
        rows = slice(start, start + _CHUNK)
        scores[rows] = screen.score(batch.abundance[rows, columns], batch.steered[rows, columns])
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
        self.half_inverse_scale = (0.5 / scale).astype(np.float32)
        self.common = np.stack([np.ones_like(self.tilt), self.tilt])
        self.highest = np.where(seen, np.inf, 0.0).astype(np.float32)
        self.noise = np.float32(NOISE_OF_THRESHOLD * view.threshold)
        strength = np.where(seen, view.intensity[usable], 0.0)
        self.strongest = np.argsort(-strength)[:_STRONGEST]
        leading = strength[self.strongest]
        self.strength = (leading / max(float(leading.sum()), 1e-12)).astype(np.float32)
        weight = np.where(seen, scale**-2.0, 0.0)
        self.moments = np.stack([weight, weight * self.tilt, weight * self.tilt**2], axis=1).astype(
            np.float32
        )
        self.precision = errors.effect_sds[:2] ** -2.0
        self.constant = np.float32((log_density(np.zeros(1))[0] - np.log(scale[seen])).sum())

    def score(self, abundance: FloatTable, steered: FloatTable) -> FloatTable:
        """Return the approximate log likelihood of each row."""
        strong = np.maximum(abundance[:, self.strongest], np.float32(1e-7))
        scale = np.exp(np.log(strong) @ -self.strength)
        scale *= np.float32(np.exp(self.observed[self.strongest] @ self.strength))
        residual = self.observed - np.log(abundance * scale[:, None] + self.noise)
        np.clip(residual, -_FARTHEST, _FARTHEST, out=residual)
        effects = self._effects(residual, steered)
        residual -= effects[:, :2] @ self.common
        residual -= effects[:, 2:3] * steered
        residual *= self.half_inverse_scale
        np.minimum(residual, self.highest, out=residual)
        residual *= residual
        residual += np.float32(1)
        penalty = 0.5 * (effects[:, 1:] ** 2 @ self.precision.astype(np.float32))
        return np.asarray(self.constant - np.float32(2.5) * _log_of_products(residual) - penalty, np.float32)

    def _effects(self, residual: FloatTable, steered: FloatTable) -> FloatTable:
        """Solve the ridge least squares for scale, tilt and contrast, shape (chains, 3).

        The block of scale and tilt is the same for all chains, so that eliminating it by hand is far quicker
        than a solver call a chain.
        """
        weight, tilt_weight = self.moments[:, 0], self.moments[:, 1]
        n00, n01, n11 = self.moments.sum(axis=0).astype(float).tolist()
        n00, n11 = n00 + 1e-6, n11 + float(self.precision[0])
        n02, n12 = steered @ weight, steered @ tilt_weight
        n22 = (steered * steered) @ weight + np.float32(self.precision[1])
        m0, m1, m2 = residual @ weight, residual @ tilt_weight, (steered * residual) @ weight
        determinant = n00 * n11 - n01 * n01
        p0, p1 = (n11 * n02 - n01 * n12) / determinant, (n00 * n12 - n01 * n02) / determinant
        q0, q1 = (n11 * m0 - n01 * m1) / determinant, (n00 * m1 - n01 * m0) / determinant
        contrast = (m2 - n02 * q0 - n12 * q1) / (n22 - n02 * p0 - n12 * p1)
        return np.asarray(np.stack([q0 - p0 * contrast, q1 - p1 * contrast, contrast], axis=1), np.float32)


def _log_of_products(factors: FloatTable) -> FloatTable:
    """Return the summed logs of each row; columns are multiplied together first, since logs are slow."""
    width = factors.shape[1]
    for _ in range(_FOLDS):
        half = width // 2
        if half == 0:
            break
        factors[:, :half] *= factors[:, width - half : width]
        width -= half
    return np.asarray(np.log(factors[:, :width]).sum(axis=1), dtype=np.float32)
