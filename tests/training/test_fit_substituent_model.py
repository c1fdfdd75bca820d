"""The fit recovers rules that are known to be additive, resists wrong peaks, and keeps the estimator contract."""

import itertools

import numpy as np
import pytest
import scipy.sparse as sp
from rdkit import Chem
from sklearn.utils.estimator_checks import check_estimator

from shiftpred.errors import InputError
from shiftpred.regression.substituent_model import SubstituentModel
from shiftpred.training.fit_substituent_model import (
    ShrunkenRidge,
    build_substituent_design,
    compute_pull,
    fit_substituent_model,
    fit_to_peak_lists,
)
from shiftpred.training.open_tables import Compound


def compute_grant_paul(mol):
    """Alkane 13C shifts by -2.3 + 9.1 alpha + 9.4 beta - 2.5 gamma, and an additive 1H rule of the test's own."""
    distance = Chem.GetDistanceMatrix(mol)
    counts = [(distance == k).sum(axis=1) for k in (1, 2, 3)]
    c13 = -2.3 + 9.1 * counts[0] + 9.4 * counts[1] - 2.5 * counts[2]
    h1 = 0.2 + 0.65 * counts[0] + 0.05 * counts[1]
    h1[[a.GetTotalNumHs() == 0 for a in mol.GetAtoms()]] = np.nan
    return np.stack([c13, h1], axis=1)


def build_alkanes(most=9):
    """All constitutional alkanes with up to `most` carbons, grown atom by atom."""
    known = layer = {"C"}
    for _ in range(most - 1):
        grown = set()
        for smiles in layer:
            mol = Chem.MolFromSmiles(smiles)
            for atom in range(mol.GetNumAtoms()):
                if mol.GetAtomWithIdx(atom).GetDegree() < 4:
                    copy = Chem.RWMol(mol)
                    copy.AddBond(atom, copy.AddAtom(Chem.Atom("C")), Chem.BondType.SINGLE)
                    Chem.SanitizeMol(copy)
                    grown.add(Chem.MolToSmiles(copy))
        known = known | grown
        layer = grown
    return [Chem.MolFromSmiles(s) for s in sorted(known)]


@pytest.fixture(scope="module")
def alkanes():
    return build_alkanes()


@pytest.fixture(scope="module")
def fitted(alkanes):
    return fit_substituent_model(alkanes[::2], [compute_grant_paul(m) for m in alkanes[::2]])


def test_number_of_alkanes(alkanes):
    assert len(alkanes) == 1 + 1 + 1 + 2 + 3 + 5 + 9 + 18 + 35


def test_an_additive_rule_is_recovered_on_molecules_left_out(alkanes, fitted):
    error = np.concatenate(
        [fitted.predict(m, "13C") - compute_grant_paul(m)[:, 0] for m in alkanes[1::2] if m.GetNumAtoms() > 3]
    )
    assert np.abs(error).mean() < 0.5
    error = np.concatenate([fitted.predict(m, "1H") - compute_grant_paul(m)[:, 1] for m in alkanes[1::2]])
    assert np.nanmean(np.abs(error)) < 0.05


def test_contributions_read_as_the_rule_does(fitted):
    """Relative to hydrogen an alpha alkyl is worth about what Grant and Paul give it, alpha and beta together."""
    parts = fitted.contributions(Chem.MolFromSmiles("CCCCC"), 2, "13C")
    assert parts[0].contribution_ppm == pytest.approx(-2.3)
    alpha_and_beta = sum(p.contribution_ppm for p in parts if p.position in ("alpha", "beta") or p.kind == "base")
    assert alpha_and_beta == pytest.approx(-2.3 + 2 * 9.1 + 2 * 9.4, abs=1.0)


def test_a_few_wrong_peaks_do_little_harm(alkanes):
    rng = np.random.default_rng(0)
    targets = [compute_grant_paul(m) for m in alkanes]
    for target in targets[::10]:
        target[rng.integers(len(target)), 0] += 60.0
    model = fit_substituent_model(alkanes, targets)
    error = np.concatenate([model.predict(m, "13C") - compute_grant_paul(m)[:, 0] for m in alkanes])
    assert np.median(np.abs(error)) < 0.5


def test_a_molecule_without_weight_does_not_count(alkanes):
    targets = [compute_grant_paul(m) for m in alkanes]
    spoilt = [*targets, targets[-1] + 50.0]
    weight = [1.0] * len(targets) + [0.0]
    plain = fit_substituent_model(alkanes, targets)
    weighted = fit_substituent_model([*alkanes, alkanes[-1]], spoilt, sample_weight=weight)
    a, b = (m.predict(alkanes[-1], "13C") for m in (plain, weighted))
    np.testing.assert_allclose(a, b, atol=0.1)


