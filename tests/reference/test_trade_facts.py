"""What every practitioner knows of branched alkanes, against the predictions; each with its source."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from branchpos.chain import Chain
from branchpos.masses import Formula, isotope_pattern
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.parameters import fitted_parameters


@cache
def spectrum(chain: Chain) -> dict[int, float]:
    """Return the predicted ions of a chain, m/z to abundance relative to the base peak."""
    rows = np.array([chain.methyls], dtype=np.int16).reshape(1, -1)
    batch = predict_alkanes(fitted_parameters(), chain.backbone, rows)
    levels = batch.abundance[0] / batch.abundance[0].max()
    return dict(zip(batch.masses.tolist(), levels.tolist(), strict=True))


def odd(chain: Chain, carbons: int) -> float:
    return spectrum(chain)[14 * carbons + 1]


def even(chain: Chain, carbons: int) -> float:
    return spectrum(chain)[14 * carbons]


class TestMethylundecaneAgainstDodecane:
    """Source: common practice. 4-Methylundecane: m/z 71 and 127 up, 57 down, molecular ion all but gone."""

    branched, straight = Chain(11, (4,)), Chain(12)

    @pytest.mark.parametrize("mass", [71, 127])
    def test_ions_beside_the_branch_rise(self, mass: int) -> None:
        assert spectrum(self.branched)[mass] > 1.3 * spectrum(self.straight)[mass]

    def test_the_butyl_ion_sinks(self) -> None:
        assert spectrum(self.branched)[57] < 0.7 * spectrum(self.straight)[57]

    def test_the_molecular_ion_is_very_small(self) -> None:
        assert spectrum(self.branched)[170] < 0.5 * spectrum(self.straight)[170]
        assert spectrum(self.branched)[170] < 0.03


@st.composite
def monomethyls(draw: st.DrawFn) -> Chain:
    backbone = draw(st.integers(16, 38))
    return Chain(backbone, (draw(st.integers(6, backbone - 5)),))


@given(monomethyls())
@settings(max_examples=60, deadline=None)
def test_complementary_pair(chain: Chain) -> None:
    """The two secondary ions of one branch hold N + 2 carbons together, both enhanced (common practice).

    Each stands above the mean of the sizes one smaller and one larger, odd and even mass together, unless
    the partner itself is that neighbour.
    """
    (place,) = chain.methyls
    pair = (place + 1, chain.carbons - place + 1)
    assert sum(pair) == chain.carbons + 2
    for size in pair:
        neighbours = [near for near in (size - 1, size + 1) if near not in pair]
        level = odd(chain, size) + even(chain, size)
        around = np.mean([odd(chain, near) + even(chain, near) for near in neighbours])
        assert level > 1.3 * around


class TestDoubletsOfTheDimethylpentacosane:
    """Source: MassBank MSBNK-MSSJ-MSJ00076 (CC BY; Mori and Akasaka, Tetrahedron 71 (2015) 4102).

    Abundances of even and odd mass [% of the base peak], read off the record. The record took part in the
    fit, so that this tests whether the model can say what was seen, not whether it foresaw it; the test
    that leaves the compound out stands in ``tests/workflow/test_locate.py``.
    """

    truth, twin = Chain(25, (5, 11)), Chain(25, (5, 14))
    measured = ((16, 12, 9), (13, 8, 16), (23, 3, 10), (6, 25, 68))

    @pytest.mark.parametrize(("carbons", "even_seen", "odd_seen"), measured)
    def test_ratios_within_a_factor_of_two(self, carbons: int, even_seen: float, odd_seen: float) -> None:
        ratio = even(self.truth, carbons) / odd(self.truth, carbons)
        assert ratio == pytest.approx(even_seen / odd_seen, rel=1.0, abs=0)
        assert ratio > 0.5 * even_seen / odd_seen

    def test_one_methyl_in_the_ion_even_is_about_odd_or_more(self) -> None:
        """Source: the record; from memory also Nelson and Sukkestad, Biochemistry 9 (1970) 4601."""
        assert even(self.truth, 16) > 0.8 * odd(self.truth, 16)

    @pytest.mark.parametrize("carbons", [13, 23])
    def test_two_methyls_in_the_ion_suppress_even(self, carbons: int) -> None:
        assert even(self.truth, carbons) < 0.8 * odd(self.truth, carbons)

    def test_the_trap(self) -> None:
        """5,11 and 5,14 give the same four sizes, 6, 13, 16 and 23: worked out by hand from the cleavages.

        Only the doublets part them: the methyl inside the ion of C13 or of C16.
        """
        for chain in (self.truth, self.twin):
            first, second = chain.methyls
            sizes = {first + 1, chain.carbons - first + 1, second + 2, chain.carbons - second}
            assert sizes == {6, 13, 16, 23}
        for carbons, more in ((16, self.truth), (13, self.twin)):
            less = self.twin if more is self.truth else self.truth
            assert even(more, carbons) / odd(more, carbons) > 1.5 * even(less, carbons) / odd(less, carbons)


def against_series(chain: Chain, lost: int) -> float:
    """Return the odd-mass ion after the loss of so many carbons, relative to the two sizes next to C4."""
    around = (odd(chain, chain.carbons - 5) + odd(chain, chain.carbons - 6)) / 2
    return odd(chain, chain.carbons - lost) / around


class TestEnds:
    """Source: from memory of the literature. No long 2- or 3-methylalkane took part in the fit.

    Ions are compared with the series around them in the same spectrum, as a chemist reads them.
    """

    @pytest.mark.parametrize("carbons", [20, 27, 34])
    @pytest.mark.parametrize(
        ("place", "lost", "gain"),
        [(2, 3, 1.3), (2, 1, 5.0), (3, 2, 5.0), (3, 4, 1.3)],
        ids=["2-methyl M-43", "2-methyl M-15", "3-methyl M-29", "3-methyl M-57"],
    )
    def test_ions_that_mark_the_end_rise(self, carbons: int, place: int, lost: int, gain: float) -> None:
        branched, straight = Chain(carbons - 1, (place,)), Chain(carbons)
        assert against_series(branched, lost) > gain * against_series(straight, lost)

    def test_loss_of_methyl_grows_with_each_branch(self) -> None:
        chains = [Chain(27), Chain(26, (11,)), Chain(25, (7, 13)), Chain(24, (5, 9, 13))]
        levels = [odd(chain, 26) for chain in chains]
        assert levels == sorted(levels)


def test_carbon_13_of_hexadecyl() -> None:
    """Source: natural abundances of the IUPAC; C16H33 at 225 carries 17 % into 226."""
    assert isotope_pattern(Formula(16, 33), 2)[1] == pytest.approx(0.17, abs=0.01)


def test_hexyl_and_its_oxygen_double() -> None:
    """Source: AME2020 masses; 85.1012 is C6H13+, C5H9O+ lies at 85.0648."""
    assert Formula(6, 13).cation_mz == pytest.approx(85.1012, abs=5e-5)
    assert Formula(5, 9, o=1).cation_mz == pytest.approx(85.0648, abs=5e-5)
