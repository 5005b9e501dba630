"""From a spectrum to a verdict: real records of known alkanes, and the parts of a verdict."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from branchpos.chain import Chain
from branchpos.errors import SettingsError
from branchpos.predicting.retention import shipped_parameters
from branchpos.retention_index import RetentionIndex
from branchpos.spectrum import Spectrum
from branchpos.verdict import RankedHypothesis, Status, Verdict
from branchpos.workflow.locate import locate_branches
from branchpos.workflow.method import Method
from branchpos.workflow.model import Model
from branchpos.workflow.reference_spectra import KnownSpectrum, read_known_spectra
from branchpos.workflow.refit import refit_yields

ALKANES = Method(chain=("alkane",))
TRUTH, TWIN = Chain(25, (5, 11)), Chain(25, (5, 14))
RECORDS = ("MSBNK-MSSJ-MSJ00076", "MSBNK-MSSJ-MSJ00078")
"""5,11-dimethylpentacosane (CC BY; Mori and Akasaka, Tetrahedron 71 (2015) 4102)."""
INDEX = RetentionIndex(2580.5, sd=1.0)
"""Its index on a methyl silicone phase, from the table of measured indices."""
MOLECULAR_IONS = (365, 366, 380, 381)


@pytest.fixture(scope="session")
def known(shared: Path) -> dict[str, KnownSpectrum]:
    return {one.accession: one for one in read_known_spectra(shared / "spectra")}


@pytest.fixture(scope="session")
def verdicts(known: dict[str, KnownSpectrum]) -> dict[str, Verdict]:
    """Return the verdict on every record of a known alkane, peaks alone."""
    return {name: locate_branches(one.spectrum, ALKANES) for name, one in known.items()}


@pytest.fixture(scope="session")
def unseen_model(shared: Path) -> Model:
    """Return a model fitted from the priors up, without any record of the dimethylpentacosane."""
    fit = refit_yields(shared / "spectra", leave_out=RECORDS)
    assert not set(RECORDS) & set(fit.parameters.provenance["accessions"].split())
    return Model(fit.parameters, fit.errors, shipped_parameters())


def without_molecular_ion(spectrum: Spectrum) -> Spectrum:
    """Return the spectrum without M, M-15 and their carbon-13 peaks."""
    kept = ~np.isin(np.round(spectrum.mz * (1 - 6e-4)), MOLECULAR_IONS)
    return replace(
        spectrum,
        mz=spectrum.mz[kept],
        intensity=spectrum.intensity[kept],
        doubtful=spectrum.doubtful[kept],
    )


def probability(verdict: Verdict, chain: Chain) -> float:
    return next((one.posterior for one in verdict.hypotheses if one.chain == chain), 0.0)


def in_credible_set(verdict: Verdict, chain: Chain) -> bool:
    return RankedHypothesis(chain, 0, 0, None).name in verdict.credible_set


class TestDimethylpentacosane:
    """Among all chains of all carbon numbers with 0 to 4 methyls, peaks alone."""

    @pytest.mark.parametrize("accession", RECORDS)
    def test_first(self, verdicts: dict[str, Verdict], accession: str) -> None:
        """Assigned or narrowed: nothing near it is as likely (measured: 0.89 and 0.86)."""
        verdict = verdicts[accession]
        assert verdict.hypotheses[0].chain == TRUTH
        assert probability(verdict, TRUTH) > 0.7
        assert verdict.status in (Status.ASSIGNED, Status.NARROWED)

    @pytest.mark.parametrize("accession", RECORDS)
    def test_first_without_molecular_ion(self, known: dict[str, KnownSpectrum], accession: str) -> None:
        verdict = locate_branches(without_molecular_ion(known[accession].spectrum), ALKANES)
        assert verdict.hypotheses[0].chain == TRUTH
        assert in_credible_set(verdict, TRUTH)
        assert verdict.considered > 100_000

    @pytest.mark.parametrize("accession", RECORDS)
    def test_its_twin_falls_behind_by_the_doublets(
        self, verdicts: dict[str, Verdict], accession: str
    ) -> None:
        """5,14 has the same ion sizes (6, 13, 16, 23); the doublets of C13 and C16 must tell."""
        verdict = verdicts[accession]
        assert probability(verdict, TRUTH) > 20 * probability(verdict, TWIN)
        twin = next(one for one in verdict.hypotheses if one.chain == TWIN)
        doublets = [ion for ion in twin.ions if ion.carbons in (13, 16)]
        assert sum(ion.weight_of_evidence for ion in doublets) < -3

    @pytest.mark.parametrize("accession", RECORDS)
    @pytest.mark.parametrize("cut", [False, True], ids=["whole", "no molecular ion"])
    def test_first_when_the_fit_has_not_seen_the_compound(
        self, known: dict[str, KnownSpectrum], unseen_model: Model, accession: str, cut: bool
    ) -> None:
        spectrum = known[accession].spectrum
        verdict = locate_branches(
            without_molecular_ion(spectrum) if cut else spectrum, ALKANES, model=unseen_model
        )
        assert verdict.hypotheses[0].chain == TRUTH
        assert in_credible_set(verdict, TRUTH)
        assert probability(verdict, TRUTH) > 5 * probability(verdict, TWIN)
        assert verdict.status in (Status.ASSIGNED, Status.NARROWED)

    @pytest.mark.parametrize("accession", RECORDS)
    def test_the_true_index_makes_it_likelier(
        self, known: dict[str, KnownSpectrum], unseen_model: Model, accession: str
    ) -> None:
        spectrum = known[accession].spectrum
        alone = locate_branches(spectrum, ALKANES, model=unseen_model)
        joined = locate_branches(spectrum, ALKANES, INDEX, model=unseen_model)
        assert probability(joined, TRUTH) > probability(alone, TRUTH) + 0.2
        assert len(joined.credible_set) < len(alone.credible_set)
        first = joined.hypotheses[0]
        assert first.retention_z is not None and abs(first.retention_z) < 2


def test_pentamethylicosane_on_a_wandering_axis(verdicts: dict[str, Verdict]) -> None:
    """MassBank MSBNK-UOEH-UO000024: the truth is in the credible set, and the doubt is stated."""
    verdict = verdicts["MSBNK-UOEH-UO000024"]
    assert in_credible_set(verdict, Chain(20, (2, 6, 10, 14, 18)))
    assert any("mass axis" in warning for warning in verdict.warnings)


@pytest.fixture(scope="module")
def straight(known: dict[str, KnownSpectrum], verdicts: dict[str, Verdict]) -> list[Verdict]:
    found = [verdicts[name] for name, one in known.items() if not one.chain.is_branched]
    assert len(found) >= 30
    return found


class TestUnbranchedRecords:
    """All records of n-alkanes in the shared folder, C10 to C30."""

    def test_unbranched_comes_first(self, straight: list[Verdict]) -> None:
        first = [not verdict.hypotheses[0].chain.is_branched for verdict in straight]
        assert np.mean(first) >= 0.95

    def test_none_is_called_branched(self, straight: list[Verdict]) -> None:
        assert all(verdict.status is not Status.ASSIGNED for verdict in straight)
        branched = [
            sum(one.posterior for one in verdict.hypotheses if one.chain.is_branched) for verdict in straight
        ]
        assert max(branched) < 0.9

    def test_the_size_is_in_the_credible_set(
        self, known: dict[str, KnownSpectrum], verdicts: dict[str, Verdict]
    ) -> None:
        held = [
            in_credible_set(verdicts[name], one.chain)
            for name, one in known.items()
            if not one.chain.is_branched
        ]
        assert np.mean(held) >= 0.95


def test_shifted_decimals_are_seen_through_or_declared(
    known: dict[str, KnownSpectrum], verdicts: dict[str, Verdict]
) -> None:
    """``truth.csv`` suspects a shifted decimal in most records of the series JP."""
    suspected = [name for name, one in known.items() if "decimal shift" in one.quality]
    assert len(suspected) >= 30
    for name in suspected:
        verdict = verdicts[name]
        seen_through = in_credible_set(verdict, known[name].chain)
        assert seen_through or verdict.warnings, name
        assert seen_through or verdict.status is not Status.ASSIGNED, name


@pytest.fixture(scope="module")
def verdict(known: dict[str, KnownSpectrum]) -> Verdict:
    return locate_branches(known[RECORDS[0]].spectrum, ALKANES, INDEX, everything=True)


class TestPartsOfAVerdict:
    def test_probabilities_sum_to_one(self, verdict: Verdict) -> None:
        total = sum(one.posterior for one in verdict.hypotheses) + verdict.none_of_these
        assert total == pytest.approx(1.0, abs=1e-6)
        assert sum(p for _, p in verdict.rivals) == pytest.approx(verdict.none_of_these)
        assert len(verdict.hypotheses) == verdict.considered

    def test_best_first(self, verdict: Verdict) -> None:
        posteriors = [one.posterior for one in verdict.hypotheses]
        assert posteriors == sorted(posteriors, reverse=True)

    def test_no_structure_twice(self, verdict: Verdict) -> None:
        chains = [one.chain for one in verdict.hypotheses]
        assert len(set(chains)) == len(chains)

    def test_bits_add_up_to_the_difference_of_the_posteriors(self, verdict: Verdict) -> None:
        """A reader can strike an ion and see what is left: nothing is missing from the table of evidence."""
        first, second = verdict.hypotheses[:2]
        accounted = [(first, second), *((one, first) for one in verdict.hypotheses[1:20])]
        for one, other in accounted:
            assert one.shares is not None
            expected = np.log2(one.posterior / other.posterior)
            assert one.shares.total == pytest.approx(expected, abs=0.05)
            assert one.shares.ions == pytest.approx(sum(ion.weight_of_evidence for ion in one.ions))

    def test_observed_ions_are_those_of_the_spectrum(
        self, verdict: Verdict, known: dict[str, KnownSpectrum]
    ) -> None:
        """m/z 85 and 225 of record MSJ00076: 68 and 9 % of the base peak."""
        observed = {ion.mz: ion.observed for ion in verdict.hypotheses[0].ions}
        assert observed[85] == pytest.approx(0.68, abs=0.01)
        assert observed[225] == pytest.approx(0.09, abs=0.01)
        spectrum = known[RECORDS[0]].spectrum
        absent = [ion for ion in verdict.hypotheses[0].ions if ion.observed is None]
        assert absent and not {ion.mz for ion in absent} & set(np.floor(spectrum.mz).astype(int).tolist())

    def test_reasons_name_the_molecular_ion_and_what_cannot_be_seen(self, verdict: Verdict) -> None:
        assert any("380" in reason for reason in verdict.reasons)
        assert any("stereochemistry" in reason for reason in verdict.reasons)

    def test_tables_are_plain_records(self, verdict: Verdict) -> None:
        row = verdict.to_table()[0]
        assert row["name"] == "5,11-dimethylpentacosane"
        assert row["methyl_positions"] == [5, 11]
        assert row["formula"] == "C27H56"


@pytest.fixture(scope="module")
def spectrum(known: dict[str, KnownSpectrum]) -> Spectrum:
    return known[RECORDS[0]].spectrum


class TestSettings:
    @pytest.mark.parametrize("method", [Method(carbons=range(25, 28)), Method(formula="C27H56")])
    def test_only_the_asked_sizes_are_considered(self, spectrum: Spectrum, method: Method) -> None:
        verdict = locate_branches(spectrum, replace(method, chain=("alkane",)), everything=True)
        allowed = set(method.carbons or [27])
        assert {one.chain.carbons for one in verdict.hypotheses} <= allowed
        assert verdict.hypotheses[0].chain == TRUTH

    def test_only_the_asked_numbers_of_methyls_are_considered(self, spectrum: Spectrum) -> None:
        verdict = locate_branches(spectrum, replace(ALKANES, methyls=range(1, 3)), everything=True)
        assert {len(one.chain.methyls) for one in verdict.hypotheses} == {1, 2}

    def test_a_wrong_formula_ends_in_doubt(self, spectrum: Spectrum) -> None:
        """Nothing of C24 explains the ions up to m/z 380: no structure may be assigned."""
        verdict = locate_branches(spectrum, replace(ALKANES, formula="C24H50"))
        assert verdict.status is not Status.ASSIGNED

    def test_every_prior_is_named_in_the_verdict(self, spectrum: Spectrum) -> None:
        method = replace(ALKANES, formula="C27H56")
        flat = locate_branches(spectrum, method)
        biogenic = locate_branches(spectrum, replace(method, prior="biogenic"))
        assert flat.prior.startswith("flat") and biogenic.prior.startswith("biogenic")
        odd = Chain(24, (3, 4, 10))
        assert probability(biogenic, odd) <= probability(flat, odd)

    def test_a_higher_level_needs_more_members(self, spectrum: Spectrum) -> None:
        wide = locate_branches(spectrum, replace(ALKANES, level=0.999))
        narrow = locate_branches(spectrum, replace(ALKANES, level=0.5))
        assert len(wide.credible_set) > len(narrow.credible_set) == 1

    def test_settings_that_no_chain_fits(self, spectrum: Spectrum) -> None:
        with pytest.raises(SettingsError):
            locate_branches(spectrum, replace(ALKANES, carbons=range(5, 6), methyls=range(4, 5)))


def test_a_single_peak_is_not_believed() -> None:
    verdict = locate_branches(Spectrum.from_peaks([57], [100]), ALKANES)
    assert verdict.status in (Status.OPEN, Status.NOT_A_CHAIN)
    assert verdict.warnings


def test_an_aromatic_is_no_chain() -> None:
    """Invented after naphthalene's pattern: molecular ion 128 as base peak, doubly charged and ring ions."""
    peaks = {39: 5, 50: 8, 51: 13, 63: 8, 64: 10, 74: 5, 75: 6, 76: 4, 77: 4, 87: 1, 101: 3, 102: 8}
    peaks |= {126: 7, 127: 13, 128: 100, 129: 11}
    verdict = locate_branches(Spectrum.from_peaks(list(peaks), list(peaks.values())), ALKANES)
    assert verdict.status is Status.NOT_A_CHAIN
    assert verdict.none_of_these > 0.99
