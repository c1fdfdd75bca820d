"""One structure against peak lists, with predictions made by hand."""

import random

import pytest
from builder_hand_made_predictions import ETHYL_BENZOATE_C13, build_ethyl_benzoate, build_peaks, build_prediction

from shiftpred.assignment import assign_structure, prepare_peaks
from shiftpred.assignment.describe import build_assignments, build_balance, build_missing, build_unexplained

LIST = (166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3)


def fit(prediction, *lists, solvent="CDCl3", frequency=None, expected=()):
    return assign_structure(prediction, prepare_peaks({p.nucleus: p for p in lists}, solvent, frequency), expected)


def by_atom(found, nucleus="13C"):
    return {a.atom: a for a in build_assignments(found) if a.nucleus == nucleus}


def test_each_line_goes_to_its_own_nucleus():
    found = fit(build_ethyl_benzoate(), build_peaks("13C", *LIST))
    assert {a: x.observed_ppm for a, x in by_atom(found).items()} == {
        1: 14.3, 2: 60.9, 4: 166.6, 6: 130.5, 7: 129.5, 8: 128.3, 9: 132.8,
    }  # fmt: skip
    assert not build_unexplained(found) and not build_missing(found)
    assert all(a.within_interval and a.probability > 0.5 for a in build_assignments(found))


def test_assigned_and_leftover_lines_are_all_lines():
    found = fit(build_ethyl_benzoate(), build_peaks("13C", *LIST, 171.36, 99.0, 42.5))
    seen = {a.observed_ppm for a in build_assignments(found)} | {u.observed_ppm for u in build_unexplained(found)}
    assert seen == {*LIST, 171.36, 99.0, 42.5}


def test_the_order_of_the_peaks_does_not_matter():
    peaks = list(LIST) + [77.16, 171.3]
    first = fit(build_ethyl_benzoate(), build_peaks("13C", *peaks))
    random.Random(3).shuffle(peaks)
    second = fit(build_ethyl_benzoate(), build_peaks("13C", *peaks))
    assert first.log_evidence == pytest.approx(second.log_evidence, abs=1e-9)
    assert {a: x.observed_ppm for a, x in by_atom(first).items()} == {a: x.observed_ppm for a, x in by_atom(second).items()}


def test_two_nuclei_may_share_one_line():
    found = fit(build_ethyl_benzoate(), build_peaks("13C", 166.6, 132.8, 130.5, 128.9, 60.9, 14.3))
    shared = by_atom(found)
    assert shared[7].observed_ppm == shared[8].observed_ppm == 128.9
    assert "one line with atom" in shared[7].note
    assert not build_missing(found)


def test_a_missing_quaternary_carbon_costs_less_than_a_missing_methyl():
    without = {atom: fit(build_ethyl_benzoate(), build_peaks("13C", *(x for x in LIST if x != shift))).log_evidence
               for atom, shift in (("ipso", 130.5), ("methyl", 14.3))}  # fmt: skip
    missing = build_missing(fit(build_ethyl_benzoate(), build_peaks("13C", *(x for x in LIST if x != 14.3))))
    assert [m.atom for m in missing] == [1] and missing[0].note == ""
    assert without["ipso"] > without["methyl"]


def test_a_leftover_line_costs_evidence_and_has_no_name():
    clean = fit(build_ethyl_benzoate(), build_peaks("13C", *LIST))
    dirty = fit(build_ethyl_benzoate(), build_peaks("13C", *LIST, 99.0))
    assert dirty.log_evidence < clean.log_evidence - 4
    assert [(u.observed_ppm, u.likely) for u in build_unexplained(dirty)] == [(99.0, None)]


def test_the_solvent_line_is_named_and_anchors_the_reference():
    shifted = [x + 0.5 for x in (*LIST, 77.16)]
    found = fit(build_ethyl_benzoate(), build_peaks("13C", *shifted))
    assert found.nuclei["13C"].anchored
    assert found.nuclei["13C"].offset_ppm == pytest.approx(0.5, abs=0.05)
    assert [u.likely for u in build_unexplained(found)] == ["solvent CDCl3"]


def test_without_solvent_line_the_offset_has_a_tight_prior():
    found = fit(build_ethyl_benzoate(), build_peaks("13C", *(x + 2.0 for x in LIST)))
    assert not found.nuclei["13C"].anchored
    assert 0.3 < found.nuclei["13C"].offset_ppm < 1.9


def test_a_nucleus_may_hide_under_the_solvent():
    # a carbinol carbon expected at 77.1
    carbons = {0: 23.0, 1: 77.1, 3: 29.0, 4: 10.0}
    lists = build_peaks("13C", 23.0, 29.0, 10.0)
    hidden = fit(build_prediction("CC(O)CC", carbons), lists)
    open_ = fit(build_prediction("CC(O)CC", carbons | {1: 70.0}), lists)
    assert "solvent" in build_missing(hidden)[0].note
    assert hidden.log_evidence > open_.log_evidence + 1


