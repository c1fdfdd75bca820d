"""The reference offset of one list: anchored on the solvent line where it is listed, otherwise with a tight prior."""

from __future__ import annotations

import numpy as np

__all__ = ["compute_offset"]

_ROUNDS = 4


def compute_offset(
    residual: np.ndarray, scale: np.ndarray, degrees: np.ndarray, prior_ppm: float, start_ppm: float = 0.0
) -> float:
    """Return the most probable offset by iteratively reweighted least squares.

    Parameters
    ----------
    residual : ndarray of shape (n,)
        Observed minus predicted, ppm, of the assigned lines (solvent lines among them, with their small scale).
    scale, degrees : ndarray of shape (n,)
        Of the Student t error distributions.
    prior_ppm : float
        Standard deviation of the normal prior around 0.
    start_ppm : float

    Returns
    -------
    float
    """
    offset = start_ppm
    for _ in range(_ROUNDS):
        z = (residual - offset) / scale
        weight = (degrees + 1) / (degrees + z * z) / (scale * scale)
        offset = float((weight * residual).sum() / (weight.sum() + 1 / prior_ppm**2))
    return offset
