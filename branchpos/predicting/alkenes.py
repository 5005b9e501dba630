"""Expected ions of an alkene: enough to recognise one, not to place its double bond.

Levels read off the 1-alkenes C20 to C28 of a sediment pyrolysate (GC-MS run of the public repository
johankool/peacock-gcms, 1-alkenes as partners of the n-alkanes), relative to the ion C7H13. The double bond
wanders before cleavage, so that isomers look alike (common practice).
"""

from __future__ import annotations

import numpy as np

from branchpos.end_group import END_GROUPS
from branchpos.ion_series import IonKind, SeriesBatch

_SMALLEST = 4
_ALKENYL = (0.70, 0.70, 0.98, 1.00, 0.49, 0.22, 0.09, 0.05, 0.03)
"""CnH2n-1, n from 4; larger sizes fall by ``_FALL`` a carbon, as in the next two rows."""
_ALKENE = (0.34, 0.40, 0.30, 0.19, 0.12, 0.07, 0.04, 0.03, 0.02)
_ALKYL = (0.80, 0.53, 0.36, 0.09, 0.05, 0.03, 0.02, 0.01, 0.01)
_FALL = 0.6
_MOLECULAR = 0.02


def predict_alkene(carbons: int) -> SeriesBatch:
    """Return the ions of a straight alkene of so many carbons as a batch of one.

    >>> batch = predict_alkene(20)
    >>> int(batch.masses[batch.abundance[0].argmax()]), 280 in batch.masses
    (97, True)
    """
    sizes = np.arange(_SMALLEST, carbons)
    beyond = _FALL ** np.maximum(sizes - _SMALLEST - len(_ALKENYL) + 1, 0)
    within = np.minimum(sizes - _SMALLEST, len(_ALKENYL) - 1)
    levels = [np.array(row)[within] * beyond for row in (_ALKENYL, _ALKENE, _ALKYL)]
    masses = [14 * sizes - 1, 14 * sizes, 14 * sizes + 1]
    kinds = [IonKind.FRAGMENT] * (3 * sizes.size) + [IonKind.MOLECULAR]
    abundance = np.concatenate([*levels, [_MOLECULAR]]).astype(np.float32)
    return SeriesBatch(
        end_group=END_GROUPS["alkene"],
        backbone=carbons,
        positions=np.empty((1, 0), dtype=np.int16),
        masses=np.concatenate([*masses, [14 * carbons]]),
        carbons=np.concatenate([sizes, sizes, sizes, [carbons]]),
        kinds=np.array(kinds, dtype=np.intp),
        abundance=(abundance / abundance.sum())[None, :],
        steered=np.zeros((1, abundance.size), dtype=np.float32),
        side_masses=np.empty(0, dtype=np.intp),
        side_abundance=np.empty(0),
    )
