"""Column bleed must not pass for ions of a chain."""

from __future__ import annotations

import numpy as np

from branchpos.cleaning.bleed import BLEED_MASSES, shows_bleed
from branchpos.cleaning.nominal import to_channels
from branchpos.spectrum import Spectrum

_CHAIN = {14 * n + 1: float(np.exp(-0.25 * n)) for n in range(3, 28)}


def spectrum_with(extra: dict[int, float]) -> Spectrum:
    peaks = _CHAIN | extra
    return Spectrum.from_peaks(list(peaks), list(peaks.values()))


def test_bleed_ions_on_the_series_say_nothing() -> None:
    """m/z 207 and 281 are the siloxane ions of every methyl silicone column (common practice)."""
    channels, doubts = to_channels(spectrum_with({207: 0.2, 208: 0.04, 209: 0.02, 281: 0.1}))
    inside = [mass for mass in BLEED_MASSES if mass <= channels.heaviest]
    assert not channels.at(np.array(inside)).recorded.any()
    assert channels.at(np.array([267, 280, 309])).recorded.all()
    assert any("bleed" in doubt for doubt in doubts)


def test_a_clean_chain_shows_none() -> None:
    channels, doubts = to_channels(spectrum_with({}))
    assert channels.at(np.array(BLEED_MASSES)).recorded.all()
    assert doubts == ()


def test_noise_everywhere_is_no_bleed() -> None:
    assert not shows_bleed(np.full(400, 0.05))


def test_a_spectrum_that_ends_below_the_marker_is_no_bleed() -> None:
    assert not shows_bleed(np.ones(150))
