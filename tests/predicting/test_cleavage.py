"""Single cleavages against bonds cut one by one in a chemistry toolkit."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from rdkit import Chem

from branchpos.chain import Chain
from branchpos.predicting.cleavage import DEGREES, SURROUNDINGS, cleave, state_index, states


@st.composite
def alkanes(draw: st.DrawFn) -> Chain:
    """Draw any alkane of 4 to 40 backbone carbons and up to 5 methyls, geminal included."""
    backbone = draw(st.integers(4, 40))
    places = st.lists(st.integers(2, backbone - 1), max_size=5)
    methyls = [place for place, count in Counter(draw(places)).items() for _ in range(min(count, 2))]
    return Chain(backbone, tuple(methyls))


def molecule(chain: Chain) -> Chem.Mol:
    """Build the carbon skeleton atom by atom: backbone first, then the methyls."""
    skeleton = Chem.RWMol()
    for _ in range(chain.carbons):
        skeleton.AddAtom(Chem.Atom(6))
    bonds = [(i, i + 1) for i in range(chain.backbone - 1)]
    bonds += [(place - 1, chain.backbone + k) for k, place in enumerate(chain.methyls)]
    for first, second in bonds:
        skeleton.AddBond(first, second, Chem.BondType.SINGLE)
    return skeleton.GetMol()


def pieces(skeleton: Chem.Mol, bond: Chem.Bond) -> list[tuple[int, int]]:
    """Cut one bond; return (carbons, carbons bound to the end atom but one for its chain) of each piece."""
    cut = Chem.FragmentOnBonds(skeleton, [bond.GetIdx()], addDummies=False)
    sizes = {atom: len(piece) for piece in Chem.GetMolFrags(cut) for atom in piece}
    ends = (bond.GetBeginAtomIdx(), bond.GetEndAtomIdx())
    return [(sizes[end], max(cut.GetAtomWithIdx(end).GetDegree() - 1, 0)) for end in ends]


def cleaved(chain: Chain) -> tuple[Counter[tuple[int, int]], np.ndarray]:
    """Return (size, methyls on the end carbon) of every backbone cleavage, and the methyls lost alone."""
    found = cleave(chain.backbone, np.array([chain.methyls], dtype=np.int16).reshape(1, -1))
    pairs: Counter[tuple[int, int]] = Counter()
    for side in (found.left, found.right):
        own = states()[0][side.state[0]]
        pairs.update(zip(side.size[0].tolist(), own.tolist(), strict=True))
    return pairs, np.array([found.single[0], found.geminal[0]])


@settings(max_examples=60, deadline=None)
@given(alkanes())
def test_sizes_and_sites_are_those_of_bonds_cut_one_by_one(chain: Chain) -> None:
    """Every C-C bond of the backbone, cut in rdkit, gives the two pieces that ``cleave`` lists."""
    skeleton = molecule(chain)
    expected: Counter[tuple[int, int]] = Counter()
    for bond in skeleton.GetBonds():
        if max(bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()) < chain.backbone:
            expected.update(pieces(skeleton, bond))
    pairs, _ = cleaved(chain)
    assert sorted(size for size, _ in pairs.elements()) == sorted(size for size, _ in expected.elements())
    sites = {pair: count for pair, count in pairs.items() if pair[0] > 1 and pair[1] > 0}
    branched = {pair: count for pair, count in expected.items() if pair[1] > 0}
    assert sites == branched


@settings(max_examples=40, deadline=None)
@given(alkanes())
def test_methyls_lost_alone_are_counted_by_carbon(chain: Chain) -> None:
    single, geminal = cleaved(chain)[1]
    assert single + 2 * geminal == len(chain.methyls)
    assert geminal == sum(count == 2 for count in Counter(chain.methyls).values())


@given(alkanes())
def test_the_two_sides_of_a_bond_hold_all_carbons(chain: Chain) -> None:
    rows = np.array([chain.methyls], dtype=np.int16).reshape(1, -1)
    found = cleave(chain.backbone, rows)
    assert (found.left.size + found.right.size == chain.carbons).all()


@given(alkanes())
def test_both_numberings_give_the_same_ions(chain: Chain) -> None:
    rows = np.array([chain.methyls], dtype=np.int16).reshape(1, -1)
    one, other = cleave(chain.backbone, rows), cleave(chain.backbone, chain.backbone + 1 - rows)
    assert np.array_equal(one.left.size, other.right.size[:, ::-1])
    assert np.array_equal(one.left.state, other.right.state[:, ::-1])


def test_complementary_ions_hold_two_carbons_more_than_the_molecule() -> None:
    """The two secondary ions of one branch share its carbon and methyl (common practice)."""
    for chain in (Chain(25, (5, 11)), Chain(30, (13,)), Chain(21, (4, 8, 12))):
        pairs, _ = cleaved(chain)
        secondary = [size for (size, own), count in pairs.items() if own == 1 for _ in range(count)]
        assert len(secondary) == 2 * len(chain.methyls)
        assert sum(secondary) == len(chain.methyls) * (chain.carbons + 2)


@pytest.mark.parametrize("state", range(DEGREES * DEGREES * SURROUNDINGS))
def test_states_pack_and_unpack(state: int) -> None:
    own, other, around = (part[state : state + 1] for part in states())
    assert state_index(own, other, around).tolist() == [state]
