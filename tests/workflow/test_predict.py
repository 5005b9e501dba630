"""Predictions: masses from the formula, intervals that real spectra confirm, refusals."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from branchpos.chain import Chain
from branchpos.cleaning.nominal import to_channels
from branchpos.end_group import END_GROUPS
from branchpos.errors import SettingsError
from branchpos.naming import parse_chain
from branchpos.reading import read_spectrum
from branchpos.workflow.predict import predict_chain


def test_exact_masses_are_those_of_the_ions() -> None:
    # C6H13+ 85.1012, C27H56+. 380.4377: monoisotopic masses less an electron (molmass 2024.5.10).
    ions = {ion.mz: ion for ion in predict_chain(parse_chain("5,11-diMeC25")).series.ions}
    assert ions[85].exact_mz == pytest.approx(85.1012, abs=5e-5)
    assert ions[380].exact_mz == pytest.approx(380.4377, abs=5e-5)
    assert str(ions[224].composition) == "C16H32"


def test_branch_doublets_stand_out() -> None:
    # The doublets 182/183 and 224/225 of record MSSJ-MSJ00076 rise above the sizes beside them.
    ions = {ion.mz: ion.expected for ion in predict_chain(parse_chain("5,11-diMeC25")).series.ions}
    assert ions[183] > 3 * ions[169]
    assert ions[224] > 3 * ions[210]


@pytest.mark.parametrize(
    ("accession", "name"),
    [
        ("MSBNK-MSSJ-MSJ00076", "5,11-diMeC25"),
        ("MSBNK-MSSJ-MSJ00078", "5,11-diMeC25"),
        ("MSBNK-Fac_Eng_Univ_Tokyo-JP006878", "n-C12"),
        ("MSBNK-Fac_Eng_Univ_Tokyo-JP006876", "n-C10"),
    ],
)
def test_intervals_hold_what_was_measured(shared: Path, accession: str, name: str) -> None:
    """Real records, on instruments the prediction knows nothing of; 95 % claimed, 85 % demanded."""
    spectrum = read_spectrum(shared / "spectra" / "chains" / f"{accession}.txt")
    channels, _ = to_channels(spectrum)
    inside = []
    for ion in predict_chain(parse_chain(name)).series.ions:
        view = channels.at(np.array([ion.mz]))
        if view.seen[0]:
            inside.append(ion.low <= view.intensity[0] <= ion.high + 1e-9)
        elif view.recorded[0]:
            inside.append(ion.low <= channels.threshold)
    assert len(inside) > 10
    assert np.mean(inside) >= 0.85


def test_ions_below_the_limit_are_left_out() -> None:
    few = predict_chain(parse_chain("5-MeC25"), least=0.05).series.ions
    assert 0 < len(few) < len(predict_chain(parse_chain("5-MeC25")).series.ions)
    assert all(ion.expected >= 0.05 for ion in few)


@pytest.mark.parametrize("chain", [Chain(18, (), END_GROUPS["alkene"]), Chain(3), Chain(80)])
def test_what_cannot_be_predicted_is_refused(chain: Chain) -> None:
    with pytest.raises(SettingsError):
        predict_chain(chain)


def test_gap_of_a_pyrrolidide() -> None:
    # 13-methyltetradecanoic acid pyrrolidide: a step of 28 from m/z 252 to 280 (W. W. Christie, published
    # pages on the mass spectrometry of fatty acid derivatives, from memory).
    chain = Chain(14, (13,), END_GROUPS["pyrrolidide"])
    ions = {ion.mz: ion.expected for ion in predict_chain(chain, least=0.0).series.ions}
    assert ions[266] < 0.5 * min(ions[252], ions[280])


def test_gap_of_a_pyridylcarbinol_ester() -> None:
    # 17-methyloctadecanoic acid: a step of 28 from m/z 346 to 374 (same source).
    chain = Chain(18, (17,), END_GROUPS["3-pyridylcarbinol ester"])
    ions = {ion.mz: ion.expected for ion in predict_chain(chain, least=0.0).series.ions}
    assert ions[360] < 0.5 * min(ions[346], ions[374])


def test_alpha_methyl_moves_the_mclafferty_ion() -> None:
    # 74 becomes 88 in a 2-methyl methyl ester (MassBank MSBNK-Fac_Eng_Univ_Tokyo-JP001858: base peak 88).
    chain = Chain(16, (2,), END_GROUPS["methyl ester"])
    ions = {ion.mz: ion.expected for ion in predict_chain(chain, least=0.0).series.ions}
    assert ions[88] == 1.0
    assert ions[74] < 0.05
