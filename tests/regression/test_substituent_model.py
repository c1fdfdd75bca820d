"""Contributions add up exactly; nothing is lost on disk; numbering does not matter."""

import json
import random

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.errors import BundleError, SettingError
from shiftpred.features.site_rows import CONSTANTS
from shiftpred.records import Structure
from shiftpred.regression.explanation_parts import build_explanation_parts, compute_residual_scale
from shiftpred.regression.substituent_model import (
    BASE_PENALTIES,
    NucleusTable,
    SubstituentModel,
    compute_base_terms,
    compute_place_penalties,
    compute_place_terms,
)
from shiftpred.substituents.group_codes import compute_group_codes
from shiftpred.substituents.positions import POSITIONS, compute_places

SMILES = (
    "CCOC(C)=O",
    "COc1ccc(C(C)=O)cc1",
    "CC(C)C[C@H](NC(=O)OC(C)(C)C)C(=O)OC",
    "O=C1CCCCC1",
    "c1ccc2ccccc2c1",
    "C=CC#N",
    "C1CC1C(=C)C#C",
    "Cn1cnc2c1c(=O)n(C)c(=O)n2C",
    "C",
    "C[N+](C)(C)CC(=O)[O-]",
    "C=C=C",
)


def build_model(seed=0):
    """A model with random numbers for every term that the listed molecules have."""
    rng = random.Random(seed)
    terms, classes = set(), set()
    for smiles in SMILES:
        codes = compute_group_codes(Chem.MolFromSmiles(smiles))
        for i in range(codes.n_atoms):
            fine, coarse, base = compute_base_terms(codes, i)
            classes.add(coarse)
            terms.update(base)
            for place in compute_places(codes, i, 4):
                terms.update(compute_place_terms(codes, fine, coarse, place))
    terms.update({"C3~CDCl3", "c2~CDCl3"})
    tables = {}
    for nucleus, size in (("13C", 20.0), ("1H", 1.0)):
        increments = {t: float(np.float32(rng.uniform(-size, size))) for t in sorted(terms)}
        names = tuple(sorted(classes))
        coefficients = np.array(
            [rng.uniform(-size, size) for _ in range(len(names) * len(POSITIONS) * len(CONSTANTS))]
        ).reshape(len(names), len(POSITIONS), len(CONSTANTS))
        tables[nucleus] = NucleusTable(size * 3, increments, names, coefficients)
    return SubstituentModel(tables, {"seed": seed})


@pytest.fixture(scope="module")
def model():
    return build_model()


def build_structure(smiles, first=1):
    mol = Chem.MolFromSmiles(smiles)
    return Structure("x", mol, tuple(range(first, first + mol.GetNumAtoms())), smiles)


@pytest.mark.parametrize("smiles", SMILES)
@pytest.mark.parametrize("nucleus", ["13C", "1H"])
@pytest.mark.parametrize("solvent", [None, "CDCl3"])
def test_contributions_add_up_to_the_prediction(model, smiles, nucleus, solvent):
    mol = Chem.MolFromSmiles(smiles)
    predicted = model.predict(mol, nucleus, solvent)
    assert predicted.shape == (mol.GetNumAtoms(),)
    for i in np.flatnonzero(~np.isnan(predicted)):
        parts = model.contributions(mol, int(i), nucleus, solvent)
        assert sum(p.contribution_ppm for p in parts) == pytest.approx(predicted[i], abs=1e-8)
        assert parts[0].kind == "base" and [p.kind for p in parts].count("solvent") == (solvent is not None)
        alpha = sorted(a for p in parts if p.position == "alpha" for a in p.atoms)
        assert alpha == [a for a in range(mol.GetNumAtoms()) if a != i]


def test_only_sites_of_the_nucleus_get_a_number(model):
    mol = Chem.MolFromSmiles("CC(=O)NC")
    assert np.isnan(model.predict(mol, "13C")).tolist() == [False, False, True, True, False]
    assert np.isnan(model.predict(mol, "1H")).tolist() == [False, True, True, False, False]


@pytest.mark.parametrize("smiles", SMILES)
def test_numbering_of_atoms_does_not_matter(model, smiles):
    mol = Chem.MolFromSmiles(smiles)
    order = list(range(mol.GetNumAtoms()))
    random.Random(3).shuffle(order)
    shuffled = Chem.RenumberAtoms(mol, order)
    np.testing.assert_allclose(model.predict(shuffled, "13C"), model.predict(mol, "13C")[order], atol=1e-9)


def test_equivalent_atoms_get_equal_numbers(model):
    mol = Chem.MolFromSmiles("COc1ccc(C(C)=O)cc1")
    predicted = model.predict(mol, "1H")
    ranks = np.array(Chem.CanonicalRankAtoms(mol, breakTies=False))
    for rank in set(ranks):
        values = predicted[ranks == rank]
        assert np.isnan(values).all() or np.ptp(values) < 1e-9


def test_a_model_survives_its_arrays_without_pickle(model, tmp_path):
    arrays, meta = model.to_arrays()
    np.savez(tmp_path / "arrays.npz", **arrays)
    (tmp_path / "meta.json").write_text(json.dumps(meta))
    with np.load(tmp_path / "arrays.npz", allow_pickle=False) as stored:
        again = SubstituentModel.from_arrays(stored, json.loads((tmp_path / "meta.json").read_text()))
    for smiles in SMILES:
        mol = Chem.MolFromSmiles(smiles)
        for nucleus in ("13C", "1H"):
            np.testing.assert_array_equal(again.predict(mol, nucleus), model.predict(mol, nucleus))
    assert again.description == {"seed": 0}


