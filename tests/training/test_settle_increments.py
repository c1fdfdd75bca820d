"""What is additive moves to the substituents, and no known sum changes."""

import random

import pytest
from rdkit import Chem

from shiftpred.substituents.group_codes import compute_group_codes
from shiftpred.training.settle_increments import compute_settled_increments, parse_elements

ELEMENTS = ("-C", "-O", "-N", "_C", "-O-", "-N+")


def build_increments(additive, extra):
    """Terms of CH2 with every pair of elements, each worth `additive` for its elements plus `extra`."""
    out = {"C3": 10.0, "C3H2": 1.0} | {f"C3H2|alpha|{e}": 0.5 for e in ELEMENTS}
    for k, a in enumerate(ELEMENTS):
        for b in ELEMENTS[k:]:
            out[f"C3H2&{''.join(sorted((a, b)))}"] = additive[a] + additive[b] + extra.get((a, b), 0.0)
    return out


def compute_sum(increments, a, b):
    together = increments.get(f"C3H2&{''.join(sorted((a, b)))}", 0.0)
    return increments["C3"] + increments["C3H2"] + together + sum(increments[f"C3H2|alpha|{element}"] for element in (a, b))


@pytest.fixture
def additive():
    rng = random.Random(0)
    return {e: rng.uniform(-10, 10) for e in ELEMENTS}


def test_known_sums_stay_and_additive_terms_vanish(additive):
    before = build_increments(additive, {})
    after = compute_settled_increments(before, dict.fromkeys(before, 5.0))
    for k, a in enumerate(ELEMENTS):
        for b in ELEMENTS[k:]:
            assert compute_sum(after, a, b) == pytest.approx(compute_sum(before, a, b))
            assert after[f"C3H2&{''.join(sorted((a, b)))}"] == pytest.approx(0.0, abs=1e-9)


def test_what_is_not_additive_stays_where_it_is(additive):
    before = build_increments(additive, {("-O", "-O"): -6.0})
    seen = dict.fromkeys(before, 50.0) | {"C3H2&-O-O": 1.0}
    after = compute_settled_increments(before, seen)
    assert after["C3H2&-O-O"] == pytest.approx(-6.0, abs=0.3)
    assert compute_sum(after, "-O", "-O") == pytest.approx(compute_sum(before, "-O", "-O"))


def test_an_unseen_combination_gets_the_additive_part(additive):
    before = build_increments(additive, {})
    missing = before.pop("C3H2&-N-O")
    after = compute_settled_increments(before, dict.fromkeys(before, 5.0))
    assert compute_sum(after, "-N", "-O") == pytest.approx(compute_sum(before, "-N", "-O") + missing)


def test_other_terms_are_left_alone():
    before = {"C3": 1.0, "C3|beta-C|-O": 2.0, "C3H2&&-C3-O1": 3.0}
    assert compute_settled_increments(before, dict.fromkeys(before, 1.0)) == before


@pytest.mark.parametrize(
    "smiles", ["C[N+](C)(C)CC(=O)[O-]", "ClC(Br)c1ccccc1", "C[Si](C)(C)O", "C[N+](=O)[O-]", "C1CC1[S-]", "CN(C)O"]
)
def test_elements_are_read_back_from_both_kinds_of_terms(smiles):
    codes = compute_group_codes(Chem.MolFromSmiles(smiles))
    for i in range(codes.n_atoms):
        expected = sorted(codes.levels[0][i].values())
        for level in (0, 1, 2):
            assert parse_elements("".join(sorted(codes.levels[level][i].values()))) == expected
