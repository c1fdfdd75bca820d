"""The list of rivals as a whole: what comes first, what never comes, and the same list every time."""

import random
import time

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from rdkit import Chem
from rdkit.Chem import rdMolDescriptors

from shiftpred.errors import SettingError, StructureError
from shiftpred.records import Rival, Structure
from shiftpred.structures.rivals import build_rivals

DRUG_SIZED = {
    "celecoxib": "Cc1ccc(-c2cc(C(F)(F)F)nn2-c2ccc(S(N)(=O)=O)cc2)cc1",
    "diclofenac": "OC(=O)Cc1ccccc1Nc1c(Cl)cccc1Cl",
    "ibuprofen": "CC(C)Cc1ccc(C(C)C(=O)O)cc1",
    "imatinib": "CN1CCN(Cc2ccc(C(=O)Nc3ccc(C)c(Nc4nccc(-c5cccnc5)n4)c3)cc2)CC1",
    "lidocaine": "CCN(CC)CC(=O)Nc1c(C)cccc1C",
    "losartan": "CCCCc1nc(Cl)c(CO)n1Cc1ccc(-c2ccccc2-c2nnn[nH]2)cc1",
    "omeprazole": "COc1ccc2[nH]c(S(=O)Cc3ncc(C)c(OC)c3C)nc2c1",
    "sertraline": "CN[C@H]1CC[C@@H](c2ccc(Cl)c(Cl)c2)c2ccccc12",
    "sildenafil": "CCCc1nn(C)c2c1nc(-c1cc(S(=O)(=O)N3CCN(C)CC3)ccc1OCC)[nH]c2=O",
    "warfarin": "CC(=O)CC(c1ccccc1)c1c(O)c2ccccc2oc1=O",
}


def _mol(smiles):
    return Chem.MolFromSmiles(smiles)


def _smiles(rivals):
    return [rival.smiles for rival in rivals]


@pytest.mark.parametrize(
    ("proposal", "smiles", "rival", "within"),
    [
        ("ethyl benzoate", "CCOC(=O)c1ccccc1", "CCC(=O)Oc1ccccc1", 1),
        ("phenyl propanoate", "CCC(=O)Oc1ccccc1", "CCOC(=O)c1ccccc1", 3),
        ("4'-fluoroacetophenone", "CC(=O)c1ccc(F)cc1", "CC(=O)c1cccc(F)c1", 3),
        ("4'-fluoroacetophenone", "CC(=O)c1ccc(F)cc1", "CC(=O)c1ccccc1F", 3),
        ("2-methoxypyridine", "COc1ccccn1", "Cn1ccccc1=O", 5),
        ("creosol", "COc1cc(C)ccc1O", "COc1ccc(C)cc1O", 9),
        ("2-methoxy-5-methylphenol", "COc1ccc(C)cc1O", "COc1cc(C)ccc1O", 9),
        ("methyl 3-nitrobenzoate", "COC(=O)c1cccc([N+](=O)[O-])c1", "COC(=O)c1ccc([N+](=O)[O-])cc1", 3),
        ("methyl 4-nitrobenzoate", "COC(=O)c1ccc([N+](=O)[O-])cc1", "COC(=O)c1cccc([N+](=O)[O-])c1", 3),
        ("paracetamol", "CC(=O)Nc1ccc(O)cc1", "CNC(=O)c1ccc(O)cc1", 9),
        ("aspirin", "CC(=O)Oc1ccccc1C(=O)O", "O=C(O)c1ccccc1O", 9),
    ],
)
def test_the_confusion_that_a_chemist_expects_comes_early(proposal, smiles, rival, within):
    rivals = build_rivals(_mol(smiles), 9)
    assert Chem.CanonSmiles(rival) in _smiles(rivals)[:within], proposal


