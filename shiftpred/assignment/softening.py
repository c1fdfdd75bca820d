"""From the best assignment to probabilities and to the evidence summed over assignments."""

from __future__ import annotations

import math

import numpy as np

from shiftpred.assignment.problem import Problem
from shiftpred.assignment.soft import compute_soft_assignment
from shiftpred.assignment.solver import CountPenalty
from shiftpred.assignment.units import Units

__all__ = ["compute_evidence"]


def compute_evidence(problem: Problem, chosen: np.ndarray, units: Units) -> tuple[np.ndarray, float]:
    """Return (n, m) probabilities of the pairings and the log evidence.

    Parameters
    ----------
    problem : Problem
        Without columns that overlap.
    chosen : ndarray of shape (n,)
        The best assignment.
    units : Units
    """
    if not problem.counted:
        probability, log_sum = compute_soft_assignment(problem.gain)
        return probability, log_sum + float(problem.without.sum() + problem.leftover.sum())
    probability, evidence = _soften_counted(problem, chosen)
    return probability, evidence + _credit_partners(units, problem, chosen)


def _soften_counted(problem: Problem, chosen: np.ndarray) -> tuple[np.ndarray, float]:
    """Around an assignment with shared lines: each line gets one seat for each of its units."""
    penalty, log_resolution = CountPenalty(problem.stated), math.log(problem.resolution_ppm)
    m, on = len(problem.columns), chosen >= 0
    users = np.bincount(chosen[on], minlength=m)
    sums = np.bincount(chosen[on], weights=problem.count[on], minlength=m)
    seats = np.repeat(np.arange(m), np.maximum(users, 1))
    own = np.zeros((len(chosen), m), dtype=bool)
    own[on, chosen[on]] = True
    # A unit that would come in on top takes the place of one that is there: it is compared with the line's usual load.
    usual = sums * (1 - 1 / np.maximum(users, 1))
    load = np.where(own, sums[None, :] - problem.count[:, None], usual[None, :])
    load = np.where(users[None, :] <= 1, 0.0, load)
    factor = penalty.compute(load + problem.count[:, None]) - np.where(users <= 1, 0.0, penalty.compute(load))
    weight = problem.weight + factor
    base = (problem.leftover / np.maximum(users, 1) - log_resolution * (users > 1))[None, :] + problem.absent[:, None]
    soft, log_sum = compute_soft_assignment((weight - base)[:, seats])
    probability = np.zeros((len(chosen), m))
    np.add.at(probability.T, seats, soft.T)
    used = np.flatnonzero(on)
    hard = float((weight - base)[used, chosen[used]].sum())
    exact = float(
        problem.weight[used, chosen[used]].sum()
        + problem.absent[~on].sum()
        + np.where(users == 0, problem.leftover, penalty.compute(sums) + (users - 1) * log_resolution).sum()
    )
    return np.minimum(probability, 1.0), exact + max(0.0, log_sum - hard)


def _credit_partners(units: Units, problem: Problem, chosen: np.ndarray) -> float:
    """Log weight to add where two groups that are alike but for stereo share a line: that is likelier than by chance."""
    credit = 0.0
    for k in np.flatnonzero(units.partner >= 0):
        column = chosen[k]
        if column >= 0 and column == chosen[units.partner[k]]:
            by_chance = problem.weight[k, column] + math.log(problem.resolution_ppm)
            credit += max(0.0, math.log(units.together[k]) - by_chance)
    return credit
