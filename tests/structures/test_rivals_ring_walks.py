"""Rivals by what sits where on a ring."""

import pytest
from rdkit import Chem

from shiftpred.structures.rivals import build_rivals


def _isomers(smiles, limit=60):
    rivals = build_rivals(Chem.MolFromSmiles(smiles), limit, mass_confirmed=True)
    return {rival.smiles: rival.how for rival in rivals}


@pytest.mark.parametrize(
    ("compound", "smiles", "expected"),
    [
        ("4'-fluoroacetophenone", "CC(=O)c1ccc(F)cc1", ["CC(=O)c1cccc(F)c1", "CC(=O)c1ccccc1F"]),
        ("methyl 3-nitrobenzoate", "COC(=O)c1cccc([N+](=O)[O-])c1", ["COC(=O)c1ccc([N+](=O)[O-])cc1"]),
        ("5-methoxyindole", "COc1ccc2[nH]ccc2c1", ["COc1ccc2cc[nH]c2c1", "COc1cccc2[nH]ccc12"]),
        ("1-naphthol", "Oc1cccc2ccccc12", ["Oc1ccc2ccccc2c1"]),
        ("2-methylfuran", "Cc1ccco1", ["Cc1ccoc1"]),
        ("2-methylcyclohexanone", "CC1CCCCC1=O", ["CC1CCCC(=O)C1", "CC1CCC(=O)CC1"]),
        ("3-acetylpyridine", "CC(=O)c1cccnc1", ["CC(=O)c1ccncc1", "CC(=O)c1ccccn1"]),
    ],
)
def test_substituents_walk_around_a_ring(compound, smiles, expected):
    found = _isomers(smiles)
    assert not [rival for rival in map(Chem.CanonSmiles, expected) if rival not in found], compound


def test_two_substituents_swap():
    # 4-bromo-2,6-dimethylanisole: no single substituent walks to 4-methoxy-2,6-dimethylbromobenzene
    found = _isomers("COc1c(C)cc(Br)cc1C")
    assert found[Chem.CanonSmiles("Brc1c(C)cc(OC)cc1C")] == "bromo and methoxy swapped on the ring"


@pytest.mark.parametrize(
    ("compound", "smiles", "expected"),
    [
        ("quinoline", "c1ccc2ncccc2c1", "c1ccc2cnccc2c1"),
        ("pyrimidin-2-yl ether", "COc1ncccn1", "COc1cnccn1"),
        ("3,5-dimethylisoxazole", "Cc1cc(C)on1", "Cc1cnc(C)o1"),
        ("2-methylthiazole", "Cc1nccs1", "Cc1ccns1"),
        ("1,4-dimethylpyrazole", "Cc1cnn(C)c1", "Cc1cn(C)cn1"),
    ],
)
def test_ring_heteroatoms_walk(compound, smiles, expected):
    assert Chem.CanonSmiles(expected) in _isomers(smiles), compound


@pytest.mark.parametrize(
    ("compound", "smiles", "expected"),
    [
        ("1-methylindazole", "Cn1ncc2ccccc21", "Cn1cc2ccccc2n1"),
        ("1-methyl-3-phenylpyrazole", "Cn1ccc(-c2ccccc2)n1", "Cn1nccc1-c1ccccc1"),
        ("1-methyl-5-phenyltetrazole", "Cn1nnnc1-c1ccccc1", "Cn1nnc(-c2ccccc2)n1"),
        ("1-benzyl-4-phenyl-1,2,3-triazole", "c1ccc(Cn2cc(-c3ccccc3)nn2)cc1", "c1ccc(Cn2nncc2-c2ccccc2)cc1"),
        ("1,4-dimethylimidazole", "Cc1cn(C)cn1", "Cc1cncn1C"),
    ],
)
def test_azole_nitrogen_isomers(compound, smiles, expected):
    rivals = build_rivals(Chem.MolFromSmiles(smiles), 9)
    how = {rival.smiles: rival.how for rival in rivals}
    assert "nitrogen of the azole" in how[Chem.CanonSmiles(expected)], compound


def test_heteroatom_walks_under_its_substituent():
    found = _isomers("c1ccc(CN2CCCCC2)cc1")
    assert Chem.CanonSmiles("c1ccc(CC2CCNCC2)cc1") in found
    assert Chem.CanonSmiles("c1ccc(-c2ccc[nH]2)cc1") in _isomers("c1ccc(-n2cccc2)cc1")


def test_a_substituent_sits_on_another_ring():
    found = _isomers("O=C(Nc1ccccc1)c1ccc(Cl)cc1")
    assert found[Chem.CanonSmiles("O=C(Nc1cccc(Cl)c1)c1ccccc1")] == "chloro on another ring"


def test_rings_fused_elsewhere():
    assert Chem.CanonSmiles("NCCc1cccc2c1OCO2") in _isomers("NCCc1ccc2OCOc2c1")
    assert Chem.CanonSmiles("c1ccc2c(c1)ccc1ccccc12") in _isomers("c1ccc2cc3ccccc3cc2c1")


def test_how_names_group_and_places():
    assert _isomers("CC(=O)c1ccc(F)cc1")["CC(=O)c1cccc(F)c1"] == "acetyl walked from para to meta of fluoro"
    assert _isomers("COc1cccnc1")["COc1ccncc1"] == "methoxy walked from 2 to 3 bonds away from the ring's nitrogen"
