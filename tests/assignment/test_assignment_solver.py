"""The solver against exhaustive search, and the soft assignment against the exact sum."""

import itertools

import numpy as np
import pytest

from shiftpred.assignment.soft import compute_soft_assignment
from shiftpred.assignment.solver import CountPenalty, improve_with_counts, solve_assignment


def enumerate_assignments(n, columns):
    for choice in itertools.product(range(-1, len(columns)), repeat=n):
        used = [line for c in choice if c >= 0 for line in columns[c]]
        if len(used) == len(set(used)):
            yield choice


def total(gain, choice):
    return sum(gain[g, c] for g, c in enumerate(choice) if c >= 0)


@pytest.mark.parametrize("seed", range(8))
def test_the_best_assignment_is_found_also_with_lines_that_go_together(seed):
    rng = np.random.default_rng(seed)
    columns = [(j,) for j in range(5)] + [(0, 1), (1, 2), (3, 4), (0, 1, 2)]
    gain = rng.normal(0.5, 3.0, (4, len(columns)))
    gain[:, 5:] += 2.0
    chosen = solve_assignment(gain, columns)
    lines = [line for c in chosen if c >= 0 for line in columns[c]]
    assert len(lines) == len(set(lines)), "no line twice"
    best = max(total(gain, c) for c in enumerate_assignments(4, columns))
    assert total(gain, chosen) == pytest.approx(best, abs=1e-9)


def test_nothing_is_paired_where_nothing_is_gained():
    assert list(solve_assignment(np.full((2, 2), -1.0), [(0,), (1,)])) == [-1, -1]
    assert list(solve_assignment(np.zeros((2, 0)), [])) == [-1, -1]


@pytest.mark.parametrize("seed", range(6))
def test_the_soft_assignment_is_close_to_the_exact_sum(seed):
    gain = np.random.default_rng(seed).normal(0.0, 2.5, (5, 4))
    columns = [(j,) for j in range(4)]
    weights = [(c, np.exp(total(gain, c))) for c in enumerate_assignments(5, columns)]
    exact = sum(w for _, w in weights)
    pairing = np.zeros((5, 4))
    for choice, w in weights:
        for g, c in enumerate(choice):
            if c >= 0:
                pairing[g, c] += w / exact
    probability, log_sum = compute_soft_assignment(gain)
    assert log_sum == pytest.approx(np.log(exact), abs=0.25)
    assert np.abs(probability - pairing).max() < 0.08


def test_the_soft_assignment_of_a_clear_case_is_certain():
    gain = np.where(np.eye(6) > 0, 12.0, -4.0)
    probability, log_sum = compute_soft_assignment(gain)
    assert np.diag(probability).min() > 0.999 and log_sum == pytest.approx(72.0, abs=0.01)


def test_very_large_weights_do_not_overflow():
    probability, log_sum = compute_soft_assignment(np.where(np.eye(3) > 0, 900.0, -900.0))
    assert np.isfinite(log_sum) and np.allclose(np.diag(probability), 1.0)


@pytest.mark.parametrize("seed", range(6))
def test_moves_and_exchanges_reach_the_best_sharing(seed):
    rng = np.random.default_rng(100 + seed)
    n, m, resolution = 4, 3, np.log(0.05)
    count = rng.integers(1, 4, n).astype(float)
    weight, without, leftover = rng.normal(0, 2, (n, m)), np.full(n, -3.0), np.full(m, -5.0)
    penalty = CountPenalty(np.array([3.0, 2.0, np.nan]))

    def value(place):
        sums = np.bincount(place, weights=count, minlength=m + 1)[:m]
        users = np.bincount(place, minlength=m + 1)[:m]
        columns = np.where(users == 0, leftover, penalty.compute(sums) + (users - 1) * resolution)
        return np.concatenate([weight, without[:, None]], axis=1)[np.arange(n), place].sum() + columns.sum()

    best = max(value(np.array(p)) for p in itertools.product(range(m + 1), repeat=n))
    chosen, reached = improve_with_counts(np.full(n, -1), weight, without, leftover, count, penalty, resolution)
    assert reached == pytest.approx(value(np.where(chosen < 0, m, chosen)), abs=1e-9), "the value is that of the assignment"
    assert reached >= best - 1.5, "a local optimum close to the best of all"
