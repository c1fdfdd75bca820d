"""A shift axis: round tick values, and labels that do not cover one another."""

from __future__ import annotations

import math
from collections.abc import Sequence

__all__ = ["compute_axis_ticks", "compute_rows", "spread_labels"]


def compute_axis_ticks(low: float, high: float, most: int) -> list[float]:
    """Return round values between `low` and `high`, no more than `most` + 1.

    Examples
    --------
    >>> compute_axis_ticks(3, 178, 5)
    [50.0, 100.0, 150.0]
    """
    if not high > low:
        return [low]
    raw = (high - low) / most
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(m * power for m in (1, 2, 5, 10) if m * power >= raw * 0.999)
    first = math.ceil(low / step - 1e-9)
    last = math.floor(high / step + 1e-9)
    return [round(i * step, 10) for i in range(first, last + 1)]


def spread_labels(places: Sequence[float], gap: float, begin: float, end: float) -> list[float] | None:
    """Move labels apart as little as possible.

    Parameters
    ----------
    places : sequence of float
        Where the labels would like to be, ascending.
    gap : float
        Least distance between two of them.
    begin, end : float
        They stay between these.

    Returns
    -------
    list of float or None
        New places in the same order; None where they do not all fit.

    Notes
    -----
    Least squares under an order constraint (isotonic regression, pooling neighbours that break the order).
    """
    if not places:
        return []
    if (len(places) - 1) * gap > end - begin:
        return None
    pools: list[list[float]] = []  # [sum of wishes without the gaps, count]
    for i, wish in enumerate(places):
        pools.append([wish - i * gap, 1])
        while len(pools) > 1 and pools[-2][0] / pools[-2][1] > pools[-1][0] / pools[-1][1]:
            total, count = pools.pop()
            pools[-1][0] += total
            pools[-1][1] += count
    level = [total / count for total, count in pools for _ in range(int(count))]
    highest = end - (len(places) - 1) * gap
    return [min(max(value, begin), highest) + i * gap for i, value in enumerate(level)]


def compute_rows(extents: Sequence[tuple[float, float]], gap: float) -> list[int]:
    """Return a row for each stretch so that no two in one row touch; the first row that has room is taken.

    Examples
    --------
    >>> compute_rows([(0, 10), (5, 15), (12, 20)], gap=1)
    [0, 1, 0]
    """
    order = sorted(range(len(extents)), key=lambda i: extents[i])
    ends: list[float] = []
    rows = [0] * len(extents)
    for i in order:
        begin, end = extents[i]
        row = next((r for r, last in enumerate(ends) if last + gap <= begin), len(ends))
        if row == len(ends):
            ends.append(end)
        else:
            ends[row] = end
        rows[i] = row
    return rows
