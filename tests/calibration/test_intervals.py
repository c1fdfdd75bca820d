"""Intervals keep their promise on rows that are made to be exchangeable, and say so when they cannot."""

import math

import numpy as np
import pytest

from shiftpred.calibration.intervals import (
    LEVELS,
    IntervalTable,
    compute_weighted_quantiles,
    fit_interval_table,
    require_coverage,
)
from shiftpred.errors import SettingError


def make_rows(rng, n, environment="sp3 CH3, on C"):
    scores = np.abs(rng.standard_t(4, n))
    return dict(environments=[environment] * n, scores=scores, molecules=np.arange(n), novelty=np.zeros(n, dtype=int))


@pytest.mark.parametrize("level", [0.5, 0.8, 0.9, 0.95, 0.99])
def test_coverage_on_exchangeable_rows(level):
    """Mean coverage over 200 calibrations lies in [level, level + 1/(n+1)] within four standard errors (Vovk 2005)."""
    rng, n, inside = np.random.default_rng(0), 400, []
    for _ in range(200):
        scores = np.abs(rng.standard_t(4, n + 500))
        q = compute_weighted_quantiles(scores[:n], np.ones(n), [level])[0]
        inside.append(np.mean(scores[n:] <= q))
    error = 4 * np.std(inside) / math.sqrt(len(inside))
    assert level - error <= np.mean(inside) <= level + 1 / (n + 1) + error


def test_too_few_rows_give_an_unbounded_quantile():
    q = compute_weighted_quantiles(np.arange(10.0), np.ones(10), [0.5, 0.95])
    assert math.isfinite(q[0]) and math.isinf(q[1])


def test_small_class_borrows_from_the_coarser_one():
    rng = np.random.default_rng(1)
    big, small = make_rows(rng, 800), make_rows(rng, 20, "alkyne C")
    table = fit_interval_table("13C", big["environments"] + small["environments"],
                               np.concatenate([big["scores"], small["scores"]]), np.arange(820), np.zeros(820, dtype=int))
    intervals = IntervalTable({"13C": table})
    assert intervals.find_class("13C", "sp3 CH3, on C")[0] == "sp3 CH3, on C"
    assert intervals.find_class("13C", "alkyne C")[0] != "alkyne C"
    assert intervals.compute_factor("13C", "alkyne C", 0.9) > 0


def test_wider_for_more_coverage_and_more_novelty():
    rows = make_rows(np.random.default_rng(2), 3000)
    intervals = IntervalTable({"13C": fit_interval_table("13C", **rows)})
    factors = [intervals.compute_factor("13C", "sp3 CH3, on C", c) for c in (0.5, 0.8, 0.9, 0.925, 0.95, 0.99)]
    assert factors == sorted(factors) and factors[0] > 0
    assert [intervals.compute_novelty_factor("13C", k) for k in (0, 1, 2)] == pytest.approx([1.0, 1.2, 1.44])


def test_student_fit_recovers_what_was_drawn():
    rows = make_rows(np.random.default_rng(3), 6000)
    scale, degrees = IntervalTable({"13C": fit_interval_table("13C", **rows)}).compute_student("13C", "sp3 CH3, on C")
    assert scale == pytest.approx(1.0, abs=0.12) and 2.7 <= degrees <= 7


@pytest.mark.parametrize("wrong", [0, 1, 1.2, -0.1, "0.9", None, True])
def test_coverage_outside_its_range_is_refused(wrong):
    with pytest.raises(SettingError, match="coverage: got .*; expected .* Try: "):
        require_coverage(wrong)


def test_levels_hold_the_usual_coverages():
    assert {0.5, 0.8, 0.9, 0.95, 0.99} <= set(LEVELS)
