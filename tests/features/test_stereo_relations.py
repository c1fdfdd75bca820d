"""cis and trans from the graph alone, checked against a three-dimensional model made by RDKit."""

import numpy as np
import pytest
from rdkit import Chem
from rdkit.Chem import AllChem

from shiftpred.features.stereo_relations import STEREO_RELATIONS, compute_stereo_edges


def relations(mol):
    begin, end, kind, _ = compute_stereo_edges(mol, True, mol.GetRingInfo().AtomRings())
    return [(b, e, STEREO_RELATIONS[k]) for b, e, k in zip(begin, end, kind)]


@pytest.mark.parametrize("smiles, expected", [("C/C=C/C", "double_bond_trans"), ("C/C=C\\C", "double_bond_cis")])
def test_double_bond(smiles, expected):
    assert [k for *_, k in relations(Chem.MolFromSmiles(smiles))] == [expected]


@pytest.mark.parametrize("smiles", ["C[C@]1(Cl)C[C@@H](O)CC1", "C[C@]1(Cl)C[C@H](O)CC1", "C[C@@H]1CCCC[C@H]1O",
                                    "C[C@@H]1CCCC[C@@H]1O", "C[C@@]12CCCC[C@H]1CCCC2", "C[C@@]12CCCC[C@@H]1CCCC2"])
def test_ring_faces_agree_with_a_model_in_space(smiles):
    mol = Chem.MolFromSmiles(smiles)
    full = Chem.AddHs(mol)
    AllChem.EmbedMolecule(full, randomSeed=1)
    place = full.GetConformer().GetPositions()
    checked = 0
    for ring in mol.GetRingInfo().AtomRings():
        normal = np.linalg.svd(place[list(ring)] - place[list(ring)].mean(0))[2][2]

        def height(j, ring=ring, normal=normal):
            at = next(n.GetIdx() for n in mol.GetAtomWithIdx(j).GetNeighbors() if n.GetIdx() in ring)
            other = next(n.GetIdx() for n in full.GetAtomWithIdx(at).GetNeighbors() if n.GetIdx() not in (*ring, j))
            return np.sign((place[j] - place[other]) @ normal)

        for b, e, kind in relations(mol):
            attached = [any(n.GetIdx() in ring for n in mol.GetAtomWithIdx(x).GetNeighbors()) and x not in ring for x in (b, e)]
            if all(attached):
                assert (height(b) == height(e)) == kind.endswith("cis"), (b, e, kind)
                checked += 1
    assert checked


def test_like_and_unlike_centres():
    *_, like = compute_stereo_edges(Chem.MolFromSmiles("O[C@H](C)[C@H](O)C"), True, ())
    *_, unlike = compute_stereo_edges(Chem.MolFromSmiles("O[C@H](C)[C@@H](O)C"), True, ())
    assert set(like.values()) == {-v for v in unlike.values()} and len(like) == 1
