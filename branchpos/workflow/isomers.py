"""Every structure once, and what would tell it from the isomer most like it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import chain as joined
from itertools import islice

import numpy as np
from numpy.typing import NDArray

from branchpos.chain import Chain
from branchpos.enumerating import alkane_positions, count_alkanes, enumerate_alkanes
from branchpos.errors import SettingsError
from branchpos.ion_series import SeriesBatch
from branchpos.isomer import Difference, Isomer, TellingIon
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.retention import predict_retention
from branchpos.retention_index import EXACT, RetentionIndex
from branchpos.scoring.error_model import NOISE_OF_THRESHOLD, ErrorModel, log_density
from branchpos.scoring.likelihood import TILT_PIVOT
from branchpos.workflow.method import ALL_CARBONS, MOST_METHYLS
from branchpos.workflow.model import Model, shipped_model
from branchpos.workflow.predict import relative_abundance

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

MOST_COMPARED = 5000
"""Structures up to which each is compared with all others."""
THRESHOLD = 0.005
"""Detection threshold [of the base peak] at which spectra are compared: a usual recording."""
INDEX_SD = 1.0
"""Standard deviation [index units] of the measured index they are compared by."""
_TOLD, _LEAST_TOLD = 3, 0.25
"""Ions named for each pair, and the bits that one has to give to be named."""
_SHORTLIST = 12
"""Nearest isomers by least squares that are compared again with heavy tails."""
_ROWS_AT_ONCE = 512
_BITS = 1 / np.log(2)


def count_isomers(carbons: int, methyls: Sequence[int]) -> int:
    """Return how many structures there are.

    >>> count_isomers(27, [2])
    144
    """
    return sum(count_alkanes(carbons, number) for number in methyls)


def list_isomers(
    carbons: int, methyls: Sequence[int], chain_class: str = "alkane", model: Model | None = None
) -> Iterator[Isomer]:
    """Stream every structure once; up to ``MOST_COMPARED`` of them come with their nearest isomer.

    Parameters
    ----------
    carbons : carbons of the skeleton, branches included.
    methyls : numbers of methyl branches.
    chain_class : name of the chain class.
    model : a fitted model; the shipped one when not given.

    Raises
    ------
    SettingsError : a number is out of range, or the class is none whose isomers can be listed.

    >>> one = next(list_isomers(27, [2]))
    >>> one.chain.methyls, one.nearest is not None
    ((2, 2), True)
    """
    _check(carbons, methyls, chain_class)
    chosen = model or shipped_model()
    if count_isomers(carbons, methyls) > MOST_COMPARED:
        return _without_comparison(carbons, methyls, chosen)
    return iter(_compared(carbons, methyls, chosen))


def _check(carbons: int, methyls: Sequence[int], chain_class: str) -> None:
    if chain_class != "alkane":
        raise SettingsError(
            f"isomers of the class {chain_class!r} cannot be listed yet", remedy="choose alkane"
        )
    if carbons not in ALL_CARBONS:
        span = f"{ALL_CARBONS[0]} to {ALL_CARBONS[-1]}"
        raise SettingsError(f"{carbons} carbons", remedy=f"give a number from {span}")
    if not methyls or min(methyls) < 0 or max(methyls) > MOST_METHYLS:
        raise SettingsError(f"methyls {list(methyls)}", remedy=f"give numbers from 0 to {MOST_METHYLS}")


def _without_comparison(carbons: int, methyls: Sequence[int], model: Model) -> Iterator[Isomer]:
    stream = joined.from_iterable(_rows(carbons, number) for number in methyls)
    for chains in stream:
        yield from (
            Isomer(one, index, None) for one, index in zip(chains, _indices(chains, model), strict=True)
        )


def _rows(carbons: int, methyls: int) -> Iterator[list[Chain]]:
    stream = enumerate_alkanes(carbons, methyls)
    while rows := list(islice(stream, _ROWS_AT_ONCE)):
        yield rows


def _indices(chains: Sequence[Chain], model: Model) -> list[RetentionIndex]:
    positions = np.array([one.methyls for one in chains], dtype=np.intp).reshape(len(chains), -1)
    mean, sd = predict_retention(positions, chains[0].backbone, model.retention)
    return [RetentionIndex(float(m), sd=max(float(s), EXACT)) for m, s in zip(mean, sd, strict=True)]


@dataclass(frozen=True, slots=True, eq=False)
class _Expected:
    """What is expected of all the structures compared.

    Attributes
    ----------
    chains, indices : the structures and their retention indices.
    masses : mass numbers, shape (ions,).
    scale : scale of the log error, shape (ions,).
    relative : abundance relative to the base peak, shape (structures, ions).
    flattened : log abundance above the noise in error scales, free of what an instrument's scale and tilt
        could take up, same shape.
    """

    chains: list[Chain]
    indices: list[RetentionIndex]
    masses: IntArray
    scale: FloatArray
    relative: FloatArray
    flattened: FloatArray


def _compared(carbons: int, methyls: Sequence[int], model: Model) -> Iterator[Isomer]:
    batches = [
        predict_alkanes(model.yields, carbons - number, positions)
        for number in methyls
        if len(positions := alkane_positions(carbons - number, number))
    ]
    if not batches:
        return
    expected = _expectation(batches, model)
    value = np.array([index.value for index in expected.indices])
    variance = np.array([index.sd for index in expected.indices]) ** 2
    for start in range(0, len(value), _ROWS_AT_ONCE):
        rows = np.arange(start, min(start + _ROWS_AT_ONCE, len(value)))
        index_bits = _index_bits(value, variance, rows)
        for row, others, bits in zip(rows, _shortlists(expected, index_bits, rows), index_bits, strict=True):
            nearest = _nearest(expected, int(row), others, bits[others]) if others.size else None
            yield Isomer(expected.chains[row], expected.indices[row], nearest)


def _expectation(batches: Sequence[SeriesBatch], model: Model) -> _Expected:
    """Put all batches on one footing: isomers share their mass numbers."""
    first = batches[0]
    chains = [batch.chain(row) for batch in batches for row in range(len(batch))]
    indices = [
        index
        for batch in batches
        for index in _indices([batch.chain(row) for row in range(len(batch))], model)
    ]
    relative = np.concatenate([relative_abundance(batch) for batch in batches])
    scale = np.array(model.errors.scales)[first.kinds]
    flattened = _above_noise(relative) / scale @ _without_instrument(first, scale, model.errors)
    return _Expected(chains, indices, first.masses, scale, relative, flattened)


def _without_instrument(batch: SeriesBatch, scale: FloatArray, errors: ErrorModel) -> FloatArray:
    """Return the matrix that takes out what scale and tilt could explain, shape (ions, ions)."""
    tilt = (batch.carbons - TILT_PIVOT) / TILT_PIVOT
    effects = np.stack([1 / scale, tilt / scale], axis=1)
    precision = np.diag([1e-9, errors.tilt_sd**-2.0])
    taken = effects @ np.linalg.solve(effects.T @ effects + precision, effects.T)
    return np.asarray(np.eye(scale.size) - taken)


def _index_bits(value: FloatArray, variance: FloatArray, rows: IntArray) -> FloatArray:
    """Return the bits that a measured index would be expected to give, shape (rows, structures).

    Half the squared distance in standard deviations: the divergence of two normal distributions.
    """
    spread = (variance[rows, None] + variance) / 2 + INDEX_SD**2
    return np.asarray(_BITS * (value[rows, None] - value) ** 2 / (2 * spread))


def _shortlists(expected: _Expected, index_bits: FloatArray, rows: IntArray) -> list[IntArray]:
    """Return, for each row, the isomers that least squares finds nearest."""
    flat = expected.flattened.astype(np.float32)
    norms = np.einsum("si,si->s", flat, flat)
    squared = norms[rows, None] + norms - 2 * flat[rows] @ flat.T
    bits = _BITS * squared * 5 / 8 + index_bits  # 5/8: curvature of Student's t with 4 degrees of freedom
    bits[np.arange(rows.size), rows] = np.inf
    wanted = min(_SHORTLIST, bits.shape[1] - 1)
    if wanted == 0:
        return [np.empty(0, dtype=np.intp)] * rows.size
    return list(np.argpartition(bits, wanted - 1, axis=1)[:, :wanted])


def _nearest(expected: _Expected, row: int, others: IntArray, index_bits: FloatArray) -> Difference:
    """Return what parts a structure from the nearest of its shortlist."""
    by_ion = _bits_of(expected.flattened[row] - expected.flattened[others])
    total = by_ion.sum(axis=1) + index_bits
    best = int(total.argmin())
    other = int(others[best])
    return Difference(
        chain=expected.chains[other],
        bits=float(total[best]),
        index_bits=float(index_bits[best]),
        index_difference=expected.indices[row].value - expected.indices[other].value,
        ions=_telling(expected, row, other, by_ion[best]),
    )


def _telling(expected: _Expected, row: int, other: int, by_ion: FloatArray) -> tuple[TellingIon, ...]:
    """Name the ions that part a pair, also to the eye that compares them with the base peak."""
    pair = _above_noise(expected.relative[[row, other]])
    visible = np.minimum(by_ion, _bits_of((pair[0] - pair[1]) / expected.scale))
    leading = [int(ion) for ion in np.argsort(-visible, kind="stable")[:_TOLD] if visible[ion] >= _LEAST_TOLD]
    return tuple(
        TellingIon(
            int(expected.masses[ion]),
            float(expected.relative[row, ion]),
            float(expected.relative[other, ion]),
            float(by_ion[ion]),
        )
        for ion in leading
    )


def _above_noise(relative: FloatArray) -> FloatArray:
    return np.asarray(np.log(relative + NOISE_OF_THRESHOLD * THRESHOLD))


def _bits_of(distance: FloatArray) -> FloatArray:
    """Return the bits of a distance in error scales under the heavy-tailed error."""
    return np.asarray(_BITS * (log_density(np.zeros(1)) - log_density(distance)))
