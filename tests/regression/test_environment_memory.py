"""The memory of measured surroundings: medians, shrinkage, and what wider surroundings overrule."""

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.features.concentric_environments import RADII, compute_environment_codes
from shiftpred.features.molecule_arrays import build_molecule_arrays
from shiftpred.regression.environment_memory import EnvironmentMemory, build_memory_arrays, merge_memory_arrays


def row(*numbers):
    """Codes of one atom: the given ones, then ones that nothing else has."""
    row.fresh += 100
    return [*numbers, *range(row.fresh, row.fresh + RADII - len(numbers))]


row.fresh = 10**6


def build(codes, residuals):
    return EnvironmentMemory(build_memory_arrays(np.array(codes, dtype=np.uint64), np.array(residuals, dtype=float)))


def test_nothing_is_known_to_an_empty_memory():
    known = EnvironmentMemory().recall(np.array([row(1)], dtype=np.uint64))
    assert not known.correction.any() and not known.counts.any() and np.isnan(known.spread).all()


def test_median_shrunk_by_number():
    memory = build([row(7), row(7), row(7)], [[1.0, np.nan], [2.0, np.nan], [9.0, np.nan]])
    known = memory.recall(np.array([row(7)], dtype=np.uint64))
    assert known.correction[0] == pytest.approx([3 * 2.0 / (3 + 4), 0.0])
    assert known.counts[0, :, 0].tolist() == [3, 0, 0, 0, 0] and not known.counts[0, :, 1].any()
    assert known.spread[0, 0] == pytest.approx((1 + 0 + 7) / 3, rel=1e-3)


def test_wider_surroundings_overrule_narrower_ones():
    memory = build([row(7, 8)] + [row(7)] * 4, [[6.0, 0.1]] + [[0.0, 0.0]] * 4)
    narrow, wide = memory.recall(np.array([row(7), row(7, 8)], dtype=np.uint64)).correction[:, 0]
    assert narrow == 0.0
    assert wide == pytest.approx((1 * 6.0 + 2.0 * narrow) / (1 + 2.0))


def test_stored_to_five_thousandths_of_a_ppm():
    memory = build([row(7)] * 255, [[1.2345, 0.01234]] * 255)
    known = memory.recall(np.array([row(7)], dtype=np.uint64))
    assert known.correction[0] == pytest.approx(np.array([1.235, 0.0125]) * 255 / 259, abs=1e-9)


def test_two_archives_become_one():
    one = build_memory_arrays(np.array([row(1), row(2)], np.uint64), np.array([[1.0, np.nan], [2.0, 0.2]]))
    other = build_memory_arrays(np.array([row(2)] * 3, np.uint64), np.array([[6.0, np.nan]] * 3))
    known = EnvironmentMemory(merge_memory_arrays(one, other)).recall(np.array([row(1), row(2)], np.uint64))
    assert known.counts[:, 0].tolist() == [[1, 0], [4, 1]]
    assert known.correction[:, 0] == pytest.approx([1.0 / 5, 4 * 5.0 / 8])
    assert known.correction[1, 1] == pytest.approx(0.2 / 5)


def test_a_measured_compound_is_pulled_towards_its_measured_shift():
    """What a memory is for: the same atom again comes out nearer to what was measured than the network alone."""
    codes = compute_environment_codes(build_molecule_arrays(Chem.MolFromSmiles("CCOC(C)=O")))
    memory = build(codes, [[3.0, 0.3]] * len(codes))
    correction = memory.recall(codes).correction
    assert (correction > [1.5, 0.15]).all() and (correction < [3.0, 0.3]).all()
