"""What holds for every chain: three ways there and back, and the backbone is the longest chain."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from rdkit import Chem
from rdkit.Chem import rdMolDescriptors

from branchpos.chain import Chain
from branchpos.end_group import ALKANE, END_GROUPS, EndGroup
from branchpos.errors import NamingError
from branchpos.masses import parse_formula
from branchpos.naming import (
    parse_chain,
    parse_shorthand,
    parse_smiles,
    parse_systematic,
    shorthand,
    smiles,
    systematic_name,
)

GROUPS = tuple(group for group in END_GROUPS.values() if group.name != "alkene")


@st.composite
def chains(draw: st.DrawFn, groups: tuple[EndGroup, ...] = GROUPS, longest: int = 99) -> Chain:
    """Draw a chain of 3 carbons or more with up to twelve methyls, geminal ones included."""
    group = draw(st.sampled_from(groups))
    backbone = draw(st.integers(3, longest))
    places = [p for p in range(group.first_free, backbone) for _ in range(2)]
    methyls = draw(st.lists(st.sampled_from(range(len(places))), unique=True, max_size=12)) if places else []
    return Chain(backbone, tuple(places[i] for i in methyls), group)


alkanes = chains(groups=(ALKANE,), longest=40)


@given(chains())
def test_systematic_names_round_trip(chain: Chain) -> None:
    assert parse_systematic(systematic_name(chain)) == chain
    assert parse_chain(systematic_name(chain).upper()) == chain


@given(chains())
def test_shorthand_round_trips(chain: Chain) -> None:
    assert parse_shorthand(shorthand(chain)) == parse_chain(shorthand(chain).upper()) == chain


@given(chains())
def test_line_notation_round_trips(chain: Chain) -> None:
    assert parse_smiles(smiles(chain)) == parse_chain(smiles(chain)) == chain


@settings(deadline=None)
@given(chains(longest=40), st.integers(0, 2**31 - 1))
def test_line_notation_in_any_order_of_atoms_is_the_same_chain(chain: Chain, seed: int) -> None:
    molecule = Chem.MolFromSmiles(smiles(chain))
    for shuffled in Chem.MolToRandomSmilesVect(molecule, 3, randomSeed=seed):
        assert parse_smiles(shuffled) == chain
    assert parse_smiles(Chem.MolToSmiles(molecule, allHsExplicit=True)) == chain
    assert parse_smiles(Chem.MolToSmiles(molecule, kekuleSmiles=False)) == chain


@settings(deadline=None)
@given(chains())
def test_formula_is_that_of_the_line_notation(chain: Chain) -> None:
    formula = rdMolDescriptors.CalcMolFormula(Chem.MolFromSmiles(smiles(chain)))
    assert parse_formula(formula) == chain.formula


@settings(deadline=None)
@given(alkanes)
def test_the_backbone_is_the_longest_chain_of_an_alkane(chain: Chain) -> None:
    """By the toolkit's distances: methyls on positions 2 to n - 1 never make a longer chain."""
    distances = Chem.GetDistanceMatrix(Chem.MolFromSmiles(smiles(chain)))
    assert int(np.max(distances)) + 1 == chain.backbone


@given(alkanes)
def test_both_numberings_of_an_alkane_are_one_chain(chain: Chain) -> None:
    mirrored = Chain(chain.backbone, tuple(chain.backbone + 1 - p for p in chain.methyls))
    assert mirrored == chain
    assert chain.methyls <= tuple(chain.backbone + 1 - p for p in reversed(chain.methyls))


@settings(deadline=None)
@given(alkanes, alkanes)
def test_two_alkanes_are_equal_exactly_when_their_molecules_are(a: Chain, b: Chain) -> None:
    same = Chem.CanonSmiles(smiles(a)) == Chem.CanonSmiles(smiles(b))
    assert same == (a == b)


@settings(deadline=None)
@given(st.text(max_size=40) | st.text(alphabet="CNO()=[]@H123456789.-,:methylanoicd ", max_size=30))
def test_any_text_is_read_or_refused_with_a_remedy(text: str) -> None:
    try:
        chain = parse_chain(text)
    except NamingError as error:
        assert error.remedy
    else:
        assert chain.backbone >= 1