def test_solvents_get_a_term(alkanes):
    targets = [compute_grant_paul(m) + (5.0 if k % 2 else 0.0) for k, m in enumerate(alkanes)]
    model = fit_substituent_model(alkanes, targets, solvents=["CDCl3", "D2O"] * (len(alkanes) // 2) + ["CDCl3"])
    mol = Chem.MolFromSmiles("CCCCC")
    shift = model.predict(mol, "13C", "D2O") - model.predict(mol, "13C", "CDCl3")
    assert shift.mean() == pytest.approx(5.0, abs=0.7)


def test_a_design_predicts_what_the_model_does(alkanes, fitted):
    design = build_substituent_design(alkanes)
    for mol, both in zip(alkanes, design.predict(fitted), strict=True):
        np.testing.assert_allclose(both[:, 0], fitted.predict(mol, "13C"), atol=1e-3)
        np.testing.assert_allclose(both[:, 1], fitted.predict(mol, "1H"), atol=1e-3)
    # Alike sites share a row: far fewer rows than atoms.
    assert design.rows.shape[0] < 0.8 * sum(m.GetNumAtoms() for m in alkanes)


def test_a_fitted_model_predicts_the_same_from_its_arrays(alkanes, fitted):
    again = SubstituentModel.from_arrays(*fitted.to_arrays())
    for mol in alkanes[:20]:
        np.testing.assert_array_equal(again.predict(mol, "13C"), fitted.predict(mol, "13C"))


def test_peak_lists_without_atom_numbers_are_enough(alkanes):
    rng = np.random.default_rng(1)
    compounds = []
    for key, mol in enumerate(alkanes):
        rank = list(Chem.CanonicalRankAtoms(mol, breakTies=False))
        atoms = rng.permutation([rank.index(r) for r in sorted(set(rank))])
        truth = compute_grant_paul(mol)[atoms]
        hydrogens = np.array([mol.GetAtomWithIdx(int(a)).GetTotalNumHs() for a in atoms])
        n = len(atoms)
        compounds.append(Compound(key, "", mol, truth[:, 0], truth[:, 1], hydrogens, np.arange(n), []))
    lines = []
    model, targets = fit_to_peak_lists(compounds, n_rounds=4, log=lines.append)
    assert len(lines) == 4 and len(targets) == len(alkanes)
    error = np.concatenate([model.predict(m, "13C") - compute_grant_paul(m)[:, 0] for m in alkanes])
    assert np.median(np.abs(error)) < 1.0
    assert "carbons at" in lines[-1]


@pytest.mark.parametrize(
    ("mols", "targets", "words"),
    [
        (["CC"], [], "0 arrays for 1 molecules"),
        ([], [], "0 arrays for 0 molecules"),
        (["CC"], [np.zeros((3, 2))], r"entry 0: got an array of shape \(3, 2\)"),
        (["CC"], [np.full((2, 2), np.nan)], "no 13C shift"),
    ],
)
def test_arguments_that_do_not_fit_together_are_named(mols, targets, words):
    with pytest.raises(InputError, match=words):
        fit_substituent_model([Chem.MolFromSmiles(s) for s in mols], targets)


def test_molecules_without_sites_are_refused():
    with pytest.raises(InputError, match="no carbon and no hydrogen"):
        build_substituent_design([Chem.MolFromSmiles("O=S=O")])


def test_the_estimator_contract():
    results = check_estimator(ShrunkenRidge(), on_fail=None, on_skip=None)
    failed = {r["check_name"]: r["exception"] for r in results if r["status"] == "failed"}
    assert not failed
    assert sum(r["status"] == "passed" for r in results) > 30


@pytest.mark.parametrize("as_sparse", [False, True])
def test_columns_with_a_small_scale_are_shrunk_more(as_sparse):
    X = np.array(list(itertools.product([0.0, 1.0], repeat=2)) * 5)
    y = X.sum(axis=1)
    X_in = sp.csr_array(X) if as_sparse else X
    ridge = ShrunkenRidge(alpha=1.0, column_scale=[1.0, 0.1]).fit(X_in, y)
    assert ridge.coef_[0] > 3 * ridge.coef_[1] > 0
    assert ridge.predict(X_in).shape == (20,)


def test_outliers_pull_linearly():
    assert compute_pull(np.array([0.0, 1.0, -4.0]), 2.0).tolist() == [1.0, 1.0, 0.5]
    X, y = np.linspace(0, 1, 50)[:, None], np.linspace(0, 1, 50)
    y[-1] += 100.0
    plain = ShrunkenRidge(alpha=1e-6).fit(X, y).coef_[0]
    robust = ShrunkenRidge(alpha=1e-6, outlier=0.1, n_reweightings=20).fit(X, y).coef_[0]
    assert abs(robust - 1) < 0.2 * abs(plain - 1)
