"""The plain network sees elements, hydrogens, charges and bond types, and nothing else."""

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.errors import BundleError
from shiftpred.features.molecule_arrays import ATOM_FEATURES, BOND_FEATURES
from shiftpred.training.plain_network import FILE, build_plain_arrays, load_plain_network, predict_plain


def filled(names, columns):
    return {name for name, used in zip(names, np.abs(columns).sum(axis=0) > 0) if used}


def test_only_plain_columns_are_filled():
    arrays = build_plain_arrays(Chem.MolFromSmiles("C/C(F)=C/C#Cc1cc[n+]([O-])cc1[C@H](O)[C@@H](C)Cl"))
    assert filled(ATOM_FEATURES, arrays.atoms) == {
        "element_6", "element_7", "element_8", "element_9", "element_17", "hydrogens_0", "hydrogens_1", "hydrogens_3",
        "positive", "negative",
    }  # fmt: skip
    assert filled(BOND_FEATURES, arrays.edges) == {"single", "double", "triple", "aromatic"}


def test_stereoisomers_look_alike():
    one, other = (build_plain_arrays(Chem.MolFromSmiles(s)) for s in ("C/C=C/C", "C/C=C\\C"))
    np.testing.assert_array_equal(one.atoms, other.atoms)
    assert len(one.source) == 6


@pytest.mark.parametrize("content", [None, b"not an archive"])
def test_a_missing_or_damaged_file_is_named(tmp_path, content):
    path = tmp_path / FILE
    if content:
        path.write_bytes(content)
    with pytest.raises(BundleError, match=FILE):
        load_plain_network(path)


def test_pickled_arrays_are_refused(tmp_path):
    np.savez(tmp_path / FILE, **{"layers.0": np.array([{}], dtype=object)})
    with pytest.raises(BundleError):
        load_plain_network(tmp_path / FILE)


@pytest.mark.training
def test_saved_network_predicts_as_the_trained_one(tmp_path):
    torch = pytest.importorskip("torch")
    from shiftpred.training.network import EnvironmentNetwork, export_arrays
    from shiftpred.training.train_environment_model import NetworkSettings, predict_compounds

    torch.manual_seed(1)
    network = EnvironmentNetwork(16, 2, 8, 12)
    np.savez_compressed(tmp_path / FILE, **export_arrays(network))
    mols = [Chem.MolFromSmiles(s) for s in ("CCO", "c1ccccc1C#N", "C")]
    found = predict_plain(load_plain_network(tmp_path / FILE), mols)
    expected = predict_compounds(network, [build_plain_arrays(m) for m in mols], NetworkSettings(low_precision=False))
    for one, other, mol in zip(found, expected, mols):
        assert one.shape == (mol.GetNumAtoms(), 2)
        np.testing.assert_allclose(one, other[:, :2], atol=1e-3)
