"""Raw error size of a prediction: what the network expects, corrected by what was measured in the same surroundings.

log size = a + b·log(network's size) + Σ c_k·log(1 + atoms measured alike to k bonds) + d·log(their spread) + e·log(correction)

Seven kinds of evidence and a linear form, so that a few thousand sites fix it; the conformal step afterwards makes the coverage
right whatever this formula gets wrong.
"""

from __future__ import annotations

import numpy as np

from shiftpred.features.concentric_environments import RADII
from shiftpred.regression.environment_memory import Recollection

__all__ = ["ErrorSize", "compute_error_evidence"]

_FLOOR = np.array([0.05, 0.005])
"""ppm below which spreads and corrections are all alike, 13C and 1H."""
_NUCLEI = ("13C", "1H")
_WIDEST = 8.0


def compute_error_evidence(scales: np.ndarray, known: Recollection) -> np.ndarray:
    """Return what the error size is computed from.

    Parameters
    ----------
    scales : ndarray of shape (n_atoms, 2)
        The network's own error sizes in ppm.
    known : Recollection
        Of the same atoms.

    Returns
    -------
    ndarray of shape (n_atoms, 2, RADII + 5)
        For 13C and 1H: 1, log size, log(1 + count) by radius, whether three or more atoms alike were measured, the log of
        their spread (0 where not), log of the size of the correction.
    """
    has = ~np.isnan(known.spread)
    spread = np.where(has, np.log(np.where(has, known.spread, 1.0) + _FLOOR), 0.0)
    parts = [np.ones(scales.shape), np.log(scales)]
    parts += [np.log1p(known.counts[:, k]) for k in range(RADII)]
    parts += [has.astype(float), spread, np.log(np.abs(known.correction) + _FLOOR)]
    return np.stack(parts, axis=2)


class ErrorSize:
    """Computes error sizes with fitted coefficients.

    Parameters
    ----------
    coefficients : dict of str to list of float, optional
        Nucleus → (RADII + 5,) coefficients of `compute_error_evidence`; without them the network's own sizes are used.
    """

    def __init__(self, coefficients: dict[str, list[float]] | None = None):
        self.coefficients = coefficients or {}

    def compute(self, scales: np.ndarray, known: Recollection) -> np.ndarray:
        """Return (n_atoms, 2) error sizes in ppm, never beyond eight times smaller or larger than the network's own."""
        if not self.coefficients:
            return scales
        weights = np.array([self.coefficients[nucleus] for nucleus in _NUCLEI])
        size = np.exp((compute_error_evidence(scales, known) * weights).sum(axis=2))
        return np.clip(size, scales / _WIDEST, scales * _WIDEST)
