"""Writing and reading names, and what is said about names that cannot be read."""

from __future__ import annotations

import pytest

from branchpos.chain import Chain
from branchpos.end_group import ALKANE, END_GROUPS, EndGroup
from branchpos.errors import NamingError
from branchpos.naming import (
    parse_chain,
    parse_shorthand,
    parse_smiles,
    parse_systematic,
    shorthand,
    smiles,
    systematic_name,
)

PLACED = [group for group in END_GROUPS.values() if group.name != "alkene"]
DIMETHYL = Chain(25, (5, 11))


def of_class(name: str, backbone: int, *methyls: int) -> Chain:
    return Chain(backbone, methyls, END_GROUPS[name])


@pytest.mark.parametrize("group", PLACED, ids=lambda group: group.name)
@pytest.mark.parametrize(
    "skeleton", [(3, ()), (4, (3,)), (14, (13,)), (14, (12,)), (18, (10,)), (9, (3, 3, 5))]
)
def test_every_class_is_written_and_read_three_ways(
    group: EndGroup, skeleton: tuple[int, tuple[int, ...]]
) -> None:
    chain = Chain(*skeleton, group)
    assert parse_systematic(systematic_name(chain)) == chain
    assert parse_shorthand(shorthand(chain)) == chain
    assert parse_smiles(smiles(chain)) == chain
    assert {parse_chain(write(chain)) for write in (systematic_name, shorthand, smiles)} == {chain}


@pytest.mark.parametrize(
    ("chain", "name"),
    [
        (of_class("alcohol", 7, 3), "3-methylheptan-1-ol"),
        (of_class("alcohol", 2), "ethanol"),
        (of_class("methyl ether", 14, 12), "1-methoxy-12-methyltetradecane"),
        (of_class("methyl ether", 14), "1-methoxytetradecane"),
        (of_class("amine", 8), "octan-1-amine"),
        (of_class("aldehyde", 18, 4), "4-methyloctadecanal"),
        (of_class("acid", 16, 14), "14-methylhexadecanoic acid"),
        (of_class("methyl ester", 15, 14), "methyl 14-methylpentadecanoate"),
        (of_class("ethyl ester", 7, 4), "ethyl 4-methylheptanoate"),
        (of_class("trimethylsilyl ester", 20, 19), "trimethylsilyl 19-methylicosanoate"),
        (of_class("trimethylsilyl ether", 16), "trimethyl(hexadecyloxy)silane"),
        (of_class("trimethylsilyl ether", 14, 12), "trimethyl[(12-methyltetradecyl)oxy]silane"),
        (of_class("acetate", 14, 12), "12-methyltetradecyl acetate"),
        (of_class("pyrrolidide", 14, 13), "N-(13-methyltetradecanoyl)pyrrolidine"),
        (of_class("3-pyridylcarbinol ester", 18, 17), "3-pyridylmethyl 17-methyloctadecanoate"),
        (of_class("dimethyloxazoline", 18), "2-heptadecyl-4,4-dimethyl-4,5-dihydro-1,3-oxazole"),
        (of_class("dimethyloxazoline", 16, 2), "2-(1-methylpentadecyl)-4,4-dimethyl-4,5-dihydro-1,3-oxazole"),
    ],
)
def test_systematic_names_of_the_classes(chain: Chain, name: str) -> None:
    assert systematic_name(chain) == name


def test_a_methyl_ketone_counts_its_carbonyl_carbon_as_two() -> None:
    group = END_GROUPS["methyl ketone"]
    assert str(parse_systematic("4-methylpentan-2-one").formula) == "C6H12O"
    assert parse_systematic("3-methylbutan-2-one").methyls == (group.first_free,)
    assert parse_smiles("CC(=O)CC(C)C") == parse_systematic("4-methyl-2-pentanone")


@pytest.mark.parametrize(
    "text",
    [
        "5,11-Dimethylpentacosane",
        " 5, 11 - dimethyl pentacosane ",
        "5,11‑dimethyl–pentacosane",
        "(5R,11S)-5,11-dimethylpentacosane",
        "rac-5,11-DIMETHYLPENTACOSANE",
        "15,21-dimethylpentacosane",
        "5,11-diMeC25",
        "5,11-DiMe-C25",
        "5, 11-dimethylC25",
        "C[C@H](CCCC)CCCCC[C@@H](C)CCCCCCCCCCCCCC",
        "[CH3][CH2]CCC([CH3])CCCCC[CH](CCCCCCCCCCCCCC)C",
    ],
)
def test_spellings_of_one_alkane(text: str) -> None:
    assert parse_chain(text) == DIMETHYL


