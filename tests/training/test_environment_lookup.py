"""Codes are equal exactly for equal surroundings; the look-up gives the mean of the largest sphere that was seen."""

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.training.environment_lookup import REACH, build_environment_lookup, compute_environment_codes


def codes(smiles):
    return compute_environment_codes(Chem.MolFromSmiles(smiles))


def test_codes_do_not_depend_on_atom_order():
    mol = Chem.MolFromSmiles("CC(=O)Nc1ccc(O)cc1/C=C/C#N")
    order = [int(i) for i in np.random.default_rng(3).permutation(mol.GetNumAtoms())]
    np.testing.assert_array_equal(
        compute_environment_codes(Chem.RenumberAtoms(mol, order)), compute_environment_codes(mol)[order]
    )


def test_equivalent_atoms_share_their_codes_and_others_do_not():
    c = codes("Cc1ccccc1")
    assert (c[2] == c[6]).all() and (c[3] == c[5]).all()
    assert c[2, 1] != c[3, 1] or c[2, 2] != c[3, 2]


@pytest.mark.parametrize("bonds", range(1, REACH + 1))
def test_a_change_is_seen_from_as_many_bonds_away(bonds):
    chain = "C" * 8
    plain, changed = codes(chain), codes("F" + chain[1:])
    # Atom `bonds` is that many bonds from the first one: nearer spheres are equal, this one is not.
    assert (plain[bonds, :bonds] == changed[bonds, :bonds]).all()
    assert plain[bonds, bonds] != changed[bonds, bonds]


@pytest.mark.parametrize(
    ("one", "other"),
    [("CC=C", "CCC"), ("C[O-]", "CO"), ("C1CC1", "CCC"), ("c1ccccc1", "C1=CC=CCC1"), ("CCl", "CBr"), ("C[NH3+]", "CN")],
)
def test_what_makes_surroundings_differ(one, other):
    assert codes(one)[0, 1] != codes(other)[0, 1]


def test_mean_of_identical_environments_then_smaller_spheres():
    train = ["CCO", "CCO", "CCCCCCO"]
    shifts = [
        np.array([[18.0, 1.2], [58.0, 3.7], [np.nan, 5.0]]),
        np.array([[19.0, np.nan], [58.4, 3.6], [np.nan, np.nan]]),
        np.array([[14.0, 0.9]] + [[np.nan, np.nan]] * 6),
    ]
    lookup = build_environment_lookup([codes(s) for s in train], shifts)
    found, reach = lookup.predict(codes("CCO"))
    np.testing.assert_allclose(found, [[18.5, 1.2], [58.2, 3.65], [np.nan, 5.0]])
    assert reach[0, 0] == REACH and reach[2, 0] == -1
    # A longer alcohol shares its first carbon with 1-hexanol out to four bonds, not to five.
    found, reach = lookup.predict(codes("CCCCCCS"))
    assert found[0, 0] == 14.0 and reach[0, 0] == 5
    found, reach = lookup.predict(codes("CCCCCS"))
    assert found[0, 0] == 14.0 and reach[0, 0] == 4


def test_unseen_atoms_get_no_value():
    lookup = build_environment_lookup([codes("C")], [np.array([[1.0, 0.2]])])
    found, reach = lookup.predict(codes("F"))
    assert np.isnan(found).all() and (reach == -1).all()
    empty = build_environment_lookup([], [])
    assert np.isnan(empty.predict(codes("C"))[0]).all()
