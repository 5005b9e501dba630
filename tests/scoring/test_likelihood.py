"""What the likelihood does with faults: errors of single peaks, silence, doubt, and the unit of intensity."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from branchpos.chain import Chain
from branchpos.cleaning.nominal import to_channels
from branchpos.enumerating import alkane_positions
from branchpos.ion_series import SeriesBatch
from branchpos.mass_channels import ChannelView, MassChannels
from branchpos.predicting.alkanes import predict_alkanes
from branchpos.predicting.parameters import fitted_parameters
from branchpos.reading import read_spectrum
from branchpos.scoring.error_model import SEEN_FLOOR, fitted_errors
from branchpos.scoring.likelihood import fit_batch, linearise
from branchpos.scoring.screening import screen_batch
from branchpos.spectrum import Spectrum
from branchpos.workflow.locate import locate_branches

ERRORS = fitted_errors()
RECORDS = ("MSJ00076", "MSJ00078")
TRUTH = Chain(25, (5, 11))


def record(shared: Path, accession: str) -> Spectrum:
    return read_spectrum(shared / "spectra" / "chains" / f"MSBNK-MSSJ-{accession}.txt")


@pytest.fixture(scope="module", params=RECORDS)
def channels(request: pytest.FixtureRequest, shared: Path) -> MassChannels:
    return to_channels(record(shared, request.param))[0]


@pytest.fixture(scope="module")
def dimethyls() -> SeriesBatch:
    return predict_alkanes(fitted_parameters(), 25, alkane_positions(25, 2))


def ideal(batch: SeriesBatch, row: int = 0) -> ChannelView:
    """Return the observation that the prediction describes to the letter."""
    intensity = batch.abundance[row].astype(float) / batch.abundance[row].max()
    return ChannelView(
        intensity=intensity,
        seen=intensity > 0,
        doubtful=np.zeros(intensity.size, dtype=bool),
        recorded=np.ones(intensity.size, dtype=bool),
        threshold=1e-6,
        omission=0.002,
    )


def changed(view: ChannelView, column: int, **values: float | bool) -> ChannelView:
    """Return the view with one channel altered."""
    arrays = {name: getattr(view, name).copy() for name in ("intensity", "seen", "doubtful", "recorded")}
    for name, value in values.items():
        arrays[name][column] = value
    return replace(view, **arrays)


def test_a_perfect_observation_fits_best_and_without_effects(dimethyls: SeriesBatch) -> None:
    truth = int(np.flatnonzero((dimethyls.positions == (5, 11)).all(axis=1))[0])
    view = ideal(dimethyls, truth)
    fit = fit_batch(view, dimethyls, ERRORS)
    assert int(fit.log_likelihood.argmax()) == truth
    np.testing.assert_allclose(fit.effects[truth, 1:], 0.0, atol=0.05)
    np.testing.assert_allclose(fit.expected[truth], view.intensity, rtol=0.1, atol=1e-5)


@pytest.mark.parametrize("tilt", [-0.8, 0.8])
def test_a_planted_tilt_is_found(dimethyls: SeriesBatch, tilt: float) -> None:
    row = int(np.flatnonzero((dimethyls.positions == (5, 11)).all(axis=1))[0])
    view = ideal(dimethyls, row)
    tilted = view.intensity * np.exp(tilt * (dimethyls.carbons - 10) / 10)
    fit = fit_batch(replace(view, intensity=tilted / tilted.max()), dimethyls.take(np.array([row])), ERRORS)
    assert fit.effects[0, 1] == pytest.approx(tilt, abs=0.1)


@given(st.floats(1e-3, 1e3))
@settings(max_examples=20, deadline=None)
def test_the_unit_of_intensity_changes_nothing(unit: float) -> None:
    """The scale is adjusted without a prior: twice the intensity and threshold is the same evidence."""
    batch = predict_alkanes(fitted_parameters(), 20, alkane_positions(20, 1))
    view = ideal(batch, 4)
    scaled = replace(view, intensity=view.intensity * unit, threshold=view.threshold * unit)
    one, other = fit_batch(view, batch, ERRORS), fit_batch(scaled, batch, ERRORS)
    np.testing.assert_allclose(other.log_likelihood, one.log_likelihood, rtol=1e-7, atol=1e-6)


def test_intensities_in_counts_or_percent_give_one_verdict(shared: Path) -> None:
    spectrum = record(shared, "MSJ00078")
    counts = replace(spectrum, intensity=spectrum.intensity * 4321.0, threshold=spectrum.threshold * 4321.0)
    one, other = locate_branches(spectrum), locate_branches(counts)
    assert other.credible_set == one.credible_set
    assert other.hypotheses[0].posterior == pytest.approx(one.hypotheses[0].posterior, abs=1e-6)


def test_no_seen_ion_costs_more_than_the_floor(channels: MassChannels, dimethyls: SeriesBatch) -> None:
    view = channels.at(dimethyls.masses)
    fit = fit_batch(view, dimethyls, ERRORS)
    assert fit.by_ion[:, view.seen & view.recorded].min() >= SEEN_FLOOR


def test_an_absent_strong_ion_is_charged(dimethyls: SeriesBatch) -> None:
    truth = dimethyls.take(np.flatnonzero((dimethyls.positions == (5, 11)).all(axis=1)))
    view = replace(ideal(truth), threshold=1e-3)
    column = int(np.flatnonzero(truth.masses == 224)[0])
    missing = changed(view, column, intensity=0.0, seen=False)
    whole, without = fit_batch(view, truth, ERRORS), fit_batch(missing, truth, ERRORS)
    assert without.by_ion[0, column] < whole.by_ion[0, column] - 2
    assert without.log_likelihood[0] < whole.log_likelihood[0] - 2


def test_an_ion_expected_far_below_the_threshold_is_free(dimethyls: SeriesBatch) -> None:
    """Silence where silence is expected costs next to nothing: a censored value, not a zero."""
    truth = dimethyls.take(np.flatnonzero((dimethyls.positions == (5, 11)).all(axis=1)))
    view = ideal(truth)
    cut = replace(view, threshold=0.05, seen=view.intensity >= 0.05)
    fit = fit_batch(replace(cut, intensity=np.where(cut.seen, cut.intensity, 0)), truth, ERRORS)
    faint = (view.intensity < 0.005) & ~cut.seen
    assert faint.sum() > 10
    assert fit.by_ion[0, faint].min() > -0.5


def test_masses_that_were_not_recorded_say_nothing(channels: MassChannels, dimethyls: SeriesBatch) -> None:
    view = channels.at(dimethyls.masses)
    for column in np.flatnonzero(np.isin(dimethyls.masses, (85, 224, 225, 380))):
        blind = changed(view, int(column), recorded=False)
        loud = changed(blind, int(column), intensity=0.9, seen=True)
        one, other = fit_batch(blind, dimethyls, ERRORS), fit_batch(loud, dimethyls, ERRORS)
        assert not one.by_ion[:, column].any()
        np.testing.assert_allclose(other.log_likelihood, one.log_likelihood, atol=1e-6)


def test_a_doubtful_peak_may_be_a_tenth_of_the_truth(dimethyls: SeriesBatch) -> None:
    """Where the file casts doubt on a value, a shifted decimal costs far less and a sound value little."""
    truth = dimethyls.take(np.flatnonzero((dimethyls.positions == (5, 11)).all(axis=1)))
    view = ideal(truth)
    column = int(np.flatnonzero(truth.masses == 225)[0])
    tenth = changed(view, column, intensity=float(view.intensity[column]) / 10)
    believed = fit_batch(tenth, truth, ERRORS).log_likelihood[0]
    doubted = fit_batch(changed(tenth, column, doubtful=True), truth, ERRORS).log_likelihood[0]
    sound = fit_batch(changed(view, column, doubtful=True), truth, ERRORS).log_likelihood[0]
    untouched = fit_batch(view, truth, ERRORS).log_likelihood[0]
    assert doubted > believed + 2
    assert untouched - 2 < sound <= untouched


@pytest.mark.parametrize("factor", [0.1, 10.0])
@pytest.mark.parametrize("accession", RECORDS)
def test_one_bad_peak_cannot_flip_a_verdict(shared: Path, accession: str, factor: float) -> None:
    """A tenfold error in any one of the ions that a branch raises leaves the truth in the credible set.

    Some real records have single peaks ten times too small.
    """
    spectrum = record(shared, accession)
    masses = np.round(spectrum.mz).astype(int)
    for mass in (84, 85, 182, 183, 224, 225, 322, 323):
        intensity = np.where(masses == mass, spectrum.intensity * factor, spectrum.intensity)
        verdict = locate_branches(replace(spectrum, intensity=intensity))
        assert "5,11-dimethylpentacosane" in verdict.credible_set, mass


def test_the_screening_follows_the_full_likelihood(channels: MassChannels, dimethyls: SeriesBatch) -> None:
    """Its task is to lose no chain that the full likelihood would put in front (margin: 14 natural logs)."""
    view = channels.at(dimethyls.masses)
    rough = screen_batch(view, dimethyls, ERRORS)
    full = fit_batch(view, dimethyls, ERRORS).log_likelihood
    assert np.corrcoef(rough, full)[0, 1] > 0.9
    assert rough[full.argmax()] > rough.max() - 5
    serious = full > full.max() - 5
    assert (rough[serious] > rough.max() - 14).all()


@pytest.mark.parametrize("methyls", [1, 3, 4])
def test_the_screening_loses_no_leader_of_other_kinds(channels: MassChannels, methyls: int) -> None:
    rows = alkane_positions(27 - methyls, methyls)
    batch = predict_alkanes(fitted_parameters(), 27 - methyls, rows)
    view = channels.at(batch.masses)
    rough = screen_batch(view, batch, ERRORS)
    looked_at = np.argsort(rough)[::-1][:1000]
    full = fit_batch(view, batch.take(looked_at), ERRORS).log_likelihood
    assert rough[looked_at[full.argmax()]] > rough.max() - 14


def test_the_linearised_view_vanishes_at_a_perfect_fit(dimethyls: SeriesBatch) -> None:
    truth = dimethyls.take(np.flatnonzero((dimethyls.positions == (5, 11)).all(axis=1)))
    view = linearise(ideal(truth), truth, ERRORS)
    strong = truth.abundance[0] > 1e-3
    np.testing.assert_allclose(view.residual[strong], 0.0, atol=0.02)
