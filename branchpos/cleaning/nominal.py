"""Peaks to whole mass numbers, with doubts carried along."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from branchpos.cleaning.bleed import BLEED_MASSES, shows_bleed
from branchpos.cleaning.mass_axis import align_masses, axis_is_steady
from branchpos.mass_channels import MassChannels
from branchpos.masses import electron_mass, isotopes
from branchpos.spectrum import Spectrum

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

_MASS_DEFECT = 6e-4
"""Taken off each m/z before rounding; midway between hydrocarbons (1.1e-3) and siloxanes (2e-4)."""
_FORMULA_TOLERANCE = 0.015
"""Largest error [Th] of an accurate mass; C6H13 and C5H9O lie 0.036 apart."""
_ENOUGH_PEAKS, _SLIPPED_SHARE, _HIGHEST_THRESHOLD = 20, 0.1, 0.5
_FEWEST_PEAKS = 15
"""A list shorter than this was picked by hand or cut hard; what it leaves out says little."""
_OMISSION_SHORT, _OMISSION = 0.15, 0.002
_LOWEST_HYDROGEN_DEFICIT = 10
"""Hydrogens below saturation that a fragment of a chain may lack."""


def to_channels(spectrum: Spectrum) -> tuple[MassChannels, tuple[str, ...]]:
    """Put a spectrum on whole mass numbers.

    Returns
    -------
    the channels, and what had to be doubted on the way, in words.
    """
    relative = spectrum.relative
    notes = []
    if spectrum.accurate or axis_is_steady(spectrum.mz):
        masses = whole_masses(spectrum.mz)
    else:
        masses = align_masses(spectrum.mz, relative)
        notes.append("the mass axis wanders by up to a unit: mass numbers were inferred, trust them less")
    size = int(masses[-1]) + 1
    foreign_peak = _is_foreign(spectrum, masses)
    if foreign_peak.any():
        listed = ", ".join(f"{mz:.3f}" for mz in spectrum.mz[foreign_peak][:5])
        notes.append(
            f"no hydrocarbon ion by accurate mass: m/z {listed}{' ...' if foreign_peak.sum() > 5 else ''}"
        )
    short = spectrum.mz.size < _FEWEST_PEAKS
    if short:
        notes.append(f"only {spectrum.mz.size} peaks: an absent peak is given little weight")
    own = ~foreign_peak
    intensity = np.asarray(np.bincount(masses[own], weights=relative[own], minlength=size), dtype=float)
    contaminated = np.zeros(size, dtype=bool)
    if not spectrum.accurate and shows_bleed(intensity):
        contaminated[[mass for mass in BLEED_MASSES if mass < size]] = True
        notes.append("column bleed (m/z 207): its mass numbers, 281 and 295 among them, are left out")
    channels = MassChannels(
        intensity=intensity,
        doubtful=np.bincount(masses, weights=spectrum.doubtful & own, minlength=size) > 0,
        contaminated=contaminated,
        foreign=np.asarray(
            np.bincount(masses[foreign_peak], weights=relative[foreign_peak], minlength=size), dtype=float
        ),
        threshold=working_threshold(spectrum),
        first=int(np.ceil(spectrum.first_mass - 0.5)),
        last=spectrum.last_mass,
        omission=_OMISSION_SHORT if short else _OMISSION,
    )
    return channels, tuple(notes)


def working_threshold(spectrum: Spectrum) -> float:
    """Return the relative height from which a peak would surely have been listed.

    The smallest listed peak stands lower where decimals slipped; the lowest tenth of the peaks is left out,
    so that a few slipped ones do not make every absent peak look like evidence.
    """
    relative = spectrum.relative
    if relative.size < _ENOUGH_PEAKS:
        return min(spectrum.relative_threshold, _HIGHEST_THRESHOLD)
    lowest = float(np.quantile(relative, _SLIPPED_SHARE))
    return min(max(spectrum.relative_threshold, lowest), _HIGHEST_THRESHOLD)


def whole_masses(mz: FloatArray) -> IntArray:
    """Return the mass number of each peak, mass defects allowed for.

    >>> whole_masses(np.array([85.1012, 207.0329, 507.5863])).tolist()
    [85, 207, 507]
    """
    if np.allclose(mz, np.round(mz)):
        return np.round(mz).astype(np.intp)
    return np.round(mz * (1 - _MASS_DEFECT)).astype(np.intp)


def _is_foreign(spectrum: Spectrum, masses: IntArray) -> NDArray[np.bool_]:
    """Tell which peaks of an accurate spectrum lie away from every hydrocarbon ion of their mass number."""
    if not spectrum.accurate:
        return np.zeros(masses.size, dtype=bool)
    return np.array(
        [
            min(abs(mz - ion) for ion in hydrocarbon_ions(int(mass))) > _FORMULA_TOLERANCE
            for mz, mass in zip(spectrum.mz, masses, strict=True)
        ]
    )


def hydrocarbon_ions(mass: int) -> list[float]:
    """Return the m/z of the hydrocarbon ions of one mass number, with and without one 13C.

    >>> [round(mz, 4) for mz in hydrocarbon_ions(85)]
    [85.1012, 85.0967]
    """
    hydrogen, carbon_13 = isotopes("H")[0][1], isotopes("C")[1][1]
    found = []
    for light in range(2):
        for carbons in range(1, (mass - light) // 12 + 1):
            hydrogens = mass - light - 12 * carbons
            if 2 * carbons + 2 >= hydrogens >= max(0, 2 * carbons + 2 - _LOWEST_HYDROGEN_DEFICIT):
                found.append(12 * carbons + light * (carbon_13 - 12) + hydrogen * hydrogens - electron_mass())
    return found or [float(mass)]
