"""Which chains get a full look: none that matters may be lost on the way."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from branchpos.chain import Chain
from branchpos.cleaning.nominal import to_channels
from branchpos.end_group import ALKANE
from branchpos.enumerating import count_alkanes
from branchpos.mass_channels import MassChannels
from branchpos.reading import read_spectrum
from branchpos.spectrum import Spectrum
from branchpos.workflow.candidates import (
    SizeGroup,
    choose_sizes,
    heaviest_mass,
    left_out,
    screen_candidates,
)
from branchpos.workflow.method import Method
from branchpos.workflow.model import Model, shipped_model
from branchpos.workflow.reference_spectra import read_known_spectra


@pytest.fixture(scope="module")
def model() -> Model:
    return shipped_model()


def observed(shared: Path, accession: str) -> MassChannels:
    return to_channels(read_spectrum(shared / "spectra" / "chains" / f"{accession}.txt"))[0]


@pytest.fixture(scope="module")
def dimethyl(shared: Path) -> MassChannels:
    return observed(shared, "MSBNK-MSSJ-MSJ00076")


def sizes_of(channels: MassChannels, model: Model, **settings: object) -> list[int]:
    return [carbons for _, carbons in choose_sizes(channels, Method(("alkane",), **settings), model)]


def screened(channels: MassChannels, model: Model, **settings: object) -> list[SizeGroup]:
    method = Method(("alkane",), **settings)
    return screen_candidates(channels, choose_sizes(channels, method, model), method, model)


def test_every_known_size_is_among_those_looked_at(shared: Path, model: Model) -> None:
    """Over all real records of alkanes that keep enough peaks."""
    for one in read_known_spectra(shared / "spectra"):
        if not one.is_sparse:
            assert one.chain.carbons in sizes_of(to_channels(one.spectrum)[0], model), one.accession


def test_a_molecular_ion_settles_the_size(dimethyl: MassChannels, model: Model) -> None:
    """m/z 380 of MSBNK-MSSJ-MSJ00076 stands alone at the end of the series: C27, or one more."""
    assert sizes_of(dimethyl, model) == [27, 28]


def test_without_one_the_molecule_may_be_larger(model: Model) -> None:
    peaks = {14 * n + 1: float(np.exp(-0.2 * n)) for n in range(3, 20)}
    channels, _ = to_channels(Spectrum.from_peaks(list(peaks), list(peaks.values()), last_mass=600))
    sizes = sizes_of(channels, model)
    assert max(sizes) >= 30


def test_asked_sizes_are_taken_as_they_are(dimethyl: MassChannels, model: Model) -> None:
    assert sizes_of(dimethyl, model, carbons=range(30, 33)) == [30, 31, 32]
    assert sizes_of(dimethyl, model, formula="C27H56") == [27]


def test_all_chains_of_a_named_size_are_screened(dimethyl: MassChannels, model: Model) -> None:
    """Counts against the closed form."""
    (group,) = screened(dimethyl, model, carbons=range(27, 28), methyls=range(4))
    counts = {one.batch.positions.shape[1]: len(one.batch) for one in group.screened}
    assert counts == {methyls: count_alkanes(27, methyls) for methyls in range(4)}
    assert all(one.scores.shape == (len(one.batch),) for one in group.screened)


def test_the_best_chain_of_the_right_size_leads(dimethyl: MassChannels, model: Model) -> None:
    groups = screened(dimethyl, model)
    leader = max(groups, key=lambda group: group.standing)
    assert (leader.end_group, leader.carbons) == (ALKANE, 27)
    assert leader.best is not None and leader.best.chain(0) == Chain(25, (5, 11))


def test_large_isoprenoids_are_added_as_a_family(shared: Path, model: Model) -> None:
    """2,6,10,14,18-Pentamethylicosane has more methyls than are enumerated in full."""
    groups = screened(observed(shared, "MSBNK-UOEH-UO000024"), model)
    families = [one for group in groups for one in group.screened if one.is_family]
    chains = [one.batch.chain(row) for one in families for row in range(len(one.batch))]
    assert Chain(20, (2, 6, 10, 14, 18)) in chains


def test_what_was_too_many_to_try_is_said(model: Model) -> None:
    groups = [SizeGroup(ALKANE, carbons, unaffordable=[4]) for carbons in (38, 39, 40)]
    (line,) = left_out(groups)
    assert "38 to 40 carbons with 4 methyls" in line and "--carbons" in line
    assert left_out([SizeGroup(ALKANE, 30)]) == ()


def test_masses_are_judged_up_to_the_largest_molecule() -> None:
    """M + 3 of the largest chain, C28H58 being 394, or the last peak."""
    light, heavy = (to_channels(Spectrum.from_peaks([57, 71, last], [100, 60, 5]))[0] for last in (85, 430))
    assert heaviest_mass([(ALKANE, 27), (ALKANE, 28)], light) == 397
    assert heaviest_mass([(ALKANE, 27), (ALKANE, 28)], heavy) == 430
