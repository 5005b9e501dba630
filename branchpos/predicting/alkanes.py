"""Expected ions of methyl-branched alkanes: competing cleavages, and the daughters of what does not survive.

Every cleavage competes for the ion current. An ion that survives stands at its own size; one that does not
loses alkenes and feeds the low alkyl series, each size by its weight among the sizes still open to it. The
molecular ion is what is left over, less as the summed rates grow. Carbon-13 carries each even-mass ion into
the odd mass above it.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import ALKANE
from branchpos.ion_series import IonKind, SeriesBatch
from branchpos.masses import isotope_pattern, parse_formula
from branchpos.predicting.cleavage import Cleavages, cleave
from branchpos.predicting.parameters import YieldParameters
from branchpos.predicting.yields import YieldTables, side_ions, yield_tables

SMALLEST = 3
"""Smallest ion [carbons] that is predicted; below it every hydrocarbon gives much the same."""
CARBON_13 = float(isotope_pattern(parse_formula("C"), 2)[1])
"""Abundance of 13C relative to 12C, carried into the next mass by each carbon."""

_CHUNK = 1024

FloatTable = NDArray[np.float32]


def predict_alkanes(parameters: YieldParameters, backbone: int, positions: NDArray[np.int16]) -> SeriesBatch:
    """Predict the ions of alkanes that share a backbone and a number of methyls.

    Parameters
    ----------
    parameters : the fitted model.
    backbone : carbons of the main chain.
    positions : methyl positions, shape (chains, methyls).

    Returns
    -------
    ions by size, odd then even mass, from C3 up, then the molecular ion; abundances sum to about one.

    >>> import numpy as np
    >>> from branchpos.predicting.parameters import prior_parameters
    >>> batch = predict_alkanes(prior_parameters(), 11, np.array([[4]], dtype=np.int16))
    >>> bool(dict(zip(batch.masses.tolist(), batch.abundance[0] > 0.01))[127])
    True
    """
    methyls = positions.shape[1]
    carbons = backbone + methyls
    tables = _tables(parameters, carbons, methyls)
    masses, sizes, kinds = _ions(carbons)
    abundance = np.empty((len(positions), masses.size), dtype=np.float32)
    steered = np.empty_like(abundance)
    daughters = np.zeros(carbons + 2)
    for start in range(0, len(positions), _CHUNK):
        rows = slice(start, start + _CHUNK)
        cleavages = cleave(backbone, positions[rows])
        abundance[rows], steered[rows], pool = _assemble(parameters, tables, cleavages, carbons)
        daughters += pool
    series, side_sizes = np.array(side_ions(carbons), dtype=np.intp).reshape(-1, 2).T
    return SeriesBatch(
        end_group=ALKANE,
        backbone=backbone,
        positions=positions,
        masses=masses,
        carbons=sizes,
        kinds=kinds,
        abundance=abundance,
        steered=steered,
        side_masses=14 * side_sizes - series,
        side_abundance=tables.side * daughters[side_sizes] / max(len(positions), 1),
    )


@lru_cache(maxsize=512)
def _tables(parameters: YieldParameters, carbons: int, methyls: int) -> YieldTables:
    return yield_tables(parameters.named(), carbons, methyls)


@lru_cache(maxsize=128)
def _ions(carbons: int) -> tuple[NDArray[np.intp], NDArray[np.intp], NDArray[np.intp]]:
    sizes = np.arange(SMALLEST, carbons)
    masses = np.concatenate([14 * sizes + 1, 14 * sizes, [14 * carbons + 2]])
    kinds = np.repeat([IonKind.FRAGMENT, IonKind.REARRANGED, IonKind.MOLECULAR], [sizes.size, sizes.size, 1])
    return masses, np.concatenate([sizes, sizes, [carbons]]), kinds.astype(np.intp)


def _assemble(
    parameters: YieldParameters, tables: YieldTables, cleavages: Cleavages, carbons: int
) -> tuple[FloatTable, FloatTable, NDArray[np.float64]]:
    """Return abundance and steered share of every ion, and the summed odd daughters by size."""
    primary = _primary(tables, cleavages, carbons)
    total = primary.total
    daughters = _daughters(tables, primary.lost)
    carried = (CARBON_13 * np.arange(carbons + 2)).astype(np.float32)
    even = primary.doublet.imag + daughters * tables.pool_even.astype(np.float32)
    odd = primary.doublet.real + daughters * (1 - tables.pool_even).astype(np.float32) + carried * even
    steered_odd = primary.steered.real + carried * primary.steered.imag
    molecular = total * _molecular_share(parameters, cleavages, total, carbons)
    wanted = slice(SMALLEST, carbons)
    abundance = np.concatenate([odd[:, wanted], even[:, wanted], molecular[:, None]], axis=1)
    part = np.concatenate(
        [steered_odd[:, wanted], primary.steered.imag[:, wanted], np.zeros_like(molecular)[:, None]], axis=1
    )
    part /= np.maximum(abundance, np.float32(1e-30))
    abundance /= (total + molecular)[:, None]
    pool = ((daughters / total[:, None]) * (1 - tables.pool_even)).sum(axis=0)
    return abundance, part, pool


@dataclass(frozen=True, slots=True, eq=False)
class _Primary:
    """Ions of the first cleavage by size, each of shape (chains, carbons + 2).

    A doublet is one complex number, odd-mass ion real and even-mass ion imaginary, so that both move through
    the gathers below at once.
    """

    doublet: NDArray[np.complex64]
    steered: NDArray[np.complex64]
    lost: FloatTable
    total: NDArray[np.float32]


def _primary(tables: YieldTables, cleavages: Cleavages, carbons: int) -> _Primary:
    width = carbons + 2
    shape = (len(cleavages.single), width)
    doublet, steered = np.zeros(shape, np.complex64), np.zeros(shape, np.complex64)
    lost = np.zeros(shape, np.float32)
    start_of_row = (np.arange(shape[0]) * width)[:, None]
    for side in (cleavages.left, cleavages.right):
        source = (side.state * width + side.size).ravel()
        target = (start_of_row + side.size).ravel()  # sizes differ along a row: plain += loses nothing
        doublet.ravel()[target] += tables.doublet.take(source)
        steered.ravel()[target] += tables.steered.take(source)
        lost.ravel()[target] += tables.lost.take(source)
    counts = np.stack([cleavages.single, 2 * cleavages.geminal], axis=1)
    from_methyls = counts @ tables.methyl_doublet
    doublet[:, carbons - 1] += from_methyls
    steered[:, carbons - 1] += from_methyls
    lost[:, carbons - 1] += counts @ tables.methyl_lost
    ones = np.ones(width, np.float32)
    total = (doublet.real @ ones) + (doublet.imag @ ones) + lost @ ones
    return _Primary(doublet, steered, lost, total)


def _daughters(tables: YieldTables, lost: NDArray[np.float32]) -> NDArray[np.float32]:
    """Spread what falls apart over the sizes at least two carbons smaller, by their weights."""
    reachable = np.cumsum(tables.pool)
    per_weight = np.zeros_like(lost)
    per_weight[:, 4:] = lost[:, 4:] / reachable[2:-2].astype(np.float32)
    from_above = np.cumsum(per_weight[:, ::-1], axis=1)[:, ::-1]
    daughters = np.zeros_like(lost)
    daughters[:, :-2] = tables.pool[:-2].astype(np.float32) * from_above[:, 2:]
    return daughters


def _molecular_share(
    parameters: YieldParameters, cleavages: Cleavages, total: NDArray[np.float32], carbons: int
) -> NDArray[np.float32]:
    named = parameters.named()
    bonds = cleavages.left.size.shape[1] + 1
    log_share = (
        named["molecular"]
        + named["molecular_size"] * (carbons - 20)
        + named["molecular_rate"] * np.log(total / (2 * bonds))
        + named["molecular_geminal"] * cleavages.geminal
    )
    return np.asarray(np.exp(log_share), dtype=np.float32)