@pytest.mark.parametrize("name", DRUG_SIZED)
def test_at_least_twenty_rivals_of_a_drug_in_under_a_second(name):
    mol = _mol(DRUG_SIZED[name])
    build_rivals(mol, 1)
    start = time.process_time()
    rivals = build_rivals(mol, 50)
    seconds = time.process_time() - start
    assert len(rivals) >= 20
    assert seconds < 1.0


@pytest.mark.parametrize("name", DRUG_SIZED)
def test_rivals_are_different_valid_and_of_the_right_formula(name):
    mol = _mol(DRUG_SIZED[name])
    rivals = build_rivals(mol, 50)
    assert len(set(_smiles(rivals))) == len(rivals)
    assert Chem.CanonSmiles(DRUG_SIZED[name]) not in _smiles(rivals)
    for rival in rivals:
        read = _mol(rival.smiles)
        assert read is not None
        assert Chem.MolToSmiles(read) == rival.smiles
        assert rival.kind in ("isomer", "stereoisomer", "reaction")
        same = rdMolDescriptors.CalcMolFormula(read) == rdMolDescriptors.CalcMolFormula(mol)
        assert same or rival.kind == "reaction", rival


def test_the_first_nine_hold_different_kinds():
    kinds = [rival.kind for rival in build_rivals(_mol(DRUG_SIZED["sertraline"]), 9)]
    assert set(kinds) == {"isomer", "stereoisomer", "reaction"}
    assert kinds.count("isomer") >= 4


def test_longer_lists_begin_like_shorter_ones():
    mol = _mol(DRUG_SIZED["celecoxib"])
    assert build_rivals(mol, 25)[:9] == build_rivals(mol, 9)


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(name=st.sampled_from(sorted(DRUG_SIZED)), seed=st.integers(0, 10_000))
def test_the_order_of_the_atoms_does_not_matter(name, seed):
    mol = _mol(DRUG_SIZED[name])
    order = list(range(mol.GetNumAtoms()))
    random.Random(seed).shuffle(order)
    assert build_rivals(Chem.RenumberAtoms(mol, order), 12) == build_rivals(mol, 12)


def test_explicit_hydrogens_and_atom_maps_do_not_matter():
    plain = build_rivals(_mol("CC(=O)c1ccc(F)cc1"))
    assert build_rivals(Chem.AddHs(_mol("CC(=O)c1ccc(F)cc1"))) == plain
    assert build_rivals(_mol("[CH3:1][C:2](=O)c1ccc(F)cc1")) == plain


def test_a_structure_record_gives_the_same_list():
    mol = _mol("COc1ccccn1")
    structure = Structure("1", mol, tuple(range(1, mol.GetNumAtoms() + 1)), "COc1ccccn1")
    assert build_rivals(structure) == build_rivals(mol)


def test_the_input_is_left_alone():
    mol = _mol("[CH3:7]Oc1ccccn1")
    before = Chem.MolToCXSmiles(mol)
    build_rivals(mol)
    assert Chem.MolToCXSmiles(mol) == before


@pytest.mark.parametrize(
    ("compound", "smiles", "tautomer"),
    [
        ("3-methylpyrazole", "Cc1cc[nH]n1", "Cc1ccn[nH]1"),
        ("4-methylimidazole", "Cc1c[nH]cn1", "Cc1cnc[nH]1"),
        ("2-pyridone", "O=c1cccc[nH]1", "Oc1ccccn1"),
        ("acetylacetone", "CC(=O)CC(C)=O", "CC(=O)C=C(C)O"),
        ("5-phenyl-1H-tetrazole", "c1ccc(-c2nnn[nH]2)cc1", "c1ccc(-c2nn[nH]n2)cc1"),
    ],
)
def test_fast_tautomers_are_listed_only_on_request_and_last(compound, smiles, tautomer):
    tautomer = Chem.CanonSmiles(tautomer)
    assert tautomer not in _smiles(build_rivals(_mol(smiles), 100)), compound
    asked = build_rivals(_mol(smiles), 9, include_tautomers=True)
    kinds = [rival.kind for rival in asked]
    assert kinds == sorted(kinds, key=lambda kind: kind == "tautomer")
    assert tautomer in [rival.smiles for rival in asked if rival.kind == "tautomer"], compound


