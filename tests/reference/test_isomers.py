"""Numbers of isomers against a general chemistry toolkit and against published counts."""

from __future__ import annotations

from functools import cache

import pytest
from rdkit import Chem

from branchpos.enumerating import count_alkanes, enumerate_alkanes
from branchpos.errors import NamingError
from branchpos.naming import parse_smiles, smiles

ALL_ALKANES = (1, 1, 1, 2, 3, 5, 9, 18, 35, 75)
"""OEIS A000602, structural isomers of the alkanes C1 to C10."""


def canonical(notation: str) -> str:
    return Chem.MolToSmiles(Chem.MolFromSmiles(notation))


@pytest.mark.parametrize("methyls", range(5))
def test_every_structure_is_another_molecule_up_to_c20(methyls: int) -> None:
    """As many canonical line notations as the closed form says: none twice, none the same by another name."""
    for carbons in range(1, 21):
        distinct = {canonical(smiles(chain)) for chain in enumerate_alkanes(carbons, methyls)}
        assert len(distinct) == count_alkanes(carbons, methyls)


@cache
def grown_alkanes(carbons: int) -> frozenset[str]:
    """Return every alkane of so many carbons, by adding a carbon at every place of the next smaller ones."""
    if carbons == 1:
        return frozenset({"C"})
    grown = set()
    for notation in grown_alkanes(carbons - 1):
        molecule = Chem.MolFromSmiles(notation)
        for atom in molecule.GetAtoms():
            if atom.GetDegree() < 4:
                larger = Chem.RWMol(molecule)
                larger.AddBond(atom.GetIdx(), larger.AddAtom(Chem.Atom("C")), Chem.BondType.SINGLE)
                Chem.SanitizeMol(larger)
                grown.add(Chem.MolToSmiles(larger))
    return frozenset(grown)


def has_only_methyl_branches(notation: str) -> bool:
    """Tell by the toolkit's distances: take away one longest chain, and only single carbons are left."""
    molecule = Chem.MolFromSmiles(notation)
    distances = Chem.GetDistanceMatrix(molecule)
    start, end = divmod(int(distances.argmax()), molecule.GetNumAtoms())
    path = set(Chem.GetShortestPath(molecule, start, end)) if start != end else {start}
    return all(atom.GetDegree() == 1 for atom in molecule.GetAtoms() if atom.GetIdx() not in path)


@pytest.mark.parametrize("carbons", range(1, 11))
def test_every_alkane_with_only_methyl_branches_is_found(carbons: int) -> None:
    everything = grown_alkanes(carbons)
    assert len(everything) == ALL_ALKANES[carbons - 1]
    wanted = {notation for notation in everything if has_only_methyl_branches(notation)}
    found = {
        canonical(smiles(chain))
        for methyls in range(carbons)
        for chain in enumerate_alkanes(carbons, methyls)
    }
    assert found == wanted


def test_octanes_by_hand() -> None:
    """Of the 18 octanes three carry an ethyl: 3-ethylhexane and two ethylmethylpentanes (textbook list)."""
    assert sum(count_alkanes(8, methyls) for methyls in range(8)) == 18 - 3


@pytest.mark.parametrize("carbons", range(3, 11))
def test_the_reader_takes_exactly_the_methyl_branched_alkanes(carbons: int) -> None:
    for notation in grown_alkanes(carbons):
        if has_only_methyl_branches(notation):
            assert canonical(smiles(parse_smiles(notation))) == notation
        else:
            with pytest.raises(NamingError, match="longer than methyl"):
                parse_smiles(notation)
