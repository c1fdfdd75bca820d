"""Every atom covered once, numbering without influence, and the groups a chemist would name."""

import random
import time
from functools import cache

import pytest
from builder_substituent_molecules import NAMED
from hypothesis import given, settings
from hypothesis import strategies as st
from rdkit import Chem

from shiftpred.errors import StructureError
from shiftpred.substituents.split import split_molecule, split_substituents


def component_of(mol, atom_index):
    fragment = next(f for f in Chem.GetMolFrags(mol) if atom_index in f)
    return {a for a in fragment if mol.GetAtomWithIdx(a).GetAtomicNum() != 1}


@cache
def count_atoms(group):
    again = Chem.MolFromSmiles(group)
    return 0 if again is None else again.GetNumAtoms()


def require_covered_once(mol):
    for site, groups in enumerate(split_molecule(mol)):
        if mol.GetAtomWithIdx(site).GetAtomicNum() == 1:
            assert groups == ()
            continue
        everyone_else = component_of(mol, site) - {site}
        alpha = [s for s in groups if s.position == "alpha"]
        covered = [a for s in alpha for a in s.atoms]
        assert len(covered) == len(set(covered)) and set(covered) == everyone_else
        neighbours = {b.GetIdx() for b in mol.GetAtomWithIdx(site).GetNeighbors()}
        assert {s.attached_atom for s in alpha} == neighbours & everyone_else
        for level, next_level in (("alpha", "beta"), ("beta", "gamma")):
            for group in (s for s in groups if s.position == level):
                inner = [s for s in groups if s.position == next_level and s.path[: len(group.path)] == group.path]
                below = [a for s in inner for a in s.atoms]
                assert len(below) == len(set(below)) and set(below) == set(group.atoms) - {group.attached_atom}
        for s in groups:
            assert s.path[0] == site and s.path[-1] == s.attached_atom and s.attached_atom in s.atoms
            for a, b in zip(s.path, s.path[1:], strict=False):
                assert mol.GetBondBetweenAtoms(a, b) is not None
            assert s.group.count("*") == 1 + s.group.count("[1*]") and s.name
            # A group without a cut ring can be read again; one with cuts lists them.
            assert bool(s.ring_cuts) == ("[1*]" in s.group)
            if not s.ring_cuts:
                assert count_atoms(s.group) == len(s.atoms) + 1


@pytest.mark.parametrize("name", NAMED)
def test_each_other_atom_is_covered_once(name):
    require_covered_once(Chem.MolFromSmiles(NAMED[name]))


@settings(max_examples=60, deadline=None)
@given(name=st.sampled_from(sorted(NAMED)), seed=st.integers(0, 10**6))
def test_numbering_of_atoms_does_not_matter(name, seed):
    mol = Chem.MolFromSmiles(NAMED[name])
    order = list(range(mol.GetNumAtoms()))
    random.Random(seed).shuffle(order)
    shuffled = Chem.RenumberAtoms(mol, order)

    def summary(groups):
        return sorted((s.position, s.ring_position, s.group, s.name, s.bond_order) for s in groups)

    before, after = split_molecule(mol), split_molecule(shuffled)
    for new, old in enumerate(order):
        assert summary(before[old]) == summary(after[new])


@pytest.mark.parametrize(
    ("smiles", "site", "expected"),
    [
        ("CCOC(C)=O", 1, {("alpha", "acetoxy"), ("alpha", "methyl"), ("beta", "acetyl"), ("gamma", "oxo")}),
        ("CC(C)C[C@H](NC(=O)OC(C)(C)C)C(=O)OC", 4, {("alpha", "Boc-amino"), ("alpha", "methoxycarbonyl")}),
        ("Cc1ccc([N+](=O)[O-])cc1", 0, {("alpha", "4-nitrophenyl")}),
        ("CC(C)(C)Cl", 1, {("alpha", "chloro"), ("alpha", "methyl")}),
        ("FC(F)(F)CN(C)C", 4, {("alpha", "dimethylamino"), ("alpha", "trifluoromethyl"), ("beta", "fluoro")}),
        ("CC(=O)C", 1, {("alpha", "oxo"), ("alpha", "methyl")}),
        ("C=CC#N", 1, {("alpha", "methylidene"), ("alpha", "cyano"), ("beta", "nitrilo")}),
        ("C1CCCCC1", 0, {("alpha", "ring CH2"), ("gamma", "ring CH2")}),
    ],
)
def test_groups_have_the_names_of_the_trade(smiles, site, expected):
    found = {(s.position, s.name) for s in split_substituents(Chem.MolFromSmiles(smiles), site)}
    assert expected <= found


