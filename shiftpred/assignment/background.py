"""How lines are distributed over the scale when nothing is known of the structure.

The tables were computed from the peaks of the open shift data (training connectivities only): a histogram smoothed with a
Gaussian of 1.5 ppm (13C) or 0.12 ppm (1H), every spectrum weighing as the square root of its number of lines, 3 % of the
density spread evenly. Columns: density per ppm.
"""

from __future__ import annotations

from functools import lru_cache
from importlib.resources import files

import numpy as np

__all__ = ["compute_background_density", "compute_background_mass"]


@lru_cache(maxsize=4)
def _load(nucleus: str) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return grid (n,), densities (n, k) and cumulated densities (n, k); column 0 is 'any', then by attached hydrogens."""
    text = (files("shiftpred.assignment") / "tables" / f"background_{nucleus}.csv").read_text(encoding="utf-8")
    table = np.array([line.split(",") for line in text.splitlines()[1:]], dtype=float)
    grid, density = table[:, 0], table[:, 1:]
    steps = np.diff(grid)[:, None] * (density[1:] + density[:-1]) / 2
    return grid, density, np.concatenate([np.zeros((1, density.shape[1])), np.cumsum(steps, axis=0)])


def compute_background_density(nucleus: str, shift_ppm, attached_h=None) -> np.ndarray:
    """Return the density per ppm of observed lines at `shift_ppm`.

    Parameters
    ----------
    nucleus : {'13C', '1H'}
    shift_ppm : array_like of shape (n,)
    attached_h : array_like of shape (n,), optional
        13C: hydrogens on the carbon, -1 where not known.

    Returns
    -------
    ndarray of shape (n,)
    """
    grid, density, _ = _load(nucleus)
    shift_ppm = np.asarray(shift_ppm, dtype=float)
    out = np.interp(shift_ppm, grid, density[:, 0])
    if attached_h is not None and density.shape[1] > 1:
        attached_h = np.asarray(attached_h)
        for count in range(density.shape[1] - 1):
            here = attached_h == count
            if here.any():
                out[here] = np.interp(shift_ppm[here], grid, density[:, count + 1])
    return out


def compute_background_mass(nucleus: str, lower_ppm, upper_ppm) -> np.ndarray:
    """Return the probability of a line between `lower_ppm` and `upper_ppm`, arrays of shape (n,)."""
    grid, _, cumulated = _load(nucleus)
    return np.interp(upper_ppm, grid, cumulated[:, 0]) - np.interp(lower_ppm, grid, cumulated[:, 0])
