"""Codes of surroundings: equal exactly where the surroundings are equal."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from rdkit import Chem

from shiftpred.features.concentric_environments import RADII, compute_environment_codes
from shiftpred.features.molecule_arrays import build_molecule_arrays, join_molecule_arrays

SMILES = ["CCO", "Cc1ccccc1Cl", "O=C(O)/C=C/c1ccc(F)cc1", "C[C@H](N)C(=O)[O-]", "C[Si](C)(C)CC#N", "C1CC2CCC1C2", "[Na]CC"]


def compute(smiles):
    return compute_environment_codes(build_molecule_arrays(Chem.MolFromSmiles(smiles)))


def alike_to(one, other):
    """Bonds out to which two rows of codes agree."""
    return int((one == other).sum())


@pytest.mark.parametrize(
    ("chain", "bonds"),
    [("CF", 0), ("CCF", 1), ("CCCF", 2), ("CCCCF", 3), ("CCCCCF", 4), ("CCCCCCF", 5), ("CCCCCCCCCF", 5)],
)
def test_a_difference_is_seen_from_its_own_distance_on(chain, bonds):
    """The methyl of a fluoroalkane against that of an alkane longer than any code reaches."""
    assert alike_to(compute(chain)[0], compute("CCCCCCCCCCCC")[0]) == bonds


@given(st.sampled_from(SMILES), st.randoms(use_true_random=False))
@settings(max_examples=40, deadline=None)
def test_the_order_of_atoms_does_not_matter(smiles, random):
    mol = Chem.MolFromSmiles(smiles)
    order = list(range(mol.GetNumAtoms()))
    random.shuffle(order)
    again = compute_environment_codes(build_molecule_arrays(Chem.RenumberAtoms(mol, order)))
    assert np.array_equal(again, compute(smiles)[order])


def test_stereo_does_not_count_and_charge_does():
    assert np.array_equal(compute("C/C=C/C"), compute("C/C=C\\C"))
    assert not (compute("CC(=O)[O-]")[1] == compute("CC(=O)O")[1]).any()


def test_joined_molecules_keep_their_codes():
    parts = [build_molecule_arrays(Chem.MolFromSmiles(s)) for s in SMILES]
    together = compute_environment_codes(join_molecule_arrays(parts)[0])
    assert np.array_equal(together, np.concatenate([compute(s) for s in SMILES]))


def test_numbers_fit_forty_bits_and_radii_never_share_one():
    codes = np.concatenate([compute(s) for s in SMILES])
    assert codes.shape[1] == RADII and codes.max() < 2**40
    columns = [set(codes[:, k].tolist()) for k in range(RADII)]
    assert sum(map(len, columns)) == len(set.union(*columns))


def test_an_atom_alone():
    assert compute("C").shape == (1, RADII)
    assert not (compute("C") == compute("O")).any()
