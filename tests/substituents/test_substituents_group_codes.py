"""Group codes, positions, and the short groups that stand for codes."""

import random

import pytest
from builder_substituent_molecules import NAMED
from rdkit import Chem

from shiftpred.substituents.group_codes import LEVELS, compute_group_codes
from shiftpred.substituents.model_groups import build_model_group
from shiftpred.substituents.positions import compute_places


def code_of(group_smiles, level=2):
    mol = Chem.MolFromSmiles(group_smiles)
    attached = mol.GetAtomWithIdx(0).GetNeighbors()[0].GetIdx()
    return compute_group_codes(mol).levels[level][0][attached]


@pytest.mark.parametrize("name", NAMED)
def test_codes_do_not_depend_on_numbering(name):
    mol = Chem.MolFromSmiles(NAMED[name])
    order = list(range(mol.GetNumAtoms()))
    random.Random(7).shuffle(order)
    before, after = compute_group_codes(mol), compute_group_codes(Chem.RenumberAtoms(mol, order))
    for new, old in enumerate(order):
        for level in range(LEVELS):
            assert sorted(before.levels[level][old].values()) == sorted(after.levels[level][new].values())


def test_levels_see_one_shell_more_each():
    assert [code_of("*OC(C)=O", k) for k in range(3)] == ["-O", "-O0(-C)", "-O0(-C0(-C)(=O))"]
    # Acetoxy and formyloxy differ only from level 2 on.
    assert code_of("*OC(C)=O", 1) == code_of("*OC=O", 1) and code_of("*OC(C)=O") != code_of("*OC=O")


@pytest.mark.parametrize(
    "smiles",
    (
        "*OC(C)=O *[N+](=O)[O-] *C(C)(C)C *Cc1ccccc1 *c1ccccc1 *c1ccccn1 *c1cccnc1 *c1ccc[nH]1 *n1ccnc1 *c1ccco1 "
        "*c1ccsc1 *C(=O)OC *C(=O)c1ccccc1 *c1ccccc1C *C=O *=O *S(C)(=O)=O *N=[N+]=[N-] *C#N *[Si](C)(C)C "
        "*[N+](C)(C)C *C(F)(F)F *Oc1ccccc1 *=C *N(C)C *C(C)=O *NC(C)=O *C(N)=O *C=C *C#C *SC *I *CC[N+](=O)[O-]"
    ).split(),
)
def test_groups_out_to_gamma_are_kept_whole(smiles):
    assert build_model_group(code_of(smiles)) == Chem.MolToSmiles(Chem.MolFromSmiles(smiles))


@pytest.mark.parametrize(
    ("smiles", "short"),
    [
        ("*CCCCCCCC", "*CCC"),
        ("*NC(=O)OC(C)(C)C", "*NC(=O)O"),
        ("*c1cccc2ccccc12", "*c1ccccc1"),
        ("*c1ccc(OC)cc1", "*c1ccccc1"),
        ("*C1CO1", "*C(CO)OC"),
    ],
)
def test_what_lies_beyond_gamma_is_replaced_by_hydrogen(smiles, short):
    assert build_model_group(code_of(smiles)) == Chem.MolToSmiles(Chem.MolFromSmiles(short))


@pytest.mark.parametrize(
    ("smiles", "site", "short"),
    [("c1ccccc1", 0, "*C=CC"), ("c1ccncc1", 2, "*N=CC"), ("c1ccoc1", 2, "*OC=C"), ("O=c1cccc[nH]1", 1, "*NC=C")],
)
def test_the_far_side_of_the_sites_own_ring_is_unrolled(smiles, site, short):
    codes = compute_group_codes(Chem.MolFromSmiles(smiles))
    groups = {build_model_group(code) for code in codes.levels[2][site].values()}
    # Where the unrolled group branches further it only has to begin like this.
    pattern = Chem.MolFromSmiles(short)
    assert any(g and Chem.MolFromSmiles(g).HasSubstructMatch(pattern) for g in groups)


def test_short_groups_exist_for_nearly_every_bond_of_the_listed_molecules():
    total = failed = 0
    for smiles in NAMED.values():
        codes = compute_group_codes(Chem.MolFromSmiles(smiles))
        for seen_from in codes.levels[2]:
            for code in seen_from.values():
                total += 1
                failed += build_model_group(code) is None
    assert total > 1000 and failed <= 0.01 * total


def test_a_text_that_is_no_code_is_refused():
    with pytest.raises(ValueError, match="not a group code"):
        build_model_group("-O(!)")


def test_places_are_shortest_ways_and_name_ring_positions():
    mol = Chem.MolFromSmiles("Oc1ccc(Cl)cc1")
    codes = compute_group_codes(mol)
    distances = Chem.GetDistanceMatrix(mol)
    for site in range(mol.GetNumAtoms()):
        places = compute_places(codes, site)
        assert sorted(p.atom for p in places) == [a for a in range(mol.GetNumAtoms()) if a != site]
        assert all(p.distance == distances[site][p.atom] for p in places)
    assert {p.atom: p.position for p in compute_places(codes, 1) if p.position == "para"} == {5: "para"}
    assert {p.atom for p in compute_places(codes, 2) if p.position == "ortho"} == {0}
    assert {p.atom for p in compute_places(codes, 2) if p.position == "meta"} == {5}


def test_reach_limits_the_walk():
    codes = compute_group_codes(Chem.MolFromSmiles("CCCCCCCC"))
    assert max(p.distance for p in compute_places(codes, 0, reach=3)) == 3
