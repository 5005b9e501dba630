"""Peaks to whole mass numbers: mass defects, foreign peaks, doubts carried along."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from molmass import Formula as ReferenceFormula

from branchpos.cleaning.nominal import hydrocarbon_ions, to_channels, whole_masses
from branchpos.spectrum import Spectrum


def reference_mz(formula: str) -> float:
    """Return the m/z of a cation from a reference library of masses (molmass); the electron is taken off."""
    return float(ReferenceFormula(formula).monoisotopic_mass) - 0.00054858


def alkyl_peaks(sizes: range) -> np.ndarray:
    return np.array([reference_mz(f"C{n}H{2 * n + 1}") for n in sizes])


def test_accurate_alkyl_ions_fall_on_their_mass_numbers() -> None:
    sizes = range(3, 41)
    assert whole_masses(alkyl_peaks(sizes)).tolist() == [14 * n + 1 for n in sizes]


@given(st.integers(1, 60), st.integers(0, 12), st.floats(-0.05, 0.05))
def test_any_hydrocarbon_ion_falls_on_its_mass_number(carbons: int, deficit: int, error: float) -> None:
    """Rounding at 0.5 would fail from C32 on, where the mass defect passes half a unit."""
    hydrogens = 2 * carbons + 2 - deficit
    if hydrogens < 0:
        return
    mz = 12 * carbons + 1.00782503 * hydrogens - 0.00054858 + error
    assert whole_masses(np.array([mz])).tolist() == [12 * carbons + hydrogens]


def test_unit_masses_stay_as_they_are_however_heavy() -> None:
    mz = np.arange(40.0, 900.0)
    assert np.array_equal(whole_masses(mz), mz)


def test_hydrocarbon_ions_agree_with_a_reference_library() -> None:
    by_formula = {round(reference_mz(name), 3) for name in ("C6H13", "C5[13C]H12")}
    assert by_formula <= {round(mz, 3) for mz in hydrocarbon_ions(85)}


def test_an_oxygen_ion_is_foreign_where_masses_are_accurate() -> None:
    """85.1012 is C6H13+, 85.0648 is C5H9O+: 0.036 apart (masses from molmass)."""
    oxygen = reference_mz("C5H9O")
    mz = [57.0699, reference_mz("C5H11"), oxygen, reference_mz("C6H13")]
    channels, doubts = to_channels(Spectrum.from_peaks(mz, [100, 60, 30, 40]))
    assert channels.intensity[85] == pytest.approx(0.4)
    assert channels.foreign[85] == pytest.approx(0.3)
    assert any(f"{oxygen:.3f}" in doubt for doubt in doubts)


def test_unit_masses_have_no_foreign_peaks() -> None:
    channels, _ = to_channels(Spectrum.from_peaks([43, 57, 71, 85, 87], [80, 100, 60, 40, 5]))
    assert not channels.foreign.any()


def test_peaks_of_one_mass_number_are_summed() -> None:
    channels, _ = to_channels(Spectrum.from_peaks([57.0699, 85.1012, 86.0968, 86.1046], [100, 40, 2, 3]))
    assert channels.intensity[86] == pytest.approx(0.05)


def test_a_short_list_makes_absence_weak_and_says_so() -> None:
    few, doubts = to_channels(Spectrum.from_peaks(np.arange(43, 127, 14), np.arange(60, 0, -10)))
    many, silent = to_channels(Spectrum.from_peaks(np.arange(40, 80), np.arange(80, 40, -1)))
    assert few.omission > 10 * many.omission
    assert any("6 peaks" in doubt for doubt in doubts)
    assert silent == ()


def test_doubtful_peaks_stay_doubtful_on_their_mass_number() -> None:
    spectrum = Spectrum.from_peaks([43, 57, 71], [80, 100, 6], doubtful=[False, False, True])
    channels, _ = to_channels(spectrum)
    assert np.flatnonzero(channels.doubtful).tolist() == [71]


def test_threshold_and_range_are_carried_along() -> None:
    spectrum = Spectrum.from_peaks([57, 71], [200, 100], threshold=2.0, first_mass=45.0, last_mass=300.0)
    channels, _ = to_channels(spectrum)
    assert (channels.threshold, channels.first, channels.last) == (0.01, 45, 300.0)
    view = channels.at(np.array([44, 45, 300, 301, 5000]))
    assert view.recorded.tolist() == [False, True, True, False, False]
    assert not view.seen.any()


@given(st.floats(1e-6, 1e9))
def test_the_unit_of_intensity_does_not_matter(unit: float) -> None:
    mz, heights = [43, 57, 71, 85], np.array([80.0, 100.0, 60.0, 3.0])
    plain, _ = to_channels(Spectrum.from_peaks(mz, heights))
    scaled, _ = to_channels(Spectrum.from_peaks(mz, heights * unit))
    np.testing.assert_allclose(scaled.intensity, plain.intensity, rtol=1e-12)
    assert scaled.threshold == pytest.approx(plain.threshold)
