"""Published rules give the published numbers, and nothing where they do not apply."""

import csv
import hashlib

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.bundles.locations import find_datasets
from shiftpred.errors import SettingError
from shiftpred.training.additivity_rules import RULES, predict_by_rules, predict_each_rule
from shiftpred.training.additivity_tables import find_group_names, load_increments
from shiftpred.training.measured_shifts import load_measured_shifts

FOLDER = find_datasets() / "shift_increments"


def rule(smiles, nucleus, name):
    return predict_each_rule(Chem.MolFromSmiles(smiles))[nucleus][name]


def assert_value(found, expected, tolerance=0.006):
    assert found == pytest.approx(expected, abs=tolerance)


# ── The tables ──────────────────────────────────────────────────────────────────────────────────────────────────────────


def test_every_increment_has_a_source_and_says_whether_it_was_seen():
    with open(FOLDER / "shift_increments.csv", encoding="utf-8", newline="") as handle:
        rows = list(csv.DictReader(handle))
    assert all(r["source"].strip() and r["verified"] in ("transcription", "memory") for r in rows)
    assert len(load_increments()) == len(rows), "two rows with one key"


@pytest.mark.parametrize("folder", ["shift_increments", "measured_shifts"])
def test_the_card_states_the_check_sums(folder):
    card = (find_datasets() / folder / "README.md").read_text(encoding="utf-8")
    for path in (find_datasets() / folder).glob("*.csv"):
        assert hashlib.sha256(path.read_bytes()).hexdigest() in card, f"{path.name} is not the file of the card"


def test_every_pattern_can_be_read_and_names_a_group_of_some_table():
    known = {key[2] for key in load_increments()}
    with open(FOLDER / "group_patterns.csv", encoding="utf-8", newline="") as handle:
        for row in csv.DictReader(handle):
            pattern = Chem.MolFromSmarts(row["smarts"])
            assert pattern is not None and pattern.GetNumAtoms() >= 2, row
            assert set(row["names"].split(";")) & known, f"{row['names']} is in no table"


def test_groups_are_named_from_special_to_general():
    names = find_group_names(Chem.MolFromSmiles("COc1ccccc1"))
    assert names[2, 1] == ("OCH3", "OR", "OR(R_aliphatic)", "OH/OR")
    assert names[0, 1][0] == "OC6H5"


# ── Worked values ───────────────────────────────────────────────────────────────────────────────────────────────────────


@pytest.mark.parametrize(
    ("smiles", "atom", "expected"),
    [
        # Silverstein, appendix: benzyl bromide 0.23 + 1.85 + 2.33 (from the note in the increments table).
        ("BrCc1ccccc1", 1, 4.41),
        # Shoolery's usual example CH2BrCl (from memory), 0.23 + 2.33 + 2.53.
        ("ClCBr", 1, 5.09),
        # Diphenylmethane, 0.23 + 2 x 1.85 (from memory).
        ("c1ccccc1Cc1ccccc1", 6, 3.93),
    ],
)
def test_shoolery(smiles, atom, expected):
    assert_value(rule(smiles, "1H", "Shoolery")[atom], expected)


def test_methine_rule_adds_three_groups():
    # 1.5 + 1.7 (OR) + 1.3 (C6H5) + 0 (alkyl): base and constants as tabulated by Williams and Fleming.
    assert_value(rule("COC(C)c1ccccc1", "1H", "CHXYZ")[2], 4.5)


def test_saturated_hydrogens_count_alpha_beta_and_gamma():
    # Beauchamp and Marquez' increments on 1-chloropropane: alpha 2.2, beta 0.5, gamma 0.2 on 1.2, 1.2 and 0.9.
    assert rule("ClCCC", "1H", "sp3 C-H")[1:] == pytest.approx([3.4, 1.7, 1.1])


@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        # 3-Methylpentane, worked in Silverstein with the base -2.5 as 11.3, 29.5, 36.2, 19.3 (from memory); here -2.3.
        ("CCC(C)CC", {0: 11.5, 1: 29.7, 2: 36.4, 3: 19.5}),
        # 2,2-Dimethylbutane: C1 -2.3 + 9.1 + 28.2 - 2.5 - 3.4; C2 -2.3 + 36.4 + 9.4 - 3 x 1.5 - 8.4.
        ("CC(C)(C)CC", {0: 29.1, 1: 30.6}),
    ],
)
def test_grant_and_paul(smiles, expected):
    found = rule(smiles, "13C", "alkane")
    for atom, value in expected.items():
        assert_value(found[atom], value)


def test_grant_and_paul_against_measured_alkanes():
    table = load_measured_shifts()
    rows = table[table.source.str.contains("Sadtler")]
    errors = [abs(rule(r.smiles, "13C", "alkane")[int(r.atom_index)] - r.shift_ppm) for r in rows.itertuples()]
    assert len(errors) == 41 and np.mean(errors) < 0.4 and max(errors) < 2.0


