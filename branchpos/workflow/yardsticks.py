"""Two simple ways of naming a structure, for comparison: the nearest known spectrum, and counting ions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.cleaning.nominal import to_channels
from branchpos.enumerating import alkane_positions, count_alkanes
from branchpos.ion_series import SeriesBatch
from branchpos.mass_channels import MassChannels
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.workflow.model import Model
from branchpos.workflow.reference_spectra import KnownSpectrum

FloatArray = NDArray[np.float64]

_MOST_METHYLS = 4
_STEERED = 0.5
"""Share of an ion that has to come from cleavage beside a branch for the ion to count as expected."""


@dataclass(frozen=True, slots=True)
class Nearest:
    """The nearest spectrum of another compound: accession, chain, cosine from 0 to 1."""

    accession: str
    chain: Chain
    cosine: float


@dataclass(frozen=True, slots=True)
class IonCount:
    """Where the truth stands when chains of its size are ranked by how many expected ions are present.

    Attributes
    ----------
    rank, candidates : rank of the truth, ties at their middle, and how many chains were ranked.
    rank_among_alike, alike : the same among the chains with as many methyls as the truth.
    """

    rank: float
    candidates: int
    rank_among_alike: float
    alike: int


def nearest_spectrum(one: KnownSpectrum, known: Sequence[KnownSpectrum]) -> Nearest | None:
    """Find the most alike record among those of other compounds; None where there is none.

    Alike: cosine of the square roots of the intensities on whole masses (common practice).
    """
    others = [other for other in known if other.chain != one.chain]
    if not others:
        return None
    mine = _vector(one)
    cosines = [float(mine @ _vector(other, mine.size)) for other in others]
    best = int(np.argmax(cosines))
    return Nearest(others[best].accession, others[best].chain, cosines[best])


def same_branching(one: Chain, other: Chain) -> bool:
    """Tell whether two chains carry methyls at the same positions, whatever their length."""
    return one.methyls == other.methyls


def count_ions(one: KnownSpectrum, model: Model) -> IonCount:
    """Rank the chains with the carbons of the truth by how many branch-steered ions are present."""
    channels, _ = to_channels(one.spectrum)
    alike = _batch(one.chain.backbone, len(one.chain.methyls), model)
    counts = _present(channels, alike)
    truth = int(counts[_row_of(alike, one.chain)])
    others = [
        _present(channels, _batch(one.chain.carbons - methyls, methyls, model))
        for methyls in range(_MOST_METHYLS + 1)
        if methyls != len(one.chain.methyls) and count_alkanes(one.chain.carbons - methyls, methyls)
    ]
    everything = np.concatenate([counts, *others])
    return IonCount(_rank(truth, everything), everything.size, _rank(truth, counts), counts.size)


def _batch(backbone: int, methyls: int, model: Model) -> SeriesBatch:
    return predict_alkanes(model.yields, backbone, alkane_positions(backbone, methyls))


def _rank(truth: int, counts: NDArray[np.intp]) -> float:
    """Return the rank of a count, ties at their middle."""
    return float((counts > truth).sum() + ((counts == truth).sum() + 1) / 2)


def _present(channels: MassChannels, batch: SeriesBatch) -> NDArray[np.intp]:
    seen = channels.at(batch.masses).seen
    return np.asarray(((batch.steered > _STEERED) & seen).sum(axis=1))


def _row_of(batch: SeriesBatch, chain: Chain) -> int:
    return next(row for row in range(len(batch)) if batch.chain(row) == chain)


def _vector(one: KnownSpectrum, size: int = 0) -> FloatArray:
    channels, _ = to_channels(one.spectrum)
    root = np.sqrt(channels.intensity)
    root /= max(float(np.linalg.norm(root)), 1e-12)
    if size:
        root = np.pad(root, (0, max(size - root.size, 0)))[:size]
    return np.asarray(root)
