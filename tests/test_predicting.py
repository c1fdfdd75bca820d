"""`predict` as a whole: the contract's table, invariance, flat memory, speed of import left to the benchmarks."""

import numpy as np
import pandas as pd
import pytest
from rdkit import Chem

import shiftpred
from shiftpred.errors import SettingError
from shiftpred.pipeline import iterate_predictions
from shiftpred.structures import parse_structures

COLUMNS = [
    "molecule",
    "atom",
    "nucleus",
    "hydrogen",
    "attached_h",
    "equivalent_atoms",
    "shift_ppm",
    "lower_ppm",
    "upper_ppm",
    "coverage",
    "environment",
    "note",
]
SMILES = [
    "CCOC(=O)c1ccccc1",
    "CC(C)[C@H](N)C(=O)O",
    "C/C=C\\C(=O)N(C)C",
    "O=[N+]([O-])c1ccc(F)cc1",
    "C[C@]12CC[C@H]3[C@@H](CCC4=CC(=O)CC[C@@]34C)[C@@H]1CC[C@@H]2O",
]


def by_rank(smiles_or_mol):
    """Return shifts by canonical rank of the atom, which does not depend on the drawing."""
    mol = smiles_or_mol if isinstance(smiles_or_mol, Chem.Mol) else Chem.MolFromSmiles(smiles_or_mol)
    table = shiftpred.predict(smiles_or_mol)
    rank = list(Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False))
    return sorted(
        (rank[a - 1], n, h, s, lo, hi)
        for a, n, h, s, lo, hi in zip(
            table.atom, table.nucleus, table.hydrogen, table.shift_ppm, table.lower_ppm, table.upper_ppm
        )
    )


def test_the_contracts_columns():
    table = shiftpred.predict("CCOC(=O)c1ccccc1")
    assert list(table.columns) == COLUMNS
    assert len(table) == 9 + 7 and set(table.nucleus) == {"13C", "1H"}
    assert (table.lower_ppm < table.shift_ppm).all() and (table.shift_ppm < table.upper_ppm).all()
    ortho = table[(table.atom == 7) & (table.nucleus == "13C")].iloc[0]
    assert ortho.equivalent_atoms == "7;11" and ortho.attached_h == 1 and ortho.environment == "aromatic CH"


@pytest.mark.parametrize("smiles", SMILES)
def test_atom_order_does_not_change_a_prediction(smiles):
    mol = Chem.MolFromSmiles(smiles)
    reference = by_rank(smiles)
    for seed in range(3):
        order = np.random.default_rng(seed).permutation(mol.GetNumAtoms()).tolist()
        again = by_rank(Chem.RenumberAtoms(mol, order))
        assert [r[:3] for r in again] == [r[:3] for r in reference]
        assert np.allclose([r[3:] for r in again], [r[3:] for r in reference], atol=2e-4)


@pytest.mark.parametrize(
    "one, other",
    [
        ("c1ccccc1C", "C1=CC=CC=C1C"),
        ("CN(=O)=O", "C[N+](=O)[O-]"),
        ("CS(C)=O", "C[S+](C)[O-]"),
        ("CCO", "[H]OC([H])([H])C([H])([H])[H]"),
        ("C[C@H](N)C(=O)O", "C[C@@H](N)C(=O)O"),
    ],
)
def test_drawings_and_mirror_images_agree(one, other):
    first, second = shiftpred.predict(one), shiftpred.predict(other)
    key = ["nucleus", "shift_ppm", "hydrogen"]
    a, b = (t[key].sort_values(key).reset_index(drop=True) for t in (first, second))
    assert np.allclose(a.shift_ppm, b.shift_ppm, atol=2e-4) and list(a.nucleus) == list(b.nucleus)


def test_equivalent_atoms_share_their_shift_to_the_last_digit():
    table = shiftpred.predict("Cc1ccc(C)cc1")
    assert table.groupby(["nucleus", "equivalent_atoms"]).shift_ppm.nunique().max() == 1


def test_differing_hydrogens_have_two_rows():
    table = shiftpred.predict("OC[C@H](N)C(=O)O", nucleus="1H")
    pair = table[table.atom == 2]
    assert list(pair.hydrogen) == ["a", "b"] and pair.shift_ppm.iloc[0] >= pair.shift_ppm.iloc[1]


def test_batch_and_single_agree():
    together = shiftpred.predict(SMILES)
    alone = pd.concat([shiftpred.predict(s) for s in SMILES])
    assert np.allclose(together.shift_ppm, alone.shift_ppm, atol=1e-4)


def test_wider_for_more_coverage():
    narrow, wide = (shiftpred.predict("CCOC(C)=O", coverage=c) for c in (0.5, 0.95))
    assert ((wide.upper_ppm - wide.lower_ppm) > (narrow.upper_ppm - narrow.lower_ppm)).all()


def test_labile_hydrogens_are_wide_and_said():
    table = shiftpred.predict("CCO", nucleus="1H")
    width = table.upper_ppm - table.lower_ppm
    assert width[table.atom == 3].iloc[0] > 2 * width[table.atom == 1].iloc[0]
    assert "exchangeable" in table[table.atom == 3].note.iloc[0]


def test_unlike_the_training_data_is_said_and_wider():
    """No selenocyanate beside a boron cage was ever in a table of organic shifts."""
    table = shiftpred.predict("C[Te](=O)C#N", nucleus="13C")
    assert table.note.str.contains("unlike the training data").any()


def test_salt_is_predicted_and_noted():
    table = shiftpred.predict("CC(=O)[O-].[Na+]")
    assert table.note.str.contains("2 components").all() and len(table[table.nucleus == "13C"]) == 2


def test_bad_record_is_one_row():
    table = shiftpred.predict(["CCO", "C(C)(C)(C)(C)C", "CC"])
    bad = table[table.molecule == "2"]
    assert len(bad) == 1 and bad.shift_ppm.isna().all() and "5 bonds" in bad.note.iloc[0]


@pytest.mark.parametrize(
    "keywords, message",
    [
        ({"nucleus": "13N"}, "nucleus: got '13N'"),
        ({"coverage": 2}, "coverage: got 2"),
        ({"solvent": "brine"}, "solvent: got 'brine'"),
    ],
)
def test_settings_outside_what_is_accepted(keywords, message):
    with pytest.raises(SettingError, match=message):
        shiftpred.predict("CCO", **keywords)


def test_predictions_come_one_after_the_other():
    """A generator of a million records is not read ahead by more than one batch."""
    taken = []

    def endless():
        while True:
            taken.append(1)
            yield from parse_structures("CCO")

    predictions = iterate_predictions(endless())
    for _ in range(3):
        next(predictions)
    assert len(taken) <= 256


def test_explanation_adds_up_exactly():
    explanation = shiftpred.explain("CCOC(=O)c1ccccc1", 1, "13C")
    total = sum(c.contribution_ppm for c in explanation.contributions)
    assert total == pytest.approx(explanation.shift_ppm, abs=1e-9)
    kinds = [c.kind for c in explanation.contributions]
    assert kinds[0] == "base" and kinds[-1] == "remainder" and "substituent" in kinds
    assert any(c.constants for c in explanation.contributions)


def test_explanation_of_an_atom_without_the_nucleus():
    with pytest.raises(SettingError, match="no 13C here"):
        shiftpred.explain("CCO", 2, "13C")