@pytest.mark.parametrize(("key", "value"), [("format", 0), ("constants", ["chi"]), ("positions", ["alpha"])])
def test_arrays_of_another_kind_are_refused(model, key, value):
    arrays, meta = model.to_arrays()
    with pytest.raises(BundleError, match="train the model anew"):
        SubstituentModel.from_arrays(arrays, {**meta, key: value})


def test_damaged_arrays_are_refused(model):
    arrays, meta = model.to_arrays()
    arrays["13C_increments"] = arrays["13C_increments"][:-1]
    with pytest.raises(BundleError, match="terms and"):
        SubstituentModel.from_arrays(arrays, meta)


def test_coefficients_of_the_wrong_shape_are_refused():
    with pytest.raises(ValueError, match="coefficients of shape"):
        NucleusTable(0.0, {}, ("C3",), np.zeros((2, 2, 2)))


def test_unknown_nucleus_and_atoms_without_it_are_refused(model):
    mol = Chem.MolFromSmiles("CCO")
    with pytest.raises(SettingError, match="'15N'"):
        model.predict(mol, "15N")
    with pytest.raises(SettingError, match="a carbon"):
        model.contributions(mol, 2, "13C")
    with pytest.raises(SettingError, match="bears hydrogen"):
        model.contributions(Chem.MolFromSmiles("CC(=O)C"), 1, "1H")


def test_the_base_of_an_open_chain_carbon_is_that_of_methane_or_ethene(model):
    for smiles, site, nucleus, zero in (
        ("CCOC(C)=O", 1, "13C", -2.3),
        ("CCOC(C)=O", 1, "1H", 0.23),
        ("C=CC#N", 1, "13C", 123.3),
    ):
        base = model.contributions(Chem.MolFromSmiles(smiles), site, nucleus)[0]
        assert base.contribution_ppm == pytest.approx(zero)


def test_reference_neighbours_contribute_nothing(model):
    """Ethene's =CH2, ethyne's CH and benzene's ring CH are the zero of their kind of bond."""
    for smiles in ("C=C", "C#C", "c1ccccc1"):
        parts = model.contributions(Chem.MolFromSmiles(smiles), 0, "13C")
        assert [p.contribution_ppm for p in parts if p.position == "alpha"] == pytest.approx(
            [0.0] * (2 if smiles.startswith("c") else 1), abs=1e-9
        )


def test_an_explanation_ends_with_the_remainder_and_adds_up(model):
    structure = build_structure("CCOC(C)=O", first=11)
    lines = build_explanation_parts(structure, 1, "13C", model, 60.5)
    assert sum(line.contribution_ppm for line in lines) == pytest.approx(60.5, abs=1e-9)
    assert lines[-1].kind == "remainder" and lines[-1].flag == ""
    acetoxy = next(line for line in lines if line.label == "alpha acetoxy")
    assert acetoxy.atoms == (13, 14, 15, 16) and acetoxy.group == "*OC(C)=O"
    assert set(acetoxy.constants) == set(CONSTANTS)
    assert acetoxy.constants["chi_attached"] == pytest.approx(3.44, abs=0.02)  # oxygen, Pauling's scale


def test_a_large_remainder_is_flagged_by_the_scale_of_its_class():
    model = build_model()
    structure = build_structure("CCOC(C)=O")
    own = float(model.predict(structure.mol, "13C")[1])
    model.set_residual_scale("13C", {"C3": 2.0, "": 9.0})
    for remainder, flag in ((1.9, ""), (-2.1, "large remainder"), (2.1, "large remainder")):
        assert build_explanation_parts(structure, 1, "13C", model, own + remainder)[-1].flag == flag
    carbonyl = float(model.predict(structure.mol, "13C")[3])
    assert build_explanation_parts(structure, 3, "13C", model, carbonyl + 5)[-1].flag == ""
    assert build_explanation_parts(structure, 3, "13C", model, carbonyl + 9.5)[-1].flag == "large remainder"
    # The scale is kept on disk with the model.
    again = SubstituentModel.from_arrays(*model.to_arrays())
    assert again.tables["13C"].residual_scale == {"C3": 2.0, "": 9.0}


def test_the_residual_scale_is_the_95th_percentile_by_class(model):
    mols = [Chem.MolFromSmiles("CCCC")] * 50  # 200 sp3 carbons
    rng = np.random.default_rng(0)
    totals = [np.stack([model.predict(m, n) for n in ("13C", "1H")], axis=1) + rng.uniform(-1, 1, (4, 2)) for m in mols]
    scale = compute_residual_scale(model, mols, totals)
    assert scale["13C"]["C3"] == pytest.approx(0.95, abs=0.03) and scale["13C"][""] == scale["13C"]["C3"]


def test_terms_and_penalties_go_together():
    codes = compute_group_codes(Chem.MolFromSmiles("COc1ccc(C(C)=O)cc1"))
    for i in range(codes.n_atoms):
        fine, coarse, base = compute_base_terms(codes, i)
        assert len(base) == len(BASE_PENALTIES)
        for place in compute_places(codes, i, 4):
            assert len(compute_place_terms(codes, fine, coarse, place)) == len(compute_place_penalties(place))