def test_two_tautomers_of_one_rival_are_one_rival():
    # 3- and 5-methylpyrazole as rivals of 4-methylpyrazole
    found = _smiles(build_rivals(_mol("Cc1cn[nH]c1"), 50))
    pair = {Chem.CanonSmiles("Cc1cc[nH]n1"), Chem.CanonSmiles("Cc1ccn[nH]1")}
    assert len(pair & set(found)) == 1


def test_expected_structures_come_first():
    rivals = build_rivals(_mol("CCOC(=O)c1ccccc1"), 4, expect=["CCOC(C)=O", "OCC", "c1ccccc1C(=O)OCC"])
    # the third one is the proposal itself
    assert rivals[:2] == (
        Rival("CCOC(C)=O", "named as what else may be in the tube", "candidate"),
        Rival("CCO", "named as what else may be in the tube", "candidate"),
    )
    assert len(rivals) == 4
    assert all(rival.kind != "candidate" for rival in rivals[2:])


def test_mass_confirmed_leaves_isomers_only():
    mol = _mol("CCOC(=O)c1ccccc1")
    assert {rival.kind for rival in build_rivals(mol, 30)} == {"isomer", "reaction"}
    assert {rival.kind for rival in build_rivals(mol, 30, mass_confirmed=True)} == {"isomer"}


def test_a_counter_ion_stays():
    rivals = build_rivals(_mol("CCN(CC)CC(=O)Nc1c(C)cccc1C.Cl"), 9)
    assert len(rivals) == 9
    assert all("Cl" in rival.smiles.split(".") for rival in rivals)
    plain = build_rivals(_mol(DRUG_SIZED["lidocaine"]), 9)
    assert [rival.how for rival in rivals] == [rival.how for rival in plain]


def test_nothing_to_list_is_an_empty_list():
    assert build_rivals(_mol("C")) == ()
    assert build_rivals(_mol("[Na+].[Cl-]")) == ()
    assert build_rivals(_mol("CCO"), 0) == ()


def test_an_unusual_proposal_keeps_what_it_has():
    # artemisinin: the peroxide is the proposal's own and stays in its isomers
    artemisinin = "C[C@@H]1CC[C@H]2[C@@H](C)C(=O)O[C@@H]3O[C@@]4(C)CC[C@@H]1[C@@]23OO4"
    peroxide = Chem.MolFromSmarts("OO")
    rivals = build_rivals(_mol(artemisinin), 9, mass_confirmed=True)
    assert len(rivals) == 9
    assert any(_mol(rival.smiles).HasSubstructMatch(peroxide) for rival in rivals)


@pytest.mark.parametrize("limit", [-1, 1001, 2.5, "9", True, None])
def test_a_bad_limit_is_refused(limit):
    with pytest.raises(SettingError, match=r"^argument 'limit': got .*; expected .*\. Try: .*"):
        build_rivals(_mol("CCO"), limit)


@pytest.mark.parametrize("structure", [None, "CCO", Chem.Mol()])
def test_a_bad_structure_is_refused(structure):
    with pytest.raises(StructureError, match=r"^argument 'structure': got .*; expected .*\. Try: .*"):
        build_rivals(structure)


@pytest.mark.parametrize("entry", ["c1ccccc", "", None])
def test_a_bad_expected_structure_is_named_by_its_place(entry):
    with pytest.raises(StructureError, match=r"^argument 'expect', entry 2: got .*; expected .*\. Try: .*"):
        build_rivals(_mol("CCO"), expect=["CO", entry])


@pytest.mark.parametrize("expect", ["CCO", 3])
def test_expect_is_a_list_of_smiles(expect):
    with pytest.raises(SettingError, match=r"^argument 'expect': got .*; expected .*\. Try: .*"):
        build_rivals(_mol("CCO"), expect=expect)
