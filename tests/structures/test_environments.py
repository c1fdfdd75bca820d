"""Environment classes and their coarser ones."""

import pytest
from rdkit import Chem

from shiftpred.structures import coarser_environment, compute_environments


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
