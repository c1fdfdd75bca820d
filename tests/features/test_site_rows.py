"""One site as one named row."""

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.features.site_rows import (
    CONSTANTS,
    FEATURE_NAMES,
    compute_constants,
    compute_regressors,
    compute_site_class,
    compute_site_row,
    compute_site_rows,
    render_site_class,
)
from shiftpred.substituents.group_codes import compute_group_codes


def row(smiles, site):
    return compute_site_row(Chem.MolFromSmiles(smiles), site).as_dict()


def test_names_and_values_belong_together():
    found = compute_site_row(Chem.MolFromSmiles("CCO"), 1)
    assert found.feature_names == FEATURE_NAMES and found.values.shape == (len(FEATURE_NAMES),)
    assert len(set(FEATURE_NAMES)) == len(FEATURE_NAMES)
    assert np.isfinite(found.values).all()


def test_a_row_describes_the_site_itself():
    found = row("c1ccc2ccccc2c1", 3)
    assert (found["atomic_number"], found["attached_h"], found["is_aromatic"]) == (6, 0, 1)
    assert (found["aromatic_rings"], found["ring_size"], found["is_sp2"]) == (2, 6, 1)
    assert row("C[N+](C)(C)C", 1)["formal_charge"] == 1 and row("CC(=O)[O-]", 3)["formal_charge"] == -1


def test_substituents_are_counted_by_position():
    found = row("CCOC(C)=O", 1)
    assert [found[f"{p}_count"] for p in ("alpha", "beta", "gamma", "ortho", "meta", "para")] == [2, 1, 2, 0, 0, 0]
    found = row("COc1ccc(Cl)c(F)c1", 2)  # ipso methoxy
    assert [found[f"{p}_count"] for p in ("alpha", "ortho", "meta", "para")] == [3, 0, 1, 1]
    assert found["beta_count"] == 3  # two ring carbons and the methyl


def test_sums_are_sums_of_the_groups_constants():
    single, double = row("CCl", 0), row("C(Cl)Cl", 0)
    for name in CONSTANTS:
        assert double[f"alpha_{name}"] == pytest.approx(2 * single[f"alpha_{name}"])
    mol = Chem.MolFromSmiles("CCl")
    code = compute_group_codes(mol).levels[2][0][1]
    assert single["alpha_sigma_i"] == pytest.approx(compute_constants(code)[CONSTANTS.index("sigma_i")])


def test_electronegativities_count_from_hydrogen():
    code = compute_group_codes(Chem.MolFromSmiles("CF")).levels[2][0][1]
    place = CONSTANTS.index("chi_attached")
    assert compute_constants(code)[place] == pytest.approx(3.98, abs=0.02)  # Pauling's scale, Allred 1961
    assert compute_regressors(code)[place] == pytest.approx(3.98 - 2.20, abs=0.02)


def test_an_undefined_constant_counts_as_nothing_and_is_noted():
    found = compute_site_row(Chem.MolFromSmiles("C[Zn]C"), 0).as_dict()
    assert found["alpha_count"] == 1 and found["alpha_undefined"] == 1
    assert all(np.isfinite(value) for value in found.values())


def test_electronegative_neighbours_show():
    assert row("CO", 0)["alpha_chi_attached"] > row("CN", 0)["alpha_chi_attached"] > row("CC", 0)["alpha_chi_attached"]
    assert row("CC(F)(F)F", 0)["alpha_sigma_star"] > row("CCF", 0)["alpha_sigma_star"] > row("CCC", 0)["alpha_sigma_star"]


@pytest.mark.parametrize(
    ("smiles", "site", "classes", "words"),
    [
        ("C1CCCC1", 0, ("C3H2r5", "C3"), "sp3 CH2 in a ring of 5"),
        ("c1ccccc1", 0, ("c2H1r6", "c2"), "aromatic CH"),
        ("c1ccc2ccccc2c1", 3, ("c2H0r6f", "c2"), "aromatic C at a fusion"),
        ("CC#N", 1, ("C1H0", "C1"), "sp C"),
        ("C[NH3+]", 1, ("N+3H3", "N+3"), "sp3 NH3+"),
        ("c1cc[nH]c1", 3, ("n2H1r5", "n2"), "aromatic NH in a ring of 5"),
    ],
)
def test_classes_and_their_words(smiles, site, classes, words):
    codes = compute_group_codes(Chem.MolFromSmiles(smiles))
    assert compute_site_class(codes, site) == classes and render_site_class(codes, site) == words


def test_rows_of_a_molecule_do_not_depend_on_numbering():
    mol = Chem.MolFromSmiles("CC(=O)Oc1ccccc1C(=O)O")
    order = list(reversed(range(mol.GetNumAtoms())))
    before, after = compute_site_rows(mol), compute_site_rows(Chem.RenumberAtoms(mol, order))
    for new, old in enumerate(order):
        np.testing.assert_allclose(before[old].values, after[new].values)
