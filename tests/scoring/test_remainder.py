"""Mass numbers that no ion of a chain stands on."""

from __future__ import annotations

import numpy as np
import pytest

from branchpos.cleaning.nominal import to_channels
from branchpos.ion_series import SeriesBatch
from branchpos.mass_channels import MassChannels
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.parameters import fitted_parameters
from branchpos.scoring.error_model import fitted_errors
from branchpos.scoring.likelihood import fit_batch
from branchpos.scoring.remainder import (
    isotopes_below,
    recorded_masses,
    score_no_chain,
    score_remainder,
    unexplained,
)
from branchpos.spectrum import Spectrum

ERRORS = fitted_errors()
BATCH = predict_alkanes(fitted_parameters(), 20, np.empty((1, 0), dtype=np.int16))


def spectrum_of(batch: SeriesBatch, extra: dict[int, float] | None = None) -> MassChannels:
    """Return the predicted spectrum, side ions included, with further peaks."""
    peaks = dict(zip(batch.masses.tolist(), batch.abundance[0].astype(float).tolist(), strict=True))
    peaks |= dict(zip(batch.side_masses.tolist(), batch.side_abundance.tolist(), strict=True))
    top = max(peaks.values())
    peaks = {mass: height / top for mass, height in peaks.items() if height / top > 1e-3} | (extra or {})
    return to_channels(Spectrum.from_peaks(list(peaks), list(peaks.values()), first_mass=40))[0]


def remainder_of(channels: MassChannels) -> float:
    fit = fit_batch(channels.at(BATCH.masses), BATCH, ERRORS)
    return score_remainder(channels, BATCH, fit.effects[0], 290, ERRORS).total


def test_stray_peaks_cost_more_the_higher_and_the_more_they_are() -> None:
    clean = remainder_of(spectrum_of(BATCH))
    low = remainder_of(spectrum_of(BATCH, {135: 0.01}))
    high = remainder_of(spectrum_of(BATCH, {135: 0.3}))
    many = remainder_of(spectrum_of(BATCH, dict.fromkeys(range(132, 139), 0.3)))
    assert clean > low > high > many


def test_a_chain_wins_on_its_own_spectrum_and_loses_on_a_crowded_one() -> None:
    """The rival is a compound that may show a peak of any height anywhere."""
    for extra, chain_wins in (({}, True), ({m: 0.4 for m in range(101, 280, 3) if m % 14 > 2}, False)):
        channels = spectrum_of(BATCH, dict(extra))
        fit = fit_batch(channels.at(BATCH.masses), BATCH, ERRORS)
        chain = float(fit.log_likelihood[0]) + remainder_of(channels)
        assert (chain > score_no_chain(channels, 290).total) is chain_wins


def test_bleed_speaks_for_no_hypothesis() -> None:
    # 73, 207 and 281 are siloxane ions of column bleed (common practice); without 207 they are evidence.
    bled = score_no_chain(spectrum_of(BATCH, {73: 0.05, 207: 0.05, 281: 0.03}), 290)
    assert not {73, 207, 281} & set(bled.masses.tolist())
    assert {73, 207, 281} <= set(score_no_chain(spectrum_of(BATCH, {73: 0.05}), 290).masses.tolist())


def test_carbon_13_of_the_peak_below_is_no_stray_peak() -> None:
    """12 carbons carry 13 % (12 x 1.08 %, IUPAC) into the mass above."""
    channels = spectrum_of(BATCH, {169: 1.0, 170: 0.13})
    assert isotopes_below(channels, np.array([170])) == pytest.approx([0.13], rel=0.05)
    assert unexplained(channels, np.array([170])) == pytest.approx([0.0])


def test_only_recorded_masses_count() -> None:
    peaks = Spectrum.from_peaks([85, 99], [100, 50], first_mass=80, last_mass=150)
    channels, _ = to_channels(peaks)
    assert recorded_masses(channels, 290).tolist() == list(range(80, 151))
