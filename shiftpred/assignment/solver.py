"""Who is who: the assignment of units to lines with the largest total weight.

Without stated counts this is a linear assignment problem (Kuhn 1955) in which a unit may also be missing or share a line, and a
line may be left over. Lines that may together be one split carbon make it a set packing; the few conflicts that arise are
resolved by branching. With stated counts (integrals, 2C) the one-to-one solution is improved by moves and exchanges until none
helps; ties go to the lower index, so that one input has one answer.

References
----------
Kuhn, H. W. Naval Research Logistics Quarterly 1955, 2, 83 (doi 10.1002/nav.3800020109).
"""

from __future__ import annotations

import heapq
from dataclasses import dataclass

import numpy as np
from scipy.optimize import linear_sum_assignment

__all__ = ["CountPenalty", "improve_with_counts", "solve_assignment"]

_MOST_BRANCHES = 80
_MOST_STEPS = 400
_LEAST_GAIN = 1e-9


def solve_assignment(gain: np.ndarray, column_lines: list[tuple[int, ...]]) -> np.ndarray:
    """Assign units to columns so that the total gain is largest and no line is used twice.

    Parameters
    ----------
    gain : ndarray of shape (n_units, n_columns)
        Gain of a unit on a column over the unit being without a line and the column's lines being left over; -inf: forbidden.
    column_lines : list of tuple of int
        (n_columns,) the lines that each column uses.

    Returns
    -------
    ndarray of shape (n_units,), int
        Column of each unit, -1 for none.
    """
    chosen, total = _solve_relaxed(gain)
    conflict = _find_conflict(chosen, column_lines)
    if conflict is None:
        return chosen
    number, queue = 0, [(-total, 0, gain, chosen)]
    while queue and number < _MOST_BRANCHES:
        _, _, gain, chosen = heapq.heappop(queue)
        conflict = _find_conflict(chosen, column_lines)
        if conflict is None:
            return chosen
        for unit in conflict:
            # One of two columns that want the same line is given up, for every unit in the one branch, then the other.
            narrower = gain.copy()
            narrower[:, chosen[unit]] = -np.inf
            following, total = _solve_relaxed(narrower)
            number += 1
            heapq.heappush(queue, (-total, number, narrower, following))
    return _drop_conflicts(gain, chosen, column_lines)


def _solve_relaxed(gain: np.ndarray) -> tuple[np.ndarray, float]:
    n, m = gain.shape
    chosen = np.full(n, -1)
    if n == 0 or m == 0:
        return chosen, 0.0
    positive = np.maximum(gain, 0.0)
    rows, columns = linear_sum_assignment(positive, maximize=True)
    used = positive[rows, columns] > 0
    chosen[rows[used]] = columns[used]
    return chosen, float(positive[rows, columns].sum())


def _find_conflict(chosen, column_lines) -> tuple[int, int] | None:
    holder: dict[int, int] = {}
    for unit, column in enumerate(chosen):
        if column >= 0:
            for line in column_lines[column]:
                if line in holder:
                    return holder[line], unit
                holder[line] = unit
    return None


def _drop_conflicts(gain, chosen, column_lines) -> np.ndarray:
    """Keep the units with the largest gain where the branching did not come to an end."""
    chosen, used = chosen.copy(), set()
    for unit in sorted(range(len(chosen)), key=lambda g: (-gain[g, chosen[g]] if chosen[g] >= 0 else np.inf, g)):
        if chosen[unit] >= 0:
            lines = set(column_lines[chosen[unit]])
            if lines & used:
                chosen[unit] = -1
            else:
                used |= lines
    return chosen


@dataclass(frozen=True)
class CountPenalty:
    """Penalty of a line whose units do not add up to the stated number of nuclei."""

    stated: np.ndarray
    """(n_columns,) nan: nothing stated."""
    per_nucleus: float = 1.2
    tolerance: float = 0.05
    """Error of an integral as a share of it (common practice, no source)."""
    most: float = 7.0

    def compute(self, sums: np.ndarray, columns=None) -> np.ndarray:
        """Return the log penalty of each column for the numbers `sums` (last axis: columns)."""
        stated = self.stated if columns is None else self.stated[columns]
        difference = np.abs(sums - stated)
        penalty = -np.minimum(self.most, self.per_nucleus * difference / (1 + self.tolerance * np.nan_to_num(stated)))
        return np.where(np.isnan(stated), 0.0, penalty)


