"""Environment classes and their coarser ones."""

from pathlib import Path

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.structures import coarser_environment, compute_environments


@pytest.fixture(scope="module")
def molecules():
    lines = (Path(__file__).parent / "molecules.smi").read_text(encoding="utf-8").splitlines()
    return [line.split()[0] for line in lines]


@pytest.mark.parametrize(
    "smiles, atom, nucleus, name",
    [
        ("CCO", 0, "13C", "sp3 CH3, on C only"),
        ("CCO", 1, "13C", "sp3 CH2, on O"),
        ("CCO", 2, "13C", None),
        ("CCO", 2, "1H", "O-H, alcohol"),
        ("c1ccccc1O", 0, "13C", "aromatic CH"),
        ("c1ccccc1O", 5, "13C", "aromatic C, on O"),
        ("c1ccccc1O", 6, "1H", "O-H, phenol"),
        ("c1ccncc1", 2, "13C", "heteroaromatic CH, beside heteroatom"),
        ("c1ccncc1", 0, "13C", "heteroaromatic CH"),
        ("CC(=O)C", 1, "13C", "carbonyl C=O, ketone"),
        ("CC=O", 1, "1H", "carbonyl C=O, aldehyde"),
        ("CC(=O)OC", 1, "13C", "carbonyl C=O, on O"),
        ("CC(=O)N", 1, "13C", "carbonyl C=O, on N"),
        ("CC(=O)N", 3, "1H", "N-H, amide"),
        ("CC#N", 1, "13C", "sp nitrile C"),
        ("C#CC", 0, "13C", "sp alkyne C"),
        ("C=C=C", 1, "13C", "sp cumulene C"),
        ("C=CC", 1, "13C", "alkene CH, on C only"),
        ("C=CO", 1, "13C", "alkene CH, on heteroatom"),
        ("COCO", 2, "13C", "sp3 CH2, on O and another heteroatom"),
        ("CCl", 0, "13C", "sp3 CH3, on halogen"),
        ("C[Sn](C)(C)C", 0, "13C", "unusual CH3, on metal"),
        ("CS", 1, "1H", "S-H"),
        ("CC(C)=NO", 1, "13C", "sp2 C=N, without H"),
        ("CC(N)=S", 1, "13C", "sp2 C=S"),
    ],
)
def test_classes(smiles, atom, nucleus, name):
    assert compute_environments(Chem.MolFromSmiles(smiles), nucleus)[atom] == name


def test_chain_of_coarser_classes_ends():
    name, chain = "sp3 CH2, on O", []
    while name:
        chain.append(name)
        name = coarser_environment(name)
    assert chain == ["sp3 CH2, on O", "sp3 CH2", "sp3"]


@pytest.mark.parametrize(
    "smiles", ["CC1(C)SC2CC(=O)N2C1C(=O)O", "FN1CCCC1(F)F", "O=P1(Cl)CSC1", "CC(Br)P(C)(C)=O", "COC(Cl)N(C)C"]
)
def test_two_heteroatoms_in_any_order(smiles):
    mol = Chem.MolFromSmiles(smiles)
    expected = compute_environments(mol, "13C")
    for seed in range(8):
        order = np.random.default_rng(seed).permutation(mol.GetNumAtoms()).tolist()
        assert compute_environments(Chem.RenumberAtoms(mol, order), "13C") == [expected[i] for i in order]


def test_every_class_has_a_chain_that_ends(molecules):
    names = {
        name
        for smiles in molecules
        for nucleus in ("13C", "1H")
        for name in compute_environments(Chem.MolFromSmiles(smiles), nucleus)
    }
    assert len(names - {None}) > 40
    for name in names - {None}:
        for _ in range(3):
            name = coarser_environment(name)
        assert name == ""


def test_none_where_there_is_no_such_nucleus(molecules):
    for smiles in molecules:
        mol = Chem.MolFromSmiles(smiles)
        for atom, carbon, hydrogen in zip(mol.GetAtoms(), compute_environments(mol, "13C"), compute_environments(mol, "1H")):
            assert (carbon is None) == (atom.GetAtomicNum() != 6)
            assert (hydrogen is None) == (atom.GetTotalNumHs() == 0)
