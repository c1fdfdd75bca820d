"""Rivals by turning an unsymmetrical link round."""

import pytest
from rdkit import Chem

from shiftpred.structures.rivals import build_rivals
from shiftpred.structures.rivals.candidate_queues import build_structure
from shiftpred.structures.rivals.turned_groups import LINKS, build_turned_groups
from shiftpred.structures.rivals.workspace import Workspace


def _isomers(smiles, limit=40):
    rivals = build_rivals(Chem.MolFromSmiles(smiles), limit, mass_confirmed=True)
    return {rival.smiles: rival.how for rival in rivals}


TURNED = [
    ("ester", "CCOC(=O)c1ccccc1", "CCC(=O)Oc1ccccc1"),
    ("thioester", "CCSC(=O)c1ccccc1", "CCC(=O)Sc1ccccc1"),
    ("amide", "CC(=O)Nc1ccc(O)cc1", "CNC(=O)c1ccc(O)cc1"),
    ("sulfonamide", "CS(=O)(=O)Nc1ccccc1", "CNS(=O)(=O)c1ccccc1"),
    ("sulfonate", "CS(=O)(=O)Oc1ccccc1", "COS(=O)(=O)c1ccccc1"),
    ("carbamate", "COC(=O)Nc1ccccc1", "CNC(=O)Oc1ccccc1"),
    ("ketone", "CCC(=O)c1ccccc1", "CC(=O)Cc1ccccc1"),
    ("enone", "COc1ccc(C(=O)/C=C/c2ccccc2)cc1", "COc1ccc(/C=C/C(=O)c2ccccc2)cc1"),
    ("ester with its CH2", "O=C(OCc1ccccc1)c1ccccc1C", "Cc1ccccc1COC(=O)c1ccccc1"),
    ("amide with its CH2", "Cc1ccc(C(=O)NCc2ccccc2)cc1", "Cc1ccc(CNC(=O)c2ccccc2)cc1"),
    ("ether", "Cc1ccc(OCc2ccccc2)cc1", "Cc1ccc(COc2ccccc2)cc1"),
    ("thioether", "Cc1ccc(SCc2ccccc2)cc1", "Cc1ccc(CSc2ccccc2)cc1"),
    ("amine", "Cc1ccc(NCc2ccccc2)cc1", "Cc1ccc(CNc2ccccc2)cc1"),
    ("imine", "COc1ccc(/N=C/c2ccccc2)cc1", "COc1ccc(/C=N/c2ccccc2)cc1"),
]


@pytest.mark.parametrize(("link", "smiles", "expected"), TURNED)
def test_link_turns_round(link, smiles, expected):
    workspace = Workspace(Chem.CanonSmiles(smiles))
    turned = {}
    for candidate in build_turned_groups(workspace):
        mol = build_structure(workspace, candidate)
        if mol is not None:
            turned[Chem.CanonSmiles(Chem.MolToSmiles(mol))] = candidate.how()
    assert turned[Chem.CanonSmiles(expected)].startswith(f"{link} turned round")
    # and it goes on the list, by this move or by another one that leads there too
    assert Chem.CanonSmiles(expected) in _isomers(smiles)


def test_every_link_has_a_compound_here():
    assert {name for name, *_ in LINKS} == {name for name, *_ in TURNED}


def test_phenyl_propanoate_is_the_nearest_isomer_of_ethyl_benzoate():
    rivals = build_rivals(Chem.MolFromSmiles("CCOC(=O)c1ccccc1"), 9, mass_confirmed=True)
    assert rivals[0].smiles == "CCC(=O)Oc1ccccc1"


def test_a_hydrogen_may_be_an_end():
    assert _isomers("COc1ccccc1")["OCc1ccccc1"] == "CH2-OH instead of O-CH3"
    assert _isomers("O=CCc1ccccc1")["CC(=O)c1ccccc1"] == "methyl ketone instead of the aldehyde"
    assert _isomers("CNc1ccccc1")["NCc1ccccc1"] == "aminomethyl (CH2-N) instead of N-CH3"


def test_configuration_survives_the_turn():
    # the carbonyl carbon takes nitrogen's place at the stereocentre
    assert Chem.CanonSmiles("CNC(=O)[C@@H](C)c1ccccc1") in _isomers("CC(=O)N[C@@H](C)c1ccccc1")
    assert Chem.CanonSmiles("CNC(=O)[C@H](C)c1ccccc1") in _isomers("CC(=O)N[C@H](C)c1ccccc1")