def improve_with_counts(
    chosen: np.ndarray,
    weight: np.ndarray,
    without: np.ndarray,
    leftover: np.ndarray,
    count: np.ndarray,
    penalty: CountPenalty,
    log_resolution: float,
) -> tuple[np.ndarray, float]:
    """Improve an assignment in which several units may share a line and lines state how many nuclei they hold.

    Parameters
    ----------
    chosen : ndarray of shape (n_units,)
        Starting assignment, -1: without a line.
    weight : ndarray of shape (n_units, n_columns)
        Log density of a column if it belongs to a unit.
    without : ndarray of shape (n_units,)
        Log chance of being missing.
    leftover : ndarray of shape (n_columns,)
        Log weight of a column that no unit takes.
    count : ndarray of shape (n_units,)
        Nuclei of each unit; 0 for solvents and impurities, whose amount is not known.
    penalty : CountPenalty
    log_resolution : float
        Log of the resolution in ppm: added for every further unit on a line.

    Returns
    -------
    chosen : ndarray of shape (n_units,)
    total : float
        Log weight of the whole.
    """
    n, m = weight.shape
    if m == 0 or n == 0:
        return np.full(n, -1), float(without.sum() + leftover.sum())
    extended = np.concatenate([weight, without[:, None]], axis=1)  # column m: without a line
    nearest = np.where(weight.max(axis=1) > without, weight.argmax(axis=1), m)
    best = None
    for start in (np.where(chosen < 0, m, chosen), nearest):
        place, total = _climb(start, extended, leftover, count, penalty, log_resolution)
        if best is None or total > best[1] + _LEAST_GAIN:
            best = (place, total)
    return np.where(best[0] == m, -1, best[0]), best[1]


def _climb(place, extended, leftover, count, penalty, log_resolution) -> tuple[np.ndarray, float]:
    """Take the best move or exchange again and again; return the places (the last one: without a line) and the log weight."""
    n, m = extended.shape[0], extended.shape[1] - 1
    place, units = place.copy(), np.arange(n)
    for _ in range(_MOST_STEPS):
        sums = np.bincount(place, weights=count, minlength=m + 1)[:m]
        users = np.bincount(place, minlength=m + 1)[:m]
        state = _column_values(sums, users, leftover, penalty, log_resolution)
        # What each column gains or loses when one unit of `count` comes or goes.
        come = _column_values(sums + count[:, None], users + 1, leftover, penalty, log_resolution) - state
        come = np.concatenate([come, np.zeros((n, 1))], axis=1)
        go = np.zeros(n)
        on = place < m
        if on.any():
            p = place[on]
            go[on] = _column_values(sums[p] - count[on], users[p] - 1, leftover[p], penalty, log_resolution, p) - state[p]
        own = extended[units, place]
        move = extended + come - own[:, None] + go[:, None]
        move[units, place] = 0.0
        best_move = int(np.argmax(move))
        gain_move = move.flat[best_move]
        swap = extended[:, place] + extended[:, place].T - own[:, None] - own[None, :]
        swap += _swap_counts(place, count, sums, users, penalty, m)
        best_swap = int(np.argmax(swap))
        gain_swap = swap.flat[best_swap]
        if max(gain_move, gain_swap) <= _LEAST_GAIN:
            break
        if gain_move >= gain_swap:
            unit, column = divmod(best_move, m + 1)
            place[unit] = column
        else:
            first, second = divmod(best_swap, n)
            place[first], place[second] = place[second], place[first]
    sums = np.bincount(place, weights=count, minlength=m + 1)[:m]
    users = np.bincount(place, minlength=m + 1)[:m]
    total = float(extended[units, place].sum() + _column_values(sums, users, leftover, penalty, log_resolution).sum())
    return place, total


def _column_values(sums, users, leftover, penalty, log_resolution, columns=None):
    """Log weight of columns apart from the densities: left over, or count penalty and sharing."""
    used = penalty.compute(sums, columns) + (users - 1) * log_resolution
    return np.where(users == 0, leftover, used)


def _swap_counts(place, count, sums, users, penalty, m):
    """Change of the count penalties when two units exchange their places; shape (n, n)."""
    n = len(place)
    difference = count[None, :] - count[:, None]  # what the first unit's place gains
    padded = np.concatenate([sums, [0.0]])
    stated = CountPenalty(np.concatenate([penalty.stated, [np.nan]]), penalty.per_nucleus, penalty.tolerance, penalty.most)
    before = stated.compute(padded)[place]
    first = stated.compute((padded[place][:, None] + difference), np.repeat(place[:, None], n, axis=1)) - before[:, None]
    second = stated.compute((padded[place][None, :] - difference), np.repeat(place[None, :], n, axis=0)) - before[None, :]
    change = first + second
    change[place[:, None] == place[None, :]] = 0.0
    return change