def test_bare_linking_groups_count_what_is_beyond():
    # Acetone 30.9 and triethylamine 46.3 (CDCl3, Gottlieb 1997).
    assert_value(rule("CC(C)=O", "13C", "alkane")[0], 30.9, 2.0)
    assert_value(rule("CCN(CC)CC", "13C", "alkane")[1], 46.3, 3.0)


def test_alkene_carbons():
    # 3-Methyl-2-pentene, worked in Silverstein (from memory): C-3 137.9 (found 137.2), C-2 117.7 (found 116.8).
    found = rule("CC/C(C)=C\\C", "13C", "alkene")
    assert_value(found[2], 137.9)
    assert_value(found[4], 117.7)
    # cis- and trans-2-butene differ by the Z correction alone.
    cis, trans = rule("C/C=C\\C", "13C", "alkene")[1], rule("C/C=C/C", "13C", "alkene")[1]
    assert_value(trans - cis, 1.1)


@pytest.mark.parametrize(
    ("smiles", "atom", "expected", "tolerance"),
    [
        # Found values from memory: ethyl (E)-cinnamate 6.43 and 7.68, (Z) 5.94 and 6.94; vinyl acetate 7.28.
        ("CCOC(=O)/C=C/c1ccccc1", 5, 6.43, 0.1),
        ("CCOC(=O)/C=C/c1ccccc1", 6, 7.68, 0.1),
        ("CCOC(=O)/C=C\\c1ccccc1", 5, 5.94, 0.1),
        ("CCOC(=O)/C=C\\c1ccccc1", 6, 6.94, 0.2),
        ("C=COC(C)=O", 1, 7.28, 0.1),
        # In a ring the ring atoms are cis: cyclohexene 5.66 (found 5.65).
        ("C1CCC=CC1", 3, 5.65, 0.05),
    ],
)
def test_olefinic_hydrogens(smiles, atom, expected, tolerance):
    assert_value(rule(smiles, "1H", "olefin")[atom], expected, tolerance)


def test_unknown_geometry_gets_the_mean():
    e, z, unknown = (rule(s, "1H", "olefin")[1] for s in ("C/C=C/Cl", "C/C=C\\Cl", "CC=CCl"))
    assert e != z
    assert_value(unknown, (e + z) / 2)


@pytest.mark.parametrize("name", ["toluene", "anisole", "chlorobenzene", "ethylbenzene", "benzyl alcohol", "o-xylene"])
def test_benzene_carbons_against_measured_shifts(name):
    table = load_measured_shifts()
    rows = table[(table["name"] == name) & (table.nucleus == "13C") & (table.solvent == "CDCl3")]
    errors = [
        rule(r.smiles, "13C", "benzene")[int(r.atom_index)] - r.shift_ppm
        for r in rows.itertuples()
        if not np.isnan(rule(r.smiles, "13C", "benzene")[int(r.atom_index)])
    ]
    assert errors and np.abs(errors).mean() < 1.0


def test_benzene_hydrogens_add_up():
    # 4-Nitroanisole: 7.26 - 0.48 + 0.26 ortho to OCH3, 7.26 + 0.95 - 0.09 ortho to NO2 (found 6.96 and 8.21, from memory).
    found = rule("COc1ccc([N+](=O)[O-])cc1", "1H", "benzene")
    assert_value(found[3], 7.04)
    assert_value(found[4], 8.12)


# ── Where no rule applies ───────────────────────────────────────────────────────────────────────────────────────────────


@pytest.mark.parametrize(
    ("smiles", "nucleus", "atom"),
    [
        ("C1CCCCC1", "13C", 0),  # a ring: not for the alkane rule
        ("c1ccc2ccccc2c1", "13C", 0),  # fused rings
        ("c1ccncc1", "1H", 0),  # a heteroaromatic ring
        ("CC(=O)O", "13C", 1),  # a carbonyl
        ("C[Hg]C", "13C", 0),  # a group that is in no table
        ("FC(F)(F)C", "13C", 1),  # several heteroatoms on one carbon
        ("CO", "1H", 1),  # a hydrogen on oxygen
        ("C=C=C", "1H", 0),  # a cumulene
    ],
)
def test_no_value_where_no_rule_applies(smiles, nucleus, atom):
    assert np.isnan(predict_by_rules(Chem.MolFromSmiles(smiles), nucleus)[atom])


def test_the_order_of_the_atoms_does_not_matter():
    mol = Chem.MolFromSmiles("CCOC(=O)/C=C/c1ccc(OC)cc1CC(C)Cl")
    order = [int(i) for i in np.random.default_rng(5).permutation(mol.GetNumAtoms())]
    for nucleus in RULES:
        there = predict_by_rules(Chem.RenumberAtoms(mol, order), nucleus)
        np.testing.assert_allclose(there, predict_by_rules(mol, nucleus)[order])


def test_an_unknown_nucleus_is_refused():
    with pytest.raises(SettingError, match="'15N'.*expected '13C' or '1H'"):
        predict_by_rules(Chem.MolFromSmiles("CC"), "15N")
