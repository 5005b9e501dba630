"""From a spectrum to the chains worth a full look: enumerate, predict, screen.

Few methyls are tried at every number of carbons; more methyls only where few already explain the spectrum to
within a wide margin of the best, and each better than the last, since every chain contains simpler ones that
explain part of it.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import ALKANE, END_GROUPS, EndGroup
from branchpos.enumerating import count_chains, regular_isoprenoids
from branchpos.enumerating.sizes import plausible_carbons
from branchpos.errors import SettingsError
from branchpos.ion_series import SeriesBatch
from branchpos.mass_channels import MassChannels
from branchpos.scoring.likelihood import fit_batch
from branchpos.scoring.remainder import Remainder, score_no_chain, score_remainder
from branchpos.scoring.screening import screen_batch
from branchpos.workflow.first_look import likely_sizes
from branchpos.workflow.method import Method
from branchpos.workflow.model import Model

FloatArray = NDArray[np.float64]

_MARGINS = {2: 40.0, 3: 25.0}
"""Natural-log margin within which a number of carbons is looked at with 2, and with more methyls."""
_LEAST_GAIN = 2.0
"""Natural-log gain that the second methyl must bring over one or none before more are tried."""
_HOPELESS = 60.0
"""Natural-log margin by which chains with few methyls may stay behind an unknown compound and still be
overtaken by chains with more: about twice the largest gain of a second methyl on the known records."""
_FITTED_FOR_STANDING = 3
_MOST_CHAINS = 150_000
"""Chains of one number of methyls that one look may try over all sizes; above, the likeliest sizes."""
_MOST_OF_ONE_SIZE = 1_000_000
"""Chains of one number of methyls and carbons that one look may try at all, some 1.5 GB."""
_ISOPRENOID_FROM = 4


@dataclass(frozen=True, slots=True, eq=False)
class Screened:
    """Chains that share carbons and methyls, with their approximate log likelihoods.

    Attributes
    ----------
    batch : expected ions.
    scores : approximate log likelihood on the ions of the batch, shape (chains,).
    is_family : true for a batch of isoprenoids that stands for all chains with so many methyls.
    """

    batch: SeriesBatch
    scores: FloatArray
    is_family: bool = False


@dataclass(slots=True, eq=False)
class SizeGroup:
    """All that was tried of one class at one number of carbons.

    Attributes
    ----------
    end_group : the class.
    carbons : carbons of the skeleton.
    screened : batches by number of methyls.
    remainder : log likelihood of the masses that no ion of the batches stands on.
    standing : log likelihood of the best chain with the remainder.
    best : that chain, as a batch of one.
    unaffordable : numbers of methyls left out because the chains were too many.
    """

    end_group: EndGroup
    carbons: int
    screened: list[Screened] = field(default_factory=list)
    remainder: Remainder | None = None
    standing: float = -np.inf
    best: SeriesBatch | None = None
    unaffordable: list[int] = field(default_factory=list)

    def gains_from_methyls(self, methyls: int) -> bool:
        """Tell whether the last methyls added explain more, so that further ones are worth a look."""
        top = {one.batch.positions.shape[1]: float(one.scores.max()) for one in self.screened}
        if methyls < max(_MARGINS) or len(top) < max(_MARGINS):
            return True
        fewer = max(score for count, score in top.items() if count < max(_MARGINS) - 1)
        return max(top.values()) > fewer + _LEAST_GAIN


def choose_sizes(channels: MassChannels, method: Method, model: Model) -> list[tuple[EndGroup, int]]:
    """Return the classes and numbers of carbons to look at: as asked, or as the spectrum allows."""
    classes = [END_GROUPS[name] for name in method.chain]
    if method.formula is not None:
        return method.sizes_of_formula()
    if classes == [ALKANE]:
        carbons = method.carbons if method.carbons is not None else plausible_carbons(channels)
        return [(ALKANE, number) for number in carbons]
    return likely_sizes(channels, classes, method.carbons, model)


def screen_candidates(
    channels: MassChannels, sizes: Sequence[tuple[EndGroup, int]], method: Method, model: Model
) -> list[SizeGroup]:
    """Screen every chain of the given classes and carbons and of the method's methyls.

    Returns
    -------
    one group a class and number of carbons; those that fell behind hold few methyls only.
    """
    groups = [
        SizeGroup(end_group, carbons)
        for end_group, carbons in sizes
        if _has_chains(end_group, carbons, method)
    ]
    if not groups:
        raise SettingsError(
            "no chain has the carbons and methyls asked for", remedy="ask for more carbons or fewer methyls"
        )
    heaviest = heaviest_mass(sizes, channels)
    few = [k for k in method.methyls if k < min(_MARGINS)] or list(method.methyls)
    _extend(groups, few, channels, heaviest, model)
    if _is_hopeless(groups, channels, heaviest):
        return [group for group in groups if group.screened]
    for methyls in sorted(set(method.methyls) - set(few)):
        margin = _MARGINS[min(methyls, max(_MARGINS))]
        hopeful = [group for group in _leading(groups, margin) if group.gains_from_methyls(methyls)]
        _extend(_affordable(hopeful, methyls), [methyls], channels, heaviest, model)
    if method.methyls[0] <= 1 and method.methyls[-1] >= _ISOPRENOID_FROM:
        for group in _leading(groups, _MARGINS[max(_MARGINS)]):
            if group.end_group == ALKANE and group.gains_from_methyls(method.methyls[-1]):
                _add_isoprenoids(group, method, channels, heaviest, model)
    return [group for group in groups if group.screened]


def _is_hopeless(groups: Sequence[SizeGroup], channels: MassChannels, heaviest: int) -> bool:
    """Tell whether no chain comes within reach of a compound without any model."""
    nothing = score_no_chain(channels, heaviest).total
    return max(group.standing for group in groups) < nothing - _HOPELESS


def _has_chains(end_group: EndGroup, carbons: int, method: Method) -> bool:
    return any(count_chains(carbons, methyls, end_group) for methyls in method.methyls)


def left_out(groups: Iterable[SizeGroup]) -> tuple[str, ...]:
    """Say which chains were not looked at for want of time, so that the user can ask for them."""
    by_methyls: dict[int, list[int]] = {}
    for group in groups:
        for methyls in group.unaffordable:
            by_methyls.setdefault(methyls, []).append(group.carbons)
    return tuple(
        f"chains of {min(sizes)} to {max(sizes)} carbons with {methyls} methyls were too many to try, as the "
        f"spectrum leaves the size open; narrow it with --carbons"
        for methyls, sizes in by_methyls.items()
    )


def _affordable(groups: Sequence[SizeGroup], methyls: int) -> list[SizeGroup]:
    """Keep the likeliest sizes that together stay within the number of chains one look may try."""
    kept: list[SizeGroup] = []
    total = 0
    for group in sorted(groups, key=lambda one: -one.standing):
        total += count_chains(group.carbons, methyls, group.end_group)
        if total > (_MOST_CHAINS if kept else _MOST_OF_ONE_SIZE):
            group.unaffordable.append(methyls)
        else:
            kept.append(group)
    return kept


def heaviest_mass(sizes: Iterable[tuple[EndGroup, int]], channels: MassChannels) -> int:
    """Return the last mass number that has to be explained: M + 3 of the heaviest chain, or the last peak."""
    molecules = [14 * carbons + 5 + end_group.added.nominal_mass for end_group, carbons in sizes]
    return max(*molecules, channels.heaviest)


def _leading(groups: list[SizeGroup], margin: float) -> list[SizeGroup]:
    best = max(group.standing for group in groups)
    return [group for group in groups if group.standing >= best - margin]


def _extend(
    groups: Iterable[SizeGroup], methyls: Iterable[int], channels: MassChannels, heaviest: int, model: Model
) -> None:
    for group in groups:
        for count in methyls:
            if count_chains(group.carbons, count, group.end_group):
                batch = model.of(group.end_group).predict_all(group.carbons - count, count)
                _add(group, batch, channels, heaviest, model)


def _add_isoprenoids(
    group: SizeGroup, method: Method, channels: MassChannels, heaviest: int, model: Model
) -> None:
    for backbone, positions in _isoprenoid_rows(group.carbons, method.methyls[-1]):
        batch = model.of(ALKANE).predict(backbone, positions)
        _add(group, batch, channels, heaviest, model, is_family=True)


def _isoprenoid_rows(carbons: int, most_methyls: int) -> Iterator[tuple[int, NDArray[np.int16]]]:
    """Yield the isoprenoids with more methyls than are enumerated in full, by backbone."""
    by_backbone: dict[int, list[tuple[int, ...]]] = {}
    for chain in regular_isoprenoids(carbons):
        if len(chain.methyls) > most_methyls:
            by_backbone.setdefault(chain.backbone, []).append(chain.methyls)
    for backbone, rows in by_backbone.items():
        yield backbone, np.array(rows, dtype=np.int16)


def _add(
    group: SizeGroup,
    batch: SeriesBatch,
    channels: MassChannels,
    heaviest: int,
    model: Model,
    is_family: bool = False,
) -> None:
    """Screen a batch and let its best chains say where the whole size group stands."""
    errors, channels = model.of(group.end_group).errors, channels.for_class(group.end_group)
    view = channels.at(batch.masses)
    scores = screen_batch(view, batch, errors)
    group.screened.append(Screened(batch, scores, is_family))
    leading = batch.take(np.argsort(scores)[::-1][:_FITTED_FOR_STANDING])
    fit = fit_batch(view, leading, errors)
    top = int(fit.log_likelihood.argmax())
    if group.remainder is None:  # isomers share it but for the instrument's effects; it is scored again later
        group.remainder = score_remainder(channels, batch, fit.effects[top], heaviest, errors)
    standing = float(fit.log_likelihood[top]) + group.remainder.total
    if standing > group.standing:
        group.standing = standing
        group.best = leading.take(np.array([top]))
