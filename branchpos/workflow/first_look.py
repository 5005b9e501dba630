"""A first look over all classes and sizes: which could have given the spectrum at all.

Every unbranched and every singly branched chain is a template; the cosine between spectra whose ions are
weighted by mass says which templates come near. Only the classes and sizes of the best are looked at in
earnest, so that fifteen classes cost little more than one.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import ALKANE, EndGroup
from branchpos.enumerating import count_chains
from branchpos.enumerating.sizes import LARGEST, SMALLEST, plausible_carbons
from branchpos.mass_channels import MassChannels
from branchpos.workflow.model import ClassModel, Model

FloatTable = NDArray[np.float32]

_KEPT = 10
"""Classes and sizes that go on to the full comparison."""
_MASS_POWER, _HEIGHT_POWER = 1.0, 0.5
"""Weights of a common spectral cosine: heavy ions tell more, tall ones less than their height (judgement)."""
_HEAVIEST = 900
_BEYOND_TOP, _BELOW_TOP = 100, 4
"""How far the molecule may lie above and below the heaviest strong peak [mass numbers]."""
_STRONG_THRESHOLDS, _STRONG = 5.0, 0.01


@dataclass(frozen=True, slots=True, eq=False)
class _Templates:
    """Templates of one class and size, unit length, shape (templates, masses)."""

    table: FloatTable


def likely_sizes(
    channels: MassChannels, classes: Sequence[EndGroup], carbons: range | None, model: Model
) -> list[tuple[EndGroup, int]]:
    """Return the classes and numbers of carbons whose templates come nearest, best first.

    Parameters
    ----------
    carbons : numbers to choose from; None lets the heaviest peaks say.
    """
    observed = _weighted(channels.intensity + channels.foreign)
    found: list[tuple[float, EndGroup, int]] = []
    for end_group in classes:
        for number in _range_of(channels, end_group, carbons):
            if number > 2 and count_chains(number, 0, end_group):
                templates = _templates(model.of(end_group), number)
                near = float((templates.table @ _within(observed, channels)).max())
                found.append((near, end_group, number))
    found.sort(key=lambda one: -one[0])
    kept = [(end_group, number) for _, end_group, number in found[:_KEPT]]
    return kept + _straight_alkanes(channels, kept, classes, carbons)


def _straight_alkanes(
    channels: MassChannels,
    kept: Sequence[tuple[EndGroup, int]],
    classes: Sequence[EndGroup],
    carbons: range | None,
) -> list[tuple[EndGroup, int]]:
    """Where alkanes lead, return their other sizes: the spectrum may end far below the molecule."""
    if ALKANE not in classes or carbons is not None or not kept or kept[0][0] != ALKANE:
        return []
    return [(ALKANE, number) for number in plausible_carbons(channels) if (ALKANE, number) not in kept]


def _range_of(channels: MassChannels, end_group: EndGroup, carbons: range | None) -> range:
    """Return the numbers of carbons whose molecule is about as heavy as the heaviest strong peak asks."""
    if carbons is not None:
        return carbons
    heights = channels.intensity + channels.foreign
    strong = np.flatnonzero(heights >= max(_STRONG_THRESHOLDS * channels.threshold, _STRONG))
    top = int(strong[-1]) if strong.size else channels.heaviest
    added = end_group.added.nominal_mass + 2
    fewest, most = -(-(top - _BELOW_TOP - added) // 14), (channels.heaviest + _BEYOND_TOP - added) // 14
    return range(max(fewest, min(SMALLEST, 3)), min(most, LARGEST) + 1)


@lru_cache(maxsize=1024)
def _templates(model: ClassModel, carbons: int) -> _Templates:
    rows = []
    for methyls in (0, 1):
        if count_chains(carbons, methyls, model.end_group):
            batch = model.predict_all(carbons - methyls, methyls)
            table = np.zeros((len(batch), _HEAVIEST), dtype=np.float32)
            inside = batch.masses < _HEAVIEST
            table[:, batch.masses[inside]] = batch.abundance[:, inside]
            for mass, level in zip(batch.side_masses, batch.side_abundance, strict=True):
                table[:, mass] = level
            rows.append(_weighted(table))
    return _Templates(np.concatenate(rows))


def _weighted(intensity: NDArray[np.floating]) -> FloatTable:
    """Weight intensities by mass and height and bring each spectrum to unit length."""
    size = min(intensity.shape[-1], _HEAVIEST)
    weighted = np.zeros((*intensity.shape[:-1], _HEAVIEST), dtype=np.float32)
    weighted[..., :size] = intensity[..., :size] ** _HEIGHT_POWER * np.arange(size) ** _MASS_POWER
    length = np.sqrt((weighted**2).sum(axis=-1, keepdims=True))
    return np.asarray(weighted / np.maximum(length, 1e-12), dtype=np.float32)


def _within(observed: FloatTable, channels: MassChannels) -> FloatTable:
    """Leave out what was not recorded."""
    visible = observed.copy()
    visible[: channels.first] = 0.0
    return visible
