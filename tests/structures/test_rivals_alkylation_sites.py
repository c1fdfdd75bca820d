"""Rivals by which heteroatom carries a carbon group."""

import pytest
from rdkit import Chem

from shiftpred.structures.rivals import build_rivals


def _first(smiles, limit):
    return {rival.smiles: rival.how for rival in build_rivals(Chem.MolFromSmiles(smiles), limit)}


@pytest.mark.parametrize(
    ("compound", "smiles", "expected"),
    [
        ("2-methoxypyridine", "COc1ccccn1", "Cn1ccccc1=O"),
        ("N-methyl-2-pyridone", "Cn1ccccc1=O", "COc1ccccn1"),
        ("4-methoxyquinoline", "COc1ccnc2ccccc12", "Cn1ccc(=O)c2ccccc12"),
        ("2-(methylsulfanyl)pyridine", "CSc1ccccn1", "Cn1ccccc1=S"),
        ("O-methylcaprolactim", "COC1=NCCCCC1", "CN1CCCCCC1=O"),
    ],
)
def test_nitrogen_against_oxygen_is_among_the_first_five(compound, smiles, expected):
    assert "instead of" in _first(smiles, 5)[Chem.CanonSmiles(expected)], compound


@pytest.mark.parametrize(
    ("compound", "smiles", "expected", "how"),
    [
        ("creosol", "COc1cc(C)ccc1O", "COc1ccc(C)cc1O", "methyl on another oxygen"),
        (
            "paracetamol",
            "CC(=O)Nc1ccc(O)cc1",
            "CC(=O)Oc1ccc(N)cc1",
            "acetyl on oxygen instead of nitrogen",
        ),
        (
            "methyl salicylate",
            "COC(=O)c1ccccc1O",
            "COc1ccccc1C(=O)O",
            "methyl on another oxygen",
        ),
        (
            "4-hydroxy-N-methylbenzamide",
            "CNC(=O)c1ccc(O)cc1",
            "COc1ccc(C(N)=O)cc1",
            "methyl on oxygen instead of nitrogen",
        ),
    ],
)
def test_groups_move_between_heteroatoms(compound, smiles, expected, how):
    assert _first(smiles, 9)[Chem.CanonSmiles(expected)] == how, compound
