"""Predicted ions of alkanes: balance, symmetry, and independence of what is predicted beside them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from branchpos.enumerating import alkane_positions
from branchpos.ion_series import IonKind, SeriesBatch
from branchpos.masses import Formula, isotope_pattern
from branchpos.predicting.alkanes import CARBON_13, SMALLEST, predict_alkanes
from branchpos.predicting.parameters import (
    YieldParameters,
    fitted_parameters,
    parameter_names,
    parameters_from_record,
    parameters_to_record,
    prior_parameters,
)

FITTED = fitted_parameters()


def with_value(name: str, value: float) -> YieldParameters:
    values = FITTED.values.copy()
    values[parameter_names().index(name)] = value
    return replace(FITTED, values=values)


def level(batch: SeriesBatch, mass: int, row: int = 0) -> float:
    return float(batch.abundance[row, batch.masses == mass].sum())


def one(backbone: int, *methyls: int, parameters: YieldParameters = FITTED) -> SeriesBatch:
    return predict_alkanes(parameters, backbone, np.array([methyls], dtype=np.int16).reshape(1, -1))


@pytest.mark.parametrize("parameters", [FITTED, prior_parameters()], ids=["fitted", "prior"])
@pytest.mark.parametrize(
    ("carbons", "methyls", "least"), [(12, 0, 0.5), (20, 1, 0.75), (27, 2, 0.8), (36, 3, 0.8)]
)
def test_ions_share_one_current(
    parameters: YieldParameters, carbons: int, methyls: int, least: float
) -> None:
    """Every cleavage competes for one current: the listed ions take most of it and never more than all.

    What is missing are ions below C3, of which a short chain gives more. Carbon-13 of the even-mass ions is
    counted once more in the odd ones and taken off here.
    """
    backbone = carbons - methyls
    batch = predict_alkanes(parameters, backbone, alkane_positions(backbone, methyls))
    rearranged = batch.kinds == IonKind.REARRANGED
    carried = batch.abundance[:, rearranged] @ (CARBON_13 * batch.carbons[rearranged])
    total = batch.abundance.sum(axis=1) - carried
    assert (batch.abundance >= 0).all()
    assert (total <= 1 + 1e-5).all()
    assert (total >= least).all()


@given(st.integers(6, 40), st.data())
@settings(max_examples=50, deadline=None)
def test_both_numberings_predict_the_same(backbone: int, data: st.DataObject) -> None:
    count = data.draw(st.integers(0, 4))
    places = data.draw(st.lists(st.integers(2, backbone - 1), min_size=count, max_size=count, unique=True))
    rows = np.array([sorted(places)], dtype=np.int16).reshape(1, -1)
    mirrored = np.sort(backbone + 1 - rows, axis=1)
    straight, mirror = (predict_alkanes(FITTED, backbone, each) for each in (rows, mirrored))
    np.testing.assert_allclose(straight.abundance, mirror.abundance, rtol=2e-5)
    np.testing.assert_allclose(straight.steered, mirror.steered, rtol=2e-5, atol=1e-7)


@pytest.mark.parametrize(("backbone", "methyls"), [(12, 1), (22, 2), (26, 3)])
def test_a_chain_is_predicted_alike_alone_and_in_company(backbone: int, methyls: int) -> None:
    """Batches are worked through in chunks of about a thousand; rows at the seams included."""
    rows = alkane_positions(backbone, methyls)
    together = predict_alkanes(FITTED, backbone, rows)
    for row in {0, len(rows) // 2, min(1023, len(rows) - 1), min(1024, len(rows) - 1), len(rows) - 1}:
        alone = predict_alkanes(FITTED, backbone, rows[row : row + 1])
        np.testing.assert_allclose(together.abundance[row], alone.abundance[0], rtol=1e-5)
        np.testing.assert_allclose(together.steered[row], alone.steered[0], rtol=1e-5, atol=1e-7)


def test_each_ion_stands_on_its_own_mass_number() -> None:
    batch = one(25, 5, 11)
    assert len(set(batch.masses.tolist())) == batch.masses.size
    fragment = batch.kinds == IonKind.FRAGMENT
    rearranged = batch.kinds == IonKind.REARRANGED
    formulas = [Formula(int(n), 2 * int(n) + 1) for n in batch.carbons[fragment]]
    assert batch.masses[fragment].tolist() == [formula.nominal_mass for formula in formulas]
    assert batch.masses[rearranged].tolist() == (batch.masses[fragment] - 1).tolist()
    assert batch.masses[batch.kinds == IonKind.MOLECULAR].tolist() == [Formula(27, 56).nominal_mass]
    assert int(batch.carbons.min()) == SMALLEST


@pytest.mark.parametrize("parameters", [FITTED, prior_parameters()], ids=["fitted", "prior"])
def test_steered_shares_are_shares_and_sit_beside_branches(parameters: YieldParameters) -> None:
    batch = one(25, 5, 11, parameters=parameters)
    assert (batch.steered >= 0).all() and (batch.steered <= 1 + 1e-6).all()
    beside = np.isin(batch.carbons, (6, 13, 16, 23, 26)) & (batch.kinds != IonKind.MOLECULAR)
    assert not batch.steered[0, ~beside].any()
    assert (batch.steered[0, beside] > 0.2).all()
    assert not one(27, parameters=parameters).steered.any()


def test_even_mass_ions_carry_into_the_odd_ones() -> None:
    """Natural abundance of 13C (IUPAC): C16H32 carries 17 % of itself into the mass above.

    With every hydrogen transferred, the steered part of m/z 225 is nothing but carbon-13 of m/z 224.
    """
    batch = one(25, 5, 11, parameters=with_value("even_own_methyl", 12.0))
    steered = batch.abundance[0] * batch.steered[0]
    odd, even = (float(steered[batch.masses == mass].sum()) for mass in (225, 224))
    assert even > 0.01
    assert odd / even == pytest.approx(isotope_pattern(Formula(16, 32), 2)[1], rel=0.03)


def test_a_faster_secondary_cleavage_raises_the_branch_and_drains_the_molecule() -> None:
    slow, fast = (one(25, 5, 11, parameters=with_value("rate_secondary", v)) for v in (1.0, 3.0))
    assert level(fast, 225) > level(slow, 225)
    assert level(fast, 380) < level(slow, 380)


def test_branching_weakens_the_molecular_ion() -> None:
    """Common practice."""
    shares = [level(one(27 - len(m), *m), 380) for m in ((), (13,), (5, 11), (5, 9, 13))]
    assert shares == sorted(shares, reverse=True)


def test_geminal_branches_all_but_remove_the_molecular_ion() -> None:
    """Common practice: quaternary carbons break first."""
    assert level(one(20, 10, 10), 310) < 0.3 * level(one(20, 8, 10), 310)


def test_parameters_survive_a_round_trip() -> None:
    again = parameters_from_record(parameters_to_record(FITTED), "test")
    np.testing.assert_allclose(again.values, FITTED.values, atol=1e-5)
    np.testing.assert_allclose(again.covariance, FITTED.covariance, rtol=1e-3, atol=1e-12)


def test_the_shipped_covariance_is_one() -> None:
    assert np.allclose(FITTED.covariance, FITTED.covariance.T, rtol=1e-3, atol=1e-6)
    assert np.linalg.eigvalsh(FITTED.covariance).min() > 0


def test_the_fit_narrowed_what_it_was_given() -> None:
    """No parameter is left wider than the prior, by the standard errors that are shipped."""
    before, after = np.diag(prior_parameters().covariance), np.diag(FITTED.covariance)
    assert (after <= before * 1.01).all()
    assert (after < 0.25 * before).sum() > 20


def test_the_provenance_says_which_records_and_which_command() -> None:
    assert FITTED.provenance["command"].startswith("branchpos refit")
    assert "MSBNK-MSSJ-MSJ00076" in FITTED.provenance["accessions"]