def test_substituents_of_a_benzene_ring_are_ipso_ortho_meta_para():
    mol = Chem.MolFromSmiles("Brc1cc(OC)c(N)c(F)c1C#N")  # ring atoms 1, 2, 3, 6, 8, 10
    found = {(s.ring_position, s.name) for s in split_substituents(mol, 2) if s.ring_position}
    assert found == {("ortho", "bromo"), ("ortho", "methoxy"), ("meta", "amino"), ("meta", "cyano"), ("para", "fluoro")}
    assert ("ipso", "bromo") in {(s.ring_position, s.name) for s in split_substituents(mol, 1)}
    # Only substituents of the site's own ring count: none for the methyl carbon beside it.
    assert {s.ring_position for s in split_substituents(Chem.MolFromSmiles("Cc1ccccc1Cl"), 0)} == {""}


def test_an_even_ring_is_cut_opposite_the_site_and_the_tie_goes_by_the_alphabet():
    # Piperidine's C4 (index 3) has two equal ways to nitrogen; both halves together hold each atom once.
    groups = [s for s in split_substituents(Chem.MolFromSmiles("C1CCNCC1"), 0) if s.position == "alpha"]
    assert sorted(len(s.atoms) for s in groups) == [2, 3]
    assert {cut for s in groups for cut in s.ring_cuts} == {(a, b) for s in groups for a, b in [s.ring_cuts[0]]}
    # Seen from C2 the atom opposite (C5) belongs to the carbon arm: '_C' reads before '_N'.
    carbon_arm = next(
        s for s in split_substituents(Chem.MolFromSmiles("C1CCNCC1"), 4) if s.position == "alpha" and s.name == "ring CH2"
    )
    assert 1 in carbon_arm.atoms and len(carbon_arm.atoms) == 3


def test_multiple_bonds_show_in_the_canonical_form():
    groups = split_substituents(Chem.MolFromSmiles("O=C=Nc1ccccc1"), 1)
    assert {(s.group, s.bond_order) for s in groups if s.position == "alpha"} == {("*=O", 2.0), ("*=Nc1ccccc1", 2.0)}


def test_stereo_and_isotopes_do_not_change_a_group():
    plain = split_substituents(Chem.MolFromSmiles("CC(O)C(F)Cl"), 0)
    marked = split_substituents(Chem.MolFromSmiles("C[C@H](O)[C@@H](F)Cl"), 0)
    heavy = split_substituents(Chem.MolFromSmiles("C[13CH](O)C(F)Cl"), 0)
    assert [s.group for s in plain] == [s.group for s in marked] == [s.group for s in heavy]


def test_a_drawn_hydrogen_counts_as_hydrogen_and_not_as_a_group():
    drawn = Chem.MolFromSmiles("[H]/N=C(/C)c1ccccc1")
    assert drawn.GetAtomWithIdx(0).GetAtomicNum() == 1
    plain = Chem.MolFromSmiles("N=C(C)c1ccccc1")
    found = [(s.position, s.group, s.name) for s in split_substituents(drawn, 3)]
    assert found == [(s.position, s.group, s.name) for s in split_substituents(plain, 2)]


def test_other_components_are_left_alone():
    mol = Chem.MolFromSmiles("CC(=O)[O-].C[NH3+]")
    assert {a for s in split_substituents(mol, 0) if s.position == "alpha" for a in s.atoms} == {1, 2, 3}
    assert split_substituents(Chem.MolFromSmiles("C.O"), 0) == ()


def test_three_hundred_heavy_atoms_are_taken_and_one_more_is_refused():
    chain = Chem.MolFromSmiles("C" * 300)
    groups = split_substituents(chain, 150)
    assert sum(len(s.atoms) for s in groups if s.position == "alpha") == 299
    with pytest.raises(StructureError, match="at most 300 heavy atoms"):
        split_substituents(Chem.MolFromSmiles("C" * 301), 0)


@pytest.mark.parametrize("atom_index", [-1, 3, 99])
def test_an_atom_that_is_not_there_is_named(atom_index):
    with pytest.raises(StructureError, match="0-based index from 0 to 2"):
        split_substituents(Chem.MolFromSmiles("CCO"), atom_index)


def test_an_empty_molecule_has_no_sites():
    assert split_molecule(Chem.Mol()) == []


def test_a_site_of_a_usual_molecule_takes_less_than_two_milliseconds():
    mol = Chem.MolFromSmiles(NAMED["quinine"])
    best = float("inf")
    for _ in range(5):
        start = time.process_time()
        split_molecule(mol)
        best = min(best, time.process_time() - start)
    assert best / mol.GetNumAtoms() < 2e-3


def _open_table(shared, step):
    import pandas as pd

    smiles = pd.read_csv(shared / "data" / "compounds.csv.gz").smiles
    return smiles.iloc[::step]


@pytest.mark.shared
def test_sampled_compounds_of_the_open_table_are_covered_once(shared):
    for smiles in _open_table(shared, 400):
        require_covered_once(Chem.MolFromSmiles(smiles))


@pytest.mark.shared
@pytest.mark.slow
def test_all_compounds_of_the_open_table_are_covered_once(shared):
    n_large = 0
    for smiles in _open_table(shared, 1):
        mol = Chem.MolFromSmiles(smiles)
        if mol.GetNumAtoms() > 300:
            n_large += 1
            continue
        require_covered_once(mol)
    assert n_large < 10
