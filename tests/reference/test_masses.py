"""Masses and isotope patterns against published values and against two independent libraries."""

from __future__ import annotations

import numpy as np
import pytest
from molmass import ELEMENTS as MOLMASS_ELEMENTS
from molmass import Formula as MolmassFormula
from rdkit import Chem
from rdkit.Chem import Descriptors

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.masses import ELEMENTS, Formula, electron_mass, isotope_pattern, isotopes, parse_formula
from branchpos.naming import smiles

CHAINS = [Chain(25, (5, 11), g) for g in END_GROUPS.values() if g.name != "alkene"] + [Chain(8), Chain(60)]


@pytest.mark.parametrize(
    ("element", "mass"),
    [
        # AME2020: Wang et al., Chinese Phys. C 45 (2021) 030003; carbon-12 is exact by definition of the unit
        ("C", 12.0),
        ("H", 1.007825031898),
        ("N", 14.00307400425),
        ("O", 15.99491461926),
        ("Si", 27.97692653442),
    ],
)
def test_lightest_isotopes_have_their_published_masses(element: str, mass: float) -> None:
    assert isotopes(element)[0][1] == pytest.approx(mass, abs=2e-11)


@pytest.mark.parametrize(
    ("element", "low", "high"),
    [
        # IUPAC standard atomic weights, Prohaska et al., Pure Appl. Chem. 94 (2022) 573: intervals in nature
        ("C", 12.0096, 12.0116),
        ("H", 1.00784, 1.00811),
        ("N", 14.00643, 14.00728),
        ("O", 15.99903, 15.99977),
        ("Si", 28.084, 28.086),
    ],
)
def test_isotopes_average_to_the_standard_atomic_weight(element: str, low: float, high: float) -> None:
    assert low <= sum(mass * share for _, mass, share in isotopes(element)) <= high


@pytest.mark.parametrize("element", ELEMENTS)
def test_isotopes_agree_with_a_reference_library(element: str) -> None:
    theirs = [(i.massnumber, i.mass, i.abundance) for i in MOLMASS_ELEMENTS[element].isotopes.values()]
    np.testing.assert_allclose(isotopes(element), theirs, rtol=0, atol=2e-9)


def test_electron_mass() -> None:
    """CODATA 2018: 5.485 799 090 65(16)e-4 u (Tiesinga et al., Rev. Mod. Phys. 93 (2021) 025010)."""
    assert electron_mass() == pytest.approx(5.48579909065e-4, abs=1.6e-14)


@pytest.mark.parametrize("chain", CHAINS, ids=lambda chain: f"{chain.end_group.name} {chain.carbons}")
def test_exact_masses_agree_with_two_libraries(chain: Chain) -> None:
    """2 microunits: the libraries carry older mass tables (AME2012 and before)."""
    ours = chain.formula.exact_mass
    assert ours == pytest.approx(MolmassFormula(str(chain.formula)).monoisotopic_mass, abs=2e-6)
    assert ours == pytest.approx(Descriptors.ExactMolWt(Chem.MolFromSmiles(smiles(chain))), abs=2e-6)


@pytest.mark.parametrize(
    "text", ["C6H13", "C16H33", "C27H56", "C40H82", "C19H40O2Si", "C22H43NO", "C24H41NO2"]
)
def test_isotope_patterns_agree_with_a_reference_library(text: str) -> None:
    spectrum = MolmassFormula(text).spectrum(min_intensity=1e-6)
    theirs = np.array([entry.fraction for entry in spectrum.values()])[:4]
    np.testing.assert_allclose(isotope_pattern(parse_formula(text)), theirs / theirs[0], rtol=2e-4)


def test_thirteen_carbon_weighs_on_the_next_mass() -> None:
    """1.08 % per carbon, so 17 % of C16H33 at m/z 225 goes into 226 (common practice)."""
    assert isotope_pattern(Formula(16, 33))[1] == pytest.approx(16 * 0.0108, rel=0.03)


@pytest.mark.parametrize(
    ("formula", "mz"),
    [
        # alkyl ions of the hydrocarbon series as tabulated for mass axis checks (common practice)
        (Formula(4, 9), 57.0699),
        (Formula(6, 13), 85.1012),
        (Formula(3, 6, o=2), 74.0362),  # McLafferty ion of methyl esters
    ],
)
def test_ions_lose_the_mass_of_an_electron(formula: Formula, mz: float) -> None:
    assert formula.cation_mz == pytest.approx(mz, abs=5e-5)
