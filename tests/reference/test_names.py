"""Names against the nomenclature's own examples, collections of spectra, and a general chemistry toolkit."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest
from rdkit import Chem
from rdkit.Chem.rdMolDescriptors import CalcMolFormula

from branchpos.chain import Chain
from branchpos.end_group import END_GROUPS
from branchpos.errors import NamingError
from branchpos.masses import parse_formula
from branchpos.naming import parse_chain, parse_smiles, shorthand, smiles, systematic_name

PLACED = [group for group in END_GROUPS.values() if group.name != "alkene"]


@pytest.mark.parametrize(
    ("carbons", "name"),
    [
        # IUPAC Recommendations 2013, P-21.2.1, table of unbranched alkanes
        (1, "methane"),
        (4, "butane"),
        (11, "undecane"),
        (12, "dodecane"),
        (19, "nonadecane"),
        (20, "icosane"),
        (21, "henicosane"),
        (22, "docosane"),
        (23, "tricosane"),
        (24, "tetracosane"),
        (30, "triacontane"),
        (31, "hentriacontane"),
        (32, "dotriacontane"),
        (33, "tritriacontane"),
        (40, "tetracontane"),
        (50, "pentacontane"),
        (99, "nonanonacontane"),
        (100, "hectane"),
    ],
)
def test_stems_of_the_nomenclature(carbons: int, name: str) -> None:
    assert systematic_name(Chain(carbons)) == name


@pytest.mark.parametrize(
    ("chain", "name", "notation", "formula"),
    [
        # MassBank MSBNK-MSSJ-MSJ00076: name, structure and formula as deposited, stereochemistry left out
        (Chain(25, (5, 11)), "5,11-dimethylpentacosane", "CC(CCCC)CCCCCC(C)CCCCCCCCCCCCCC", "C27H56"),
        # lowest locants: IUPAC Recommendations 2013, P-31.1.4
        (Chain(5, (2, 2, 4)), "2,2,4-trimethylpentane", "CC(C)CC(C)(C)C", "C8H18"),
        # squalane (from memory)
        (
            Chain(24, (2, 6, 10, 15, 19, 23)),
            "2,6,10,15,19,23-hexamethyltetracosane",
            "CC(C)CCCC(C)CCCC(C)CCCCC(C)CCCC(C)CCCC(C)C",
            "C30H62",
        ),
        # pristane (from memory)
        (
            Chain(15, (2, 6, 10, 14)),
            "2,6,10,14-tetramethylpentadecane",
            "CC(C)CCCC(C)CCCC(C)CCCC(C)C",
            "C19H40",
        ),
    ],
)
def test_well_known_alkanes(chain: Chain, name: str, notation: str, formula: str) -> None:
    assert systematic_name(chain) == name
    assert parse_chain(name) == parse_chain(notation) == chain
    assert str(chain.formula) == formula


@pytest.mark.parametrize(
    ("trade", "name"),
    [
        ("i-15:0", "13-methyltetradecanoic acid"),  # LIPID MAPS and common practice: iso counts all carbons
        ("a-15:0", "12-methyltetradecanoic acid"),
        ("a-17:0", "14-methylhexadecanoic acid"),
        ("10-Me-18:0", "10-methyloctadecanoic acid"),  # tuberculostearic acid (common practice)
        ("n-16:0", "hexadecanoic acid"),
        (
            "13-MeC29",
            "13-methylnonacosane",
        ),  # insect hydrocarbons: the number counts the backbone (common practice)
        ("2-MeC26", "2-methylhexacosane"),
        ("n-C27", "heptacosane"),
    ],
)
def test_trade_shorthand(trade: str, name: str) -> None:
    assert systematic_name(parse_chain(trade)) == name
    assert shorthand(parse_chain(name)) == trade


@pytest.mark.parametrize(
    ("trade", "name"),
    [
        # names as in Peters, Walters and Moldowan, The Biomarker Guide (from memory)
        ("farnesane", "2,6,10-trimethyldodecane"),
        ("norpristane", "2,6,10-trimethylpentadecane"),
        ("phytane", "2,6,10,14-tetramethylhexadecane"),
        ("crocetane", "2,6,11,15-tetramethylhexadecane"),
        ("lycopane", "2,6,10,14,19,23,27,31-octamethyldotriacontane"),
    ],
)
def test_isoprenoid_names(trade: str, name: str) -> None:
    assert systematic_name(parse_chain(trade)) == name


@pytest.mark.parametrize("group", PLACED, ids=lambda group: group.name)
def test_formulas_agree_with_a_chemistry_toolkit(group) -> None:
    for skeleton in ((4, ()), (9, (3, 3, 5)), (18, (10,)), (14, (13,))):
        chain = Chain(*skeleton, group)
        theirs = parse_formula(CalcMolFormula(Chem.MolFromSmiles(smiles(chain))))
        assert chain.formula == theirs


@pytest.mark.parametrize(
    ("notation", "chain_class", "nominal"),
    [
        # molecular masses of the derivatives of octadecanoic acid and of C18 chains (common practice)
        ("CCCCCCCCCCCCCCCCCC(=O)OC", "methyl ester", 298),
        ("CCCCCCCCCCCCCCCCCC(=O)O[Si](C)(C)C", "trimethylsilyl ester", 356),
        ("CCCCCCCCCCCCCCCCCC(=O)N1CCCC1", "pyrrolidide", 337),
        ("CCCCCCCCCCCCCCCCCC(=O)OCc1cccnc1", "3-pyridylcarbinol ester", 375),
        ("CCCCCCCCCCCCCCCCCC1=NC(C)(C)CO1", "dimethyloxazoline", 337),
    ],
)
def test_derivatives_of_stearic_acid(notation: str, chain_class: str, nominal: int) -> None:
    chain = parse_smiles(notation)
    assert (chain.end_group.name, chain.backbone, chain.formula.nominal_mass) == (chain_class, 18, nominal)


def _records(shared: Path) -> list[tuple[dict[str, str], str]]:
    """Return (truth, line notation) of every record of a known chain that carries one."""
    found = []
    with (shared / "spectra" / "truth.csv").open(encoding="utf-8") as stream:
        for row in csv.DictReader(stream):
            text = (shared / "spectra" / "chains" / f"{row['accession']}.txt").read_text(encoding="utf-8")
            notations = [line[11:] for line in text.splitlines() if line.startswith("CH$SMILES: ")]
            found += [(row, notation.strip()) for notation in notations if notation.strip() != "N/A"]
    return found


def test_structures_deposited_with_real_spectra_are_read_right(shared: Path) -> None:
    """Every record of a supported class; the truth counts from the end-group carbon in every class."""
    supported = [(row, notation) for row, notation in _records(shared) if row["chain_class"] in END_GROUPS]
    assert len(supported) > 150
    for row, notation in supported:
        chain = parse_chain(notation)
        shift = chain.end_group.first_free - 2
        told = tuple(int(p) + shift for p in row["methyl_positions"].split())
        assert chain.end_group.name == row["chain_class"], row["accession"]
        assert (chain.backbone - shift, chain.methyls) == (int(row["backbone_carbons"]), told), row[
            "accession"
        ]


def test_structures_of_other_classes_are_refused(shared: Path) -> None:
    others = [notation for row, notation in _records(shared) if row["chain_class"] not in END_GROUPS]
    assert len(others) >= 5
    for notation in others:
        with pytest.raises(NamingError, match="none of the end groups"):
            parse_chain(notation)
