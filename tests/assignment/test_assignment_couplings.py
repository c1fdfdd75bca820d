"""Fluorine and phosphorus: expected splittings, and lines that belong together."""

import pytest
from builder_hand_made_predictions import build_peaks, build_prediction
from rdkit import Chem

from shiftpred.assignment import assign_structure, prepare_peaks
from shiftpred.assignment.couplings import compute_coupling_density, compute_expected_couplings
from shiftpred.assignment.describe import build_assignments, build_missing, build_unexplained
from shiftpred.assignment.prepared_peaks import compute_carbon_frequency

# 4'-Fluoroacetophenone in CDCl3, from memory; 0 CH3, 1 C=O, 3 C-1, 4/9 C-2,6, 5/8 C-3,5, 6 C-F.
PARA = ("CC(=O)c1ccc(F)cc1", {0: 26.5, 1: 196.4, 3: 133.5, 4: 130.9, 5: 115.6, 6: 165.7})
# 3'-Fluoroacetophenone, from memory; 3 C-1, 4 C-6, 5 C-5, 6 C-4, 7 C-F, 9 C-2.
META = ("CC(=O)c1cccc(F)c1", {0: 26.7, 1: 196.7, 3: 139.2, 4: 124.2, 5: 130.3, 6: 120.1, 7: 162.9, 9: 114.9})
JOURNAL = (
    196.5, {"shift_ppm": 165.7, "multiplicity": "d", "couplings_hz": (254.0,)},
    {"shift_ppm": 133.6, "multiplicity": "d", "couplings_hz": (3.0,)},
    {"shift_ppm": 130.9, "multiplicity": "d", "couplings_hz": (9.0,), "carbons": 2},
    {"shift_ppm": 115.6, "multiplicity": "d", "couplings_hz": (22.0,), "carbons": 2}, 26.5,
)  # fmt: skip
PLAIN = (196.5, 166.96, 164.44, 133.61, 133.59, 130.94, 130.86, 115.71, 115.49, 26.5)


def fit(case, peaks, frequency=None):
    return assign_structure(build_prediction(*case), prepare_peaks({"13C": build_peaks("13C", *peaks)}, "CDCl3", frequency))


def test_couplings_by_distance():
    found = compute_expected_couplings(Chem.MolFromSmiles(PARA[0]))
    assert {i: c[0].bonds for i, c in found.items()} == {6: 1, 5: 2, 8: 2, 4: 3, 9: 3, 3: 4}
    assert [c.nuclei for c in compute_expected_couplings(Chem.MolFromSmiles("CC(F)(F)F"))[1]] == [3]
    assert compute_expected_couplings(Chem.MolFromSmiles("CCO")) == {}
    assert compute_expected_couplings(Chem.MolFromSmiles("CCCC.F")) == {}, "hydrogen fluoride splits nothing"


def test_usual_splittings_are_likelier_than_others():
    one_bond = compute_expected_couplings(Chem.MolFromSmiles(PARA[0]))[6][0]
    assert compute_coupling_density(one_bond, 248) > 50 * compute_coupling_density(one_bond, 100)


@pytest.mark.parametrize("frequency", [101, 402, None])
def test_ten_lines_are_six_carbons(frequency):
    found = fit(PARA, PLAIN, frequency)
    assert not build_missing(found) and not build_unexplained(found)
    notes = {a.atom: a.note for a in build_assignments(found)}
    assert "166.96, 164.44" in notes[7] and "doublet by fluorine" in notes[7]
    assert {a.atom: round(a.observed_ppm, 1) for a in build_assignments(found)}[7] == 165.7


def test_both_ways_of_listing_are_worth_the_same():
    margins = [fit(PARA, p, f).log_evidence - fit(META, p, f).log_evidence for p, f in ((JOURNAL, None), (PLAIN, 101))]
    assert min(margins) > 8, "the wrong isomer does not win by its number of lines"
    assert abs(fit(PARA, JOURNAL).log_evidence - fit(PARA, PLAIN, 101).log_evidence) < 4


def test_a_trifluoromethyl_quartet_and_its_absence():
    # trifluoroacetophenone-like: CF3 116.6 (q, 291 Hz), C=O 180.5 (q, 35 Hz)
    case = ("FC(F)(F)C(=O)c1ccccc1", {1: 116.6, 4: 180.5, 6: 129.9, 7: 130.1, 8: 129.1, 9: 135.5})
    quartet = [116.6 + d * 2.88 for d in (-1.5, -0.5, 0.5, 1.5)]
    inner = [180.5 + d * 0.347 for d in (-1.5, -0.5, 0.5, 1.5)]
    rest = [129.9, 130.1, 129.1, 135.5]
    whole = fit(case, [*rest, *quartet, *inner], 101)
    assert not build_unexplained(whole) and not build_missing(whole)
    without = fit(case, [*rest, *inner], 101)
    assert [m.atom for m in build_missing(without)] == [2]
    assert "fluorine" in build_missing(without)[0].note


def test_phosphorus_splits_too():
    # diethyl methylphosphonate, from memory: CH3 11.3 (d, 144 Hz), OCH2 61.5 (d, 6 Hz), CH3 16.4 (d, 6 Hz)
    case = ("CCOP(C)(=O)OCC", {0: 16.4, 1: 61.5, 4: 11.3})
    found = fit(case, [16.43, 16.37, 61.53, 61.47, 12.0, 10.57], 101)
    assert not build_unexplained(found) and not build_missing(found)
    assert "doublet by phosphorus" in {a.atom: a.note for a in build_assignments(found)}[5]


def test_frequency_of_either_nucleus():
    assert compute_carbon_frequency(101) == 101
    assert compute_carbon_frequency(400) == pytest.approx(100.6, abs=0.1)
    assert compute_carbon_frequency(None) is None