def test_ethyl_acetate_is_named_only_with_all_four_lines():
    ethyl_acetate = (171.36, 60.49, 21.04, 14.19)
    whole = fit(build_ethyl_benzoate(), build_peaks("13C", *LIST, *ethyl_acetate))
    assert whole.nuclei["13C"].impurities == ("ethyl acetate",)
    assert sorted(u.observed_ppm for u in build_unexplained(whole) if u.likely == "ethyl acetate") == sorted(ethyl_acetate)
    part = fit(build_ethyl_benzoate(), build_peaks("13C", *LIST, 171.36))
    assert part.nuclei["13C"].impurities == ()
    assert [u.likely for u in build_unexplained(part)] == [None]


def test_hydrogen_counts_are_kept():
    # without counts 60.9 is the nearest line for the methylene; a stated CH3 there cannot be it
    lists = build_peaks("13C", {"shift_ppm": 60.9, "attached_h": 3}, {"shift_ppm": 63.0, "attached_h": 2})
    found = by_atom(fit(build_prediction("CCO", {0: 18.0, 1: 60.9}), lists))
    assert found[2].observed_ppm == 63.0


def test_pairs_tell_two_carbons_apart():
    # two CH carbons that 13C alone would exchange; the hydrogens' shifts of the pairs put them right
    prediction = build_prediction(
        "Cc1ccoc1", {0: 9.5, 1: 120.0, 2: 112.6, 3: 142.6, 5: 139.6}, {0: 2.0, 2: 6.2, 3: 7.3, 5: 6.6}
    )
    lists = build_peaks("13C", 9.5, 120.0, 112.6, {"shift_ppm": 140.9, "pair_ppm": 7.3}, {"shift_ppm": 141.2, "pair_ppm": 6.6})
    found = by_atom(fit(prediction, lists))
    assert found[4].observed_ppm == 140.9 and found[6].observed_ppm == 141.2


def test_stated_carbons_choose_the_unit_of_two():
    # a line of two carbons between a single and a double unit
    carbons = ETHYL_BENZOATE_C13 | {6: 129.6, 5: 129.4}
    prediction = build_prediction("CCOC(=O)c1ccccc1", carbons)
    lists = build_peaks("13C", 166.6, 132.8, 129.7, {"shift_ppm": 129.3, "carbons": 2}, 128.3, 60.9, 14.3)
    found = by_atom(fit(prediction, lists))
    assert found[7].observed_ppm == 129.3 and found[6].observed_ppm == 129.7


def test_a_range_holds_its_hydrogens_and_is_no_midpoint():
    lists = build_peaks(
        "1H", {"shift_ppm": 8.05, "hydrogens": 2.0}, {"lower_ppm": 7.40, "upper_ppm": 7.58, "hydrogens": 3.0},
        {"shift_ppm": 4.37, "hydrogens": 2.0}, {"shift_ppm": 1.39, "hydrogens": 3.0},
    )  # fmt: skip
    found = fit(build_ethyl_benzoate(), lists)
    assigned = by_atom(found, "1H")
    assert assigned[8].peak == assigned[9].peak == 1
    assert assigned[8].deviation_ppm == pytest.approx(0.0, abs=0.03), "inside the range there is no deviation"
    balance = build_balance(found)[0]
    assert (balance.expected, balance.found, balance.missing, balance.excess) == (10, 10, 0, 0)


def test_integrals_decide_between_two_groups():
    # both methyl groups near 2.2 ppm: the integral 3H against 6H puts them right
    prediction = build_prediction("CN(C)c1ccc(C)cc1", {}, {0: 2.50, 7: 2.52, 4: 6.7, 5: 7.1})
    lists = build_peaks("1H", {"shift_ppm": 2.53, "hydrogens": 6.0}, {"shift_ppm": 2.49, "hydrogens": 3.0}, 7.1, 6.7)
    found = by_atom(fit(prediction, lists), "1H")
    assert found[1].observed_ppm == 2.53 and found[8].observed_ppm == 2.49


def test_missing_and_surplus_hydrogens_are_counted():
    lists = build_peaks(
        "1H", {"shift_ppm": 8.05, "hydrogens": 2.0}, {"shift_ppm": 7.5, "hydrogens": 3.0}, {"shift_ppm": 4.37, "hydrogens": 2.0},
        {"shift_ppm": 3.1, "hydrogens": 4.0},
    )  # fmt: skip
    balance = build_balance(fit(build_ethyl_benzoate(), lists))[0]
    assert balance.missing == 3 and balance.excess == 4


def test_geminal_hydrogens_give_one_line_or_two():
    prediction = build_prediction("C[C@H](O)CCl", {}, {0: 1.3, 1: 4.0, 3: (3.60, 3.45)})
    two = fit(prediction, build_peaks("1H", 1.3, 4.0, 3.60, 3.45))
    one = fit(prediction, build_peaks("1H", 1.3, 4.0, 3.52))
    assert not build_missing(two) and not build_missing(one)
    rows = [a for a in build_assignments(one) if a.atom == 4]
    assert [r.hydrogen for r in rows] == ["a", "b"] and {r.observed_ppm for r in rows} == {3.52}


