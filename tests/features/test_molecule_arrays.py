"""One molecule → arrays: invariances and the columns' meaning."""

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.features.molecule_arrays import ATOM_FEATURES, BOND_FEATURES, build_molecule_arrays, join_molecule_arrays

MOLECULES = [
    "CCO",
    "CC(=O)Oc1ccccc1C(=O)O",
    "C/C=C/C(=O)N(C)C",
    "C[C@H](N)C(=O)O",
    "C[C@@]12CCCC[C@H]1CCCC2",
    "O=[N+]([O-])c1ccccc1",
]


def sorted_rows(graph):
    """Return a form of the graph that does not depend on the order of its atoms."""
    label = [tuple(np.round(row, 4)) for row in graph.atoms]
    edges = sorted((label[s], label[t], tuple(np.round(e, 4))) for s, t, e in zip(graph.source, graph.target, graph.edges))
    return sorted(label), edges


@pytest.mark.parametrize("smiles", MOLECULES)
def test_atom_order_does_not_matter(smiles):
    mol = Chem.MolFromSmiles(smiles)
    reference = sorted_rows(build_molecule_arrays(mol))
    rng = np.random.default_rng(1)
    for _ in range(5):
        other = Chem.MolFromSmiles(Chem.MolToSmiles(mol, canonical=False, doRandom=True))
        other = Chem.RenumberAtoms(other, rng.permutation(other.GetNumAtoms()).tolist())
        assert sorted_rows(build_molecule_arrays(other)) == reference


@pytest.mark.parametrize(
    "smiles, mirror", [("C[C@H](N)C(=O)O", "C[C@@H](N)C(=O)O"), ("O[C@H]1CCCC[C@H]1Cl", "O[C@@H]1CCCC[C@@H]1Cl")]
)
def test_enantiomers_look_the_same(smiles, mirror):
    assert sorted_rows(build_molecule_arrays(Chem.MolFromSmiles(smiles))) == sorted_rows(
        build_molecule_arrays(Chem.MolFromSmiles(mirror))
    )


@pytest.mark.parametrize(
    "one, other",
    [
        ("C/C=C/C", "C/C=C\\C"),
        ("C[C@H]1CC[C@@H](C)CC1", "C[C@H]1CC[C@H](C)CC1"),
        ("C[C@@]12CCCC[C@H]1CCCC2", "C[C@@]12CCCC[C@@H]1CCCC2"),
    ],
)
def test_diastereomers_look_different(one, other):
    assert sorted_rows(build_molecule_arrays(Chem.MolFromSmiles(one))) != sorted_rows(
        build_molecule_arrays(Chem.MolFromSmiles(other))
    )


def test_columns_of_ethanol():
    graph = build_molecule_arrays(Chem.MolFromSmiles("CCO"))
    column = {n: i for i, n in enumerate(ATOM_FEATURES)}
    assert graph.atoms[2, column["element_8"]] == 1 and graph.atoms[0, column["hydrogens_3"]] == 1
    assert graph.atoms[1, column["pauling"]] == pytest.approx(0.0) and graph.atoms[2, column["pauling"]] == pytest.approx(0.89)
    assert len(graph.source) == 4 and list(graph.target) == sorted(graph.target)
    assert graph.edges.shape == (4, len(BOND_FEATURES))


def test_electronic_inputs_order_the_methyl_halides():
    """More electronegative neighbour, more positive carbon and stronger field (the order is that of Pauling's scale)."""
    column = {n: i for i, n in enumerate(ATOM_FEATURES)}
    charge, field = [], []
    for x in ("I", "Br", "Cl", "F"):
        row = build_molecule_arrays(Chem.MolFromSmiles(f"C{x}")).atoms[0]
        charge.append(row[column["partial_charge"]])
        field.append(row[column["equalised_1"]])
    assert charge == sorted(charge) and field == sorted(field)


def test_joining_shifts_the_edges():
    parts = [build_molecule_arrays(Chem.MolFromSmiles(s)) for s in MOLECULES]
    joined, offsets = join_molecule_arrays(parts)
    assert offsets[-1] == len(joined.atoms) == sum(len(p.atoms) for p in parts)
    k = 3
    inside = (joined.target >= offsets[k]) & (joined.target < offsets[k + 1])
    assert np.array_equal(joined.source[inside] - offsets[k], parts[k].source)


def test_single_atom_and_metal():
    for smiles in ("C", "[Na+].[Cl-]", "C[Sn](C)(C)C", "[Pt]"):
        graph = build_molecule_arrays(Chem.MolFromSmiles(smiles))
        assert np.isfinite(graph.atoms).all() and np.isfinite(graph.edges).all()
