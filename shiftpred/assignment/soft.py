"""Probability of each pairing and the evidence summed over all assignments, by belief propagation.

The sum over all one-to-one assignments is a permanent; sum-product messages on the bipartite graph give its Bethe approximation
and converge for this problem. Deterministic: fixed start, fixed number of rounds.

References
----------
Williams, J. L.; Lau, R. A. IEEE Trans. Aerosp. Electron. Syst. 2014, 50, 2942 (association by belief propagation).
Vontobel, P. O. IEEE Trans. Inf. Theory 2013, 59, 1866 (the Bethe permanent).
"""

from __future__ import annotations

import numpy as np

__all__ = ["compute_soft_assignment"]

_MOST_ROUNDS = 60
_CLOSE_ENOUGH = 1e-4
_LARGEST_RATIO = 60.0


def compute_soft_assignment(gain: np.ndarray) -> tuple[np.ndarray, float]:
    """Return the probability of each pairing and the log of the summed weight.

    Parameters
    ----------
    gain : ndarray of shape (n_units, n_columns)
        Log weight of a pairing over both being without a partner; -inf: impossible.

    Returns
    -------
    probability : ndarray of shape (n_units, n_columns)
    log_sum : float
        Log of the sum over all assignments of the product of exp(gain); 0 where nothing can be paired.
    """
    n, m = gain.shape
    if n == 0 or m == 0:
        return np.zeros((n, m)), 0.0
    ratio = np.exp(np.clip(gain, -700.0, _LARGEST_RATIO))
    to_unit = np.ones((n, m))
    for _ in range(_MOST_ROUNDS):
        to_line = ratio / _one_and_others(ratio * to_unit)
        following = 1.0 / _one_and_others(to_line.T).T
        change = np.abs(following - to_unit).max()
        to_unit = following
        if change < _CLOSE_ENOUGH:
            break
    message = ratio * to_unit
    unit_sum = 1.0 + message.sum(axis=1)
    to_line = ratio / _one_and_others(message)
    probability = message / unit_sum[:, None]
    log_sum = np.log(unit_sum).sum() + np.log1p(to_line.sum(axis=0)).sum() - np.log1p(to_line * to_unit).sum()
    return probability, float(log_sum)


def _one_and_others(values: np.ndarray) -> np.ndarray:
    """Return 1 plus the sum of the other entries of each row; the largest entry is left out of its own sum without rounding."""
    rows = np.arange(len(values))
    largest = values.argmax(axis=1)
    rest = values.copy()
    rest[rows, largest] = 0.0
    others = 1.0 + rest.sum(axis=1)
    out = (others + values[rows, largest])[:, None] - values
    out[rows, largest] = others
    return np.maximum(out, 1.0)
