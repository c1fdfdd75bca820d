"""Rivals by where something sits on a chain."""

import pytest
from rdkit import Chem

from shiftpred.structures.rivals import build_rivals


def _isomers(smiles, limit=80):
    rivals = build_rivals(Chem.MolFromSmiles(smiles), limit, mass_confirmed=True)
    return {rival.smiles: rival.how for rival in rivals}


BUTYLS = {
    "butyl": "CCCCOC(=O)c1ccccc1",
    "isobutyl": "CC(C)COC(=O)c1ccccc1",
    "sec-butyl": "CCC(C)OC(=O)c1ccccc1",
    "tert-butyl": "CC(C)(C)OC(=O)c1ccccc1",
}


@pytest.mark.parametrize("own", BUTYLS)
def test_the_four_butyl_benzoates_are_rivals_of_one_another(own):
    others = {smiles for name, smiles in BUTYLS.items() if name != own}
    assert others <= set(_isomers(BUTYLS[own], 40))


def test_propyl_and_isopropyl():
    assert _isomers("CCCc1ccccc1")["CC(C)c1ccccc1"] == "isopropyl instead of propyl"
    assert _isomers("CC(C)c1ccccc1")["CCCc1ccccc1"] == "propyl instead of isopropyl"


@pytest.mark.parametrize(
    ("what", "smiles", "expected"),
    [
        ("hydroxy along the chain", "CCC(O)c1ccccc1", "CC(O)Cc1ccccc1"),
        ("hydroxy to the end", "CCC(O)c1ccccc1", "OCCCc1ccccc1"),
        ("methyl along the chain", "CC(C)CCCO", "CCC(C)CCO"),
        ("chloro onto the side chain", "Cc1ccc(Cl)cc1", "ClCc1ccccc1"),
        ("bromo from the side chain", "BrCc1ccccc1", "Cc1ccccc1Br"),
        ("xylene and ethylbenzene", "Cc1ccccc1C", "CCc1ccccc1"),
        ("benzyl and tolyl", "CC(=O)OCc1ccccc1", "CC(=O)Oc1ccc(C)cc1"),
        ("tolyl and benzyl", "CC(=O)Oc1ccc(C)cc1", "CC(=O)OCc1ccccc1"),
        ("methylene across an ester", "CCOC(C)=O", "CCC(=O)OC"),
        ("methylene across an amine", "CCNCC", "CCCNC"),
        ("acetamido from a benzylic ring carbon", "CC(=O)NC1c2ccccc2Oc2ccccc21", "CC(=O)Nc1ccc2c(c1)Cc1ccccc1O2"),
        ("phenyl across a double bond", "C=C(c1ccccc1)c1ccccc1", "C(=Cc1ccccc1)c1ccccc1"),
        ("N-methyl onto the ring", "CNc1ccccc1", "Cc1ccccc1N"),
    ],
)
def test_groups_move(what, smiles, expected):
    assert Chem.CanonSmiles(expected) in _isomers(smiles), what


@pytest.mark.parametrize(
    ("smiles", "expected"),
    [("C=CCc1ccccc1", "CC=Cc1ccccc1"), ("CCCC#C", "CCC#CC"), ("CC1=CCCCC1", "C=C1CCCCC1")],
)
def test_multiple_bonds_walk(smiles, expected):
    found = {Chem.CanonSmiles(rival, useChiral=False) for rival in _isomers(smiles)}
    assert Chem.CanonSmiles(expected) in found


def test_no_double_bond_walks_into_a_bridgehead():
    # norbornene: the neighbours of its double bond are the bridgeheads (Bredt)
    for rival in _isomers("C1=CC2CCC1C2"):
        mol = Chem.MolFromSmiles(rival)
        bridgeheads = []
        Chem.rdMolDescriptors.CalcNumBridgeheadAtoms(mol, atoms=bridgeheads)
        for index in bridgeheads:
            bonds = mol.GetAtomWithIdx(index).GetBonds()
            assert all(bond.GetBondType() == Chem.BondType.SINGLE for bond in bonds), rival
