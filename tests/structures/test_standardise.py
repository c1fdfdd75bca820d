"""One molecule however it is drawn: atom order, Kekulé form, charges, explicit hydrogens."""

from pathlib import Path

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.records import Structure
from shiftpred.structures import compute_environments, compute_equivalence, parse_structure

LINES = [line.split(maxsplit=1) for line in (Path(__file__).parent / "molecules.smi").read_text(encoding="utf-8").splitlines()]
SMILES = [line[0] for line in LINES]


def profile(structure: Structure):
    """Return what must not depend on the drawing."""
    mol = structure.mol
    equivalence = compute_equivalence(mol)
    sizes = sorted(np.unique(equivalence.group, return_counts=True)[1].tolist())
    environments = [sorted(str(e) for e in compute_environments(mol, nucleus)) for nucleus in ("13C", "1H")]
    return structure.smiles, sizes, environments, int(equivalence.geminal_differ.sum())


@pytest.mark.parametrize("smiles", SMILES)
def test_atom_order(smiles):
    structure = parse_structure(smiles)
    mol = Chem.MolFromSmiles(smiles)
    for seed in range(3):
        order = np.random.default_rng(seed).permutation(mol.GetNumAtoms()).tolist()
        assert profile(parse_structure(Chem.RenumberAtoms(mol, order))) == profile(structure)


@pytest.mark.parametrize("smiles", SMILES)
def test_kekule_form(smiles):
    mol = Chem.MolFromSmiles(smiles)
    Chem.Kekulize(mol, clearAromaticFlags=True)
    assert profile(parse_structure(Chem.MolToSmiles(mol, kekuleSmiles=True))) == profile(parse_structure(smiles))


@pytest.mark.parametrize("smiles", SMILES)
def test_explicit_hydrogens(smiles):
    full = Chem.MolToSmiles(Chem.AddHs(Chem.MolFromSmiles(smiles)))
    assert profile(parse_structure(full)) == profile(parse_structure(smiles))


@pytest.mark.parametrize(
    "one, other",
    [
        ("C[S+]([O-])C", "CS(C)=O"),
        ("CN(=O)=O", "C[N+](=O)[O-]"),
        ("CN=N#N", "CN=[N+]=[N-]"),
        ("C[N-][N+]#N", "CN=[N+]=[N-]"),
        ("C[P+](C)(C)[O-]", "CP(C)(C)=O"),
        ("C[P+](C)(C)[CH2-]", "C=P(C)(C)C"),
        ("C[S+2]([O-])([O-])C", "CS(C)(=O)=O"),
        ("O=n1ccccc1", "[O-][n+]1ccccc1"),
        ("[CH2-][N+]#N", "C=[N+]=[N-]"),
        ("CN(C)(C)=O", "C[N+]([O-])(C)C"),
        ("CN(C)(C)->O", "C[N+](C)(C)[O-]"),
        ("CS(C)->O", "CS(C)=O"),
        ("N->B", "[NH3+][BH3-]"),
        ("CN(C)(C)->[BH3]", "C[N+](C)(C)[BH3-]"),
        ("CCO(CC)->B(F)(F)F", "CC[O+](CC)[B-](F)(F)F"),
        ("[O-][s+]1cccc1", "O=S1C=CC=C1"),
        ("[O-][I+]c1ccccc1", "O=Ic1ccccc1"),
        ("C[Se+]([O-])C", "C[Se](C)=O"),
        ("C[S+](C)[N-]C", "CN=S(C)C"),
        ("C[P+](C)(C)[S-]", "CP(C)(C)=S"),
        ("C=N#N", "C=[N+]=[N-]"),
        ("C[S@+]([O-])CC", "C[S@](=O)CC"),
        ("O=[N+]([O-])c1ccccc1", "[O-][N+](=O)c1ccccc1"),
    ],
)
def test_charge_separated_drawings(one, other):
    assert profile(parse_structure(one)) == profile(parse_structure(other))


def test_numbers_are_the_users_own():
    structure = parse_structure("[H]C([H])([H])O[H]")
    assert structure.atom_numbers == (2, 5) and structure.smiles == "CO"
    assert parse_structure("[CH3:7][OH:1]").atom_numbers == (1, 2)


def test_deuterium_is_counted_and_noted():
    structure = parse_structure("[2H]C([2H])([2H])S(=O)C")
    assert structure.deuterium[structure.atom_numbers.index(2)] == 3 and "deuterium" in structure.notes[0]
    assert structure.smiles == "CS(C)=O"


def test_isotopes_and_maps_do_not_show():
    assert parse_structure("[13CH3:5]CO").smiles == "CCO"


@pytest.mark.parametrize("smiles", SMILES)
def test_numbers_point_to_the_drawn_atoms(smiles):
    """Every heavy atom keeps its place in the user's drawing, with all hydrogens drawn and the order shuffled."""
    full = Chem.AddHs(Chem.MolFromSmiles(smiles))
    order = np.random.default_rng(1).permutation(full.GetNumAtoms()).tolist()
    drawn = Chem.RenumberAtoms(full, order)
    structure = parse_structure(drawn)
    assert len(structure.atom_numbers) == Chem.MolFromSmiles(smiles).GetNumAtoms()
    for atom, number in zip(structure.mol.GetAtoms(), structure.atom_numbers):
        assert atom.GetSymbol() == drawn.GetAtomWithIdx(number - 1).GetSymbol()
        assert atom.GetTotalNumHs() == drawn.GetAtomWithIdx(number - 1).GetTotalNumHs(includeNeighbors=True)


def test_input_is_not_changed():
    mol = Chem.MolFromSmiles("[2H]C([2H])([2H])[S+]([O-])C")
    before = Chem.MolToSmiles(mol)
    parse_structure(mol)
    assert Chem.MolToSmiles(mol) == before
