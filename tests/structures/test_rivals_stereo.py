"""Stereoisomers as rivals: those that NMR can see, and no others."""

from rdkit import Chem
from rdkit.Chem.EnumerateStereoisomers import EnumerateStereoisomers

from shiftpred.structures.rivals import build_rivals


def _stereoisomers(smiles, limit=60):
    rivals = build_rivals(Chem.MolFromSmiles(smiles), limit, mass_confirmed=True)
    return {rival.smiles: rival.how for rival in rivals if rival.kind == "stereoisomer"}


def _mirror(smiles):
    turned = smiles.replace("@@", "§").replace("@", "@@").replace("§", "@")
    return Chem.CanonSmiles(turned)


def test_e_and_z():
    found = _stereoisomers("COC(=O)/C=C/c1ccccc1")
    assert found == {Chem.CanonSmiles("COC(=O)/C=C\\c1ccccc1"): "Z instead of E at a double bond"}
    assert Chem.CanonSmiles("OC(=O)/C=C/C(=O)O") in _stereoisomers("OC(=O)/C=C\\C(=O)O")


def test_ring_cis_and_trans():
    found = _stereoisomers("C[C@H]1CC[C@H](O)CC1")
    assert list(found) == [Chem.CanonSmiles("C[C@H]1CC[C@@H](O)CC1")]
    assert list(found.values())[0].startswith("cis/trans isomer: ")


def test_meso_and_chiral_butanediol_are_one_pair():
    meso, chiral = Chem.CanonSmiles("C[C@H](O)[C@@H](C)O"), Chem.CanonSmiles("C[C@H](O)[C@H](C)O")
    forms = {meso, chiral, _mirror(chiral)}
    assert len(forms) == 3
    for form in forms:
        found = set(_stereoisomers(form))
        assert len(found) == 1
        assert found != {_mirror(form)}


def test_one_stereocentre_has_no_stereoisomer_among_the_rivals():
    assert _stereoisomers("C[C@H](N)C(=O)OC") == {}


def test_never_the_enantiomer():
    for smiles in (
        "C[C@@H]1CC[C@@H](C(C)C)[C@H](O)C1",
        "OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O",
        "CN[C@H]1CC[C@@H](c2ccc(Cl)c(Cl)c2)c2ccccc12",
        "C[C@H](O)[C@H](C)O",
    ):
        rivals = [rival.smiles for rival in build_rivals(Chem.MolFromSmiles(smiles), 60)]
        assert _mirror(smiles) not in rivals
        assert not {_mirror(rival) for rival in rivals if "@" in rival and _mirror(rival) != rival} & set(rivals)


def test_every_epimer_of_menthol_is_found():
    menthol = "C[C@@H]1CC[C@@H](C(C)C)[C@H](O)C1"
    forms = {Chem.MolToSmiles(mol) for mol in EnumerateStereoisomers(Chem.MolFromSmiles("CC1CCC(C(C)C)C(O)C1"))}
    pairs = {min(form, _mirror(form)) for form in forms}
    assert len(pairs) == 4
    found = {min(form, _mirror(form)) for form in _stereoisomers(menthol)}
    assert found == pairs - {min(Chem.CanonSmiles(menthol), _mirror(menthol))}


def test_isomers_are_not_the_proposal_without_its_configuration():
    # swapping the 1- and 4-substituents of a tetralin gives the same constitution again
    sertraline = "CN[C@H]1CC[C@@H](c2ccc(Cl)c(Cl)c2)c2ccccc12"
    flat = Chem.CanonSmiles(sertraline, useChiral=False)
    for rival in build_rivals(Chem.MolFromSmiles(sertraline), 60):
        if rival.kind != "stereoisomer":
            assert Chem.CanonSmiles(rival.smiles, useChiral=False) != flat


def test_configuration_elsewhere_is_kept():
    # the chlorine walks, the two stereocentres and the double bond stay as they are
    found = [rival.smiles for rival in build_rivals(Chem.MolFromSmiles("C/C=C/C(=O)Oc1ccc(Cl)cc1"), 9)]
    assert Chem.CanonSmiles("C/C=C/C(=O)Oc1cccc(Cl)c1") in found
    found = [rival.smiles for rival in build_rivals(Chem.MolFromSmiles("C[C@H](O)[C@H](C)c1ccc(Cl)cc1"), 9)]
    assert Chem.CanonSmiles("C[C@H](O)[C@H](C)c1cccc(Cl)c1") in found
