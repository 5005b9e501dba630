"""The Python interface: complete, quick to import, and of one mind with the command line."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

import branchpos as bp


def test_every_public_name_is_there_and_listed() -> None:
    assert dir(bp) == sorted(bp.__all__)
    assert all(getattr(bp, name) is not None for name in bp.__all__)


def test_types_for_checkers_name_the_same_things() -> None:
    tree = ast.parse(Path(bp.__file__).read_text(encoding="utf-8"))
    (guarded,) = [node for node in tree.body if isinstance(node, ast.If)]
    named = {
        alias.asname for node in guarded.body if isinstance(node, ast.ImportFrom) for alias in node.names
    }
    assert named | {"__version__"} == set(bp.__all__)


def test_an_unknown_name_is_an_attribute_error() -> None:
    with pytest.raises(AttributeError, match="no attribute 'locat'"):
        bp.locat  # noqa: B018 - the access itself is what is tested


@pytest.fixture(scope="module")
def spectrum() -> bp.Spectrum:
    ions = bp.predict("4-MeC12", least=0.004).series.ions
    return bp.Spectrum.from_peaks([ion.mz for ion in ions], [ion.expected for ion in ions])


def test_settings_may_be_text_numbers_or_ranges(spectrum: bp.Spectrum) -> None:
    calls = [
        bp.locate(spectrum, chain="alkane", carbons="12-14", methyls="0-2"),
        bp.locate(spectrum, chain=["alkane"], carbons=range(12, 15), methyls=range(3)),
    ]
    assert {verdict.hypotheses[0].name for verdict in calls} == {"4-methyldodecane"}
    assert calls[0].considered == calls[1].considered


def test_the_retention_index_enters_the_verdict(spectrum: bp.Spectrum) -> None:
    index = bp.predict("4-MeC12").retention_index
    assert index is not None
    verdict = bp.locate(spectrum, chain="alkane", retention_index=bp.RetentionIndex(index.value, sd=1.0))
    assert verdict.hypotheses[0].retention_z == pytest.approx(0.0, abs=1e-6)


def test_other_ionisation_is_refused() -> None:
    spectrum = bp.Spectrum.from_peaks(
        [57, 71], [100, 50], warnings=("not electron ionisation: the record says 'CI'",)
    )
    with pytest.raises(bp.BranchposError, match="--formula"):
        bp.locate(spectrum)


@pytest.mark.parametrize("settings", [{"prior": "flatt"}, {"methyls": "2-1"}, {"chain": "alkan"}])
def test_wrong_settings_are_errors_of_the_program(spectrum: bp.Spectrum, settings: dict[str, str]) -> None:
    with pytest.raises(bp.BranchposError):
        bp.locate(spectrum, **settings)


def test_names_and_chains_predict_alike() -> None:
    assert bp.predict("5,11-diMeC25") == bp.predict(bp.Chain(25, (5, 11)))


def test_isomers_stream(spectrum: bp.Spectrum) -> None:
    # C8H18 has 18 isomers, of which 14 carry methyl branches only or none (counted in tests of the stage).
    assert len(list(bp.isomers(8, "0-4"))) == len({one.chain for one in bp.isomers(8, "0-4")})