@pytest.mark.parametrize(
    ("text", "chain"),
    [
        ("n-pentacosane", Chain(25)),
        ("eicosane", Chain(20)),
        ("heneicosane", Chain(21)),
        ("12-METHYL-1-TRIDECANOL", of_class("alcohol", 13, 12)),
        ("octyl alcohol", of_class("alcohol", 8)),
        ("1-octylamine", of_class("amine", 8)),
        ("12-methyl-1-methoxytetradecane", of_class("methyl ether", 14, 12)),
        ("acetic acid octyl ester", of_class("acetate", 8)),
        ("19-methyleicosanoic acid trimethylsilyl ester", of_class("trimethylsilyl ester", 20, 19)),
        ("1-heptadecanoylpyrrolidine", of_class("pyrrolidide", 17)),
        ("pyridin-3-ylmethyl octadecanoate", of_class("3-pyridylcarbinol ester", 18)),
        ("methyl palmitate", of_class("methyl ester", 16)),
        ("Behenic acid", of_class("acid", 22)),
        ("iso-15:0", of_class("acid", 14, 13)),
        ("ai-C17:0 ME", of_class("methyl ester", 16, 14)),
        ("16:0", of_class("acid", 16)),
        ("10Me18:0 methyl ester", of_class("methyl ester", 18, 10)),
        ("3,7,11,15-tetraMe-16:0", of_class("acid", 16, 3, 7, 11, 15)),
        ("C1=CC(=CN=C1)COC(=O)CCCCCCC", of_class("3-pyridylcarbinol ester", 8)),
        ("[H]C([H])([H])C([H])([H])[H]", Chain(2)),
    ],
)
def test_other_spellings_are_read(text: str, chain: Chain) -> None:
    assert parse_chain(text) == chain


def test_twelve_methyls_are_named() -> None:
    chain = Chain(30, tuple(range(2, 26, 2)))
    assert systematic_name(chain).endswith("-dodecamethyltriacontane")
    assert parse_systematic(systematic_name(chain)) == chain


@pytest.mark.parametrize("carbons", range(1, 101))
def test_every_unbranched_alkane_is_named_and_read(carbons: int) -> None:
    assert parse_systematic(systematic_name(Chain(carbons))) == Chain(carbons)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "an empty name"),
        ("5,11-dimetylpentacosane", "did you mean '5,11-dimethylpentacosane'?"),
        ("hexadecanoic acd", "did you mean 'hexadecanoic acid'?"),
        ("xyzzy", "write it like"),
        ("3-ethyldecane", "branch longer than methyl"),
        ("cyclohexane", "has a ring"),
        ("1-octene", "is unsaturated"),
        ("alkene C27", "where the double bond is"),
        ("2,2-methylpentane", "2 positions for 1 methyls"),
        ("5,30-dimethylpentacosane", "use positions 2 to 24"),
        ("5,11-MeC25", "2 positions for 'Me'"),
        ("18:1", "is unsaturated"),
        ("18:0 sulfate", "unknown chain class 'sulfate'"),
        ("CCCC(CC)CCC", "the branch on position 4 is longer than methyl"),
        ("C1CCCCC1", "is cyclic"),
        ("CC=CC", "is unsaturated"),
        ("CCCCC=CCCO", "none of the end groups"),
        ("CCCBr", "its Br make none"),
        ("OCCCO", "its O make none"),
        ("CC(O)CC", "not at the end of a chain"),
        ("C(C)(C)(C)(C)C", "C with 5 bonds"),
        ("CC[CH2]", "C with 3 bonds"),
        ("CC(C", "left open"),
        ("CC)C", "character 3"),
        ("=CC", "an atom must come first"),
        ("C.C", "several molecules"),
        ("C[NH3+]", "character 2"),
    ],
)
def test_what_cannot_be_read_is_said_with_a_remedy(text: str, said: str) -> None:
    with pytest.raises(NamingError) as caught:
        parse_chain(text)
    assert said in str(caught.value)
    assert caught.value.remedy
    assert "\n" not in str(caught.value)


def test_an_alkene_is_called_by_its_size_and_has_no_line_notation() -> None:
    alkene = of_class("alkene", 27)
    assert systematic_name(alkene) == shorthand(alkene) == "alkene C27"
    with pytest.raises(NamingError, match="double bond"):
        smiles(alkene)


@pytest.mark.parametrize("name", ["methyl ketone", "dimethyloxazoline"])
def test_chains_too_short_for_their_class_have_no_name(name: str) -> None:
    with pytest.raises(NamingError, match="give at least"):
        systematic_name(of_class(name, 1))


def test_a_chain_longer_than_the_stems_has_no_name() -> None:
    with pytest.raises(NamingError, match="1 to 100"):
        systematic_name(Chain(101))


def test_two_longest_chains_give_one_structure() -> None:
    """2-methyl and C1 can change places: any numbering of the molecule is the same tuple."""
    assert parse_smiles("C(C)(C)CCC(C)C") == Chain(6, (2, 5), ALKANE)
    assert parse_smiles("CC(CCC(C)C)C") == Chain(6, (2, 5), ALKANE)