def test_rotamers_of_an_amide_give_two_lines():
    found = fit(build_prediction("CN(C)C=O", {0: 34.0, 2: 34.0, 3: 162.6}), build_peaks("13C", 162.6, 36.5, 31.4))
    assert not build_unexplained(found)
    first, second = (by_atom(found)[k] for k in (1, 3))
    assert {first.observed_ppm, second.observed_ppm} == {36.5, 31.4}
    assert first.interchangeable == (3,) and second.interchangeable == (1,)


def test_labile_hydrogens_are_interchangeable_and_never_missed():
    # 4-aminophenol-like: O-H and N-H both seen, both absent in CD3OD
    shifts = {0: 9.6, 2: 6.6, 3: 6.7, 5: 4.5}
    prediction = build_prediction("Oc1ccc(N)cc1", {}, shifts, solvent="DMSO-d6")
    found = fit(prediction, build_peaks("1H", 8.4, 6.45, 6.4, 4.4), solvent="DMSO-d6")
    assert by_atom(found, "1H")[1].interchangeable == (6,)
    absent = fit(build_prediction("Oc1ccc(N)cc1", {}, shifts, solvent="CD3OD"), build_peaks("1H", 6.6, 6.7), solvent="CD3OD")
    assert all("exchanges with CD3OD" in m.note for m in build_missing(absent))
    none = fit(
        build_prediction("Cc1ccc(C)cc1", {}, {0: 2.3, 2: 7.0}, solvent="CD3OD"), build_peaks("1H", 7.0, 2.3), solvent="CD3OD"
    )
    assert absent.log_evidence > none.log_evidence - 1.0


def test_an_extra_line_pays_for_being_called_labile():
    shifts = {1: 3.7, 0: 1.2}
    clean = fit(build_prediction("CCO", {}, shifts | {2: 2.0}), build_peaks("1H", 3.7, 1.2))
    extra = fit(build_prediction("CCO", {}, shifts | {2: 2.0}), build_peaks("1H", 3.7, 1.2, 9.9))
    assert extra.log_evidence < clean.log_evidence - 2


def test_fast_azole_exchange_is_averaged():
    # imidazole: one line for C4 and C5 although the drawing tells them apart
    found = fit(build_prediction("c1c[nH]cn1", {0: 130.0, 1: 114.0, 3: 135.2}), build_peaks("13C", 135.2, 121.9))
    assert not build_missing(found)
    assert by_atom(found)[1].observed_ppm == by_atom(found)[2].observed_ppm == 121.9


def test_a_second_set_of_lines_is_recognised_where_rotamers_are_possible():
    lines = [22.0, 170.0, 38.0, 53.0, 136.0, 128.0, 127.5, 127.2]
    amide = build_prediction(
        "CC(=O)N(C)Cc1ccccc1", {0: 22.0, 1: 170.0, 4: 38.0, 5: 53.0, 6: 136.0, 7: 128.0, 8: 127.5, 9: 127.2}
    )
    found = fit(amide, build_peaks("13C", *lines, 21.4, 34.9, 49.5))
    assert {u.observed_ppm for u in build_unexplained(found) if (u.likely or "").startswith("second set")} == {21.4, 34.9, 49.5}
    ester = build_prediction("CC(=O)OCc1ccccc1", {0: 22.0, 1: 170.0, 4: 53.0, 5: 136.0, 6: 128.0, 7: 127.5, 8: 127.2})
    lone = fit(ester, build_peaks("13C", 22.0, 170.0, 53.0, 136.0, 128.0, 127.5, 127.2, 21.4, 34.9, 49.5))
    assert not [u for u in build_unexplained(lone) if u.likely]


def test_what_the_user_expects_is_allowed_for():
    cyclopentanone = build_prediction("O=C1CCCC1", {1: 220.0, 2: 38.3, 3: 23.2})
    lists = build_peaks("13C", *LIST, 219.7, 38.2, 23.1)
    allowed = fit(build_ethyl_benzoate(), lists, expected=(cyclopentanone,))
    alone = fit(build_ethyl_benzoate(), lists)
    assert allowed.log_evidence > alone.log_evidence + 5
    assert [u.likely for u in build_unexplained(allowed)] == ["expected: O=C1CCCC1"] * 3


def test_an_assignment_made_by_hand_is_kept_beside_the_tools_own():
    lists = build_peaks("13C", 166.6, 132.8, 130.5, {"shift_ppm": 129.5, "assignment": (8,)}, 128.3, 60.9, 14.3)
    note = by_atom(fit(build_ethyl_benzoate(), lists))[7].note
    assert "by hand" in note and "8" in note


def test_same_input_same_answer():
    lists = build_peaks("13C", *LIST, 128.9, 77.0)
    first, second = (fit(build_ethyl_benzoate(), lists) for _ in range(2))
    assert build_assignments(first) == build_assignments(second) and first.log_evidence == second.log_evidence
