"""What would decide between two structures, in a chemist's words."""

import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "assignment"))
from builder_hand_made_predictions import build_prediction

from shiftpred.judgement.experiments import propose_experiment


def propose(ours, theirs, ours_c13=(), theirs_c13=()):
    flat = {"c13": {i: 100.0 for i in range(40)}, "h1": {i: 5.0 for i in range(40)}}
    first = build_prediction(ours, flat["c13"] | dict(ours_c13), flat["h1"])
    second = build_prediction(theirs, flat["c13"] | dict(theirs_c13), flat["h1"])
    return propose_experiment(first, second)


def test_noe_to_a_doublet_of_two_or_eight_hertz():
    text = propose("COc1cc(C)ccc1O", "COc1ccc(C)cc1O")
    assert text.startswith("an NOE from O-CH3 decides")
    before, after = text.split(" in the proposal")
    assert "a doublet of about 2 Hz" in before and "a doublet of about 8 Hz" in after


def test_other_mass_first():
    assert propose("CCOC(C)=O", "COC(C)=O") == "a mass spectrum decides (C4H8O2 against C3H6O2)"


def test_hydrogen_counts():
    text = propose("CCCCO", "CC(C)CO")
    assert "DEPT" in text and "1 against 2 CH3" in text and "3 against 1 CH2" in text


def test_double_bonds():
    assert "about 16 Hz" in propose("C/C=C/C(=O)O", "C/C=C\\C(=O)O")
    assert "13C satellites" in propose("C(=C/c1ccccc1)\\c1ccccc1", "C(=C\\c1ccccc1)\\c1ccccc1"), "equivalent hydrogens"
    assert "13C satellites" not in propose("C/C=C/C(=O)O", "C/C=C\\C(=O)O")
    assert "NOE across the double bond" in propose("C/C(CC)=C(/C)C(=O)O", "C/C(CC)=C(\\C)C(=O)O")


def test_relative_configuration():
    assert "relative configuration" in propose("C[C@H]1CCCC[C@H]1O", "C[C@H]1CCCC[C@@H]1O")


def test_long_range_correlations_for_n_or_o():
    text = propose("COc1ccccn1", "Cn1ccccc1=O", {0: 53.0, 2: 164.0}, {0: 37.5, 6: 162.0, 2: 138.0})
    assert "HMBC" in text or "NOE" in text


@pytest.mark.parametrize(("ours", "theirs"), [("Cc1cccc(Cl)c1C#N", "Cc1ccc(Cl)cc1C#N"), ("CCC(=O)OC", "COC(=O)CC")])
def test_always_a_text_for_different_structures_and_none_for_the_same(ours, theirs):
    text = propose(ours, theirs)
    assert bool(text) == (ours == "Cc1cccc(Cl)c1C#N")


def test_meta_and_para_by_their_splitting():
    text = propose("COC(=O)c1cccc([N+](=O)[O-])c1", "COC(=O)c1ccc([N+](=O)[O-])cc1")
    assert text.startswith("the splitting of the aromatic hydrogens in the 1H spectrum decides")
    before, after = text.split(" in the proposal")
    assert "doublet (2H) and singlet (1H) and triplet (1H)" in before
    assert "doublet (4H)" in after
