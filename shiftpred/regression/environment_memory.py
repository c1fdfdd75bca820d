"""What the network still missed where the same surroundings were measured before.

The network smooths over what it was trained on. Where training atoms had exactly the surroundings of the atom at hand, the
median of what the network missed there is added, shrunk by how few they were; wider and wider surroundings, where they occur,
overrule narrower ones.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shiftpred.features.concentric_environments import RADII

__all__ = ["EnvironmentMemory", "Recollection", "build_memory_arrays", "merge_memory_arrays"]

_SHRINKAGE = (4.0, 2.0, 1.0, 0.7, 0.5)
"""Measured atoms that the narrower radius counts for, beside those of radius 1 to 5; chosen on the compounds of the calibration
part (`python -m shiftpred.training.ablation` shows what the memory brings)."""
_UNIT = np.array([0.005, 0.0005])
"""Resolution in ppm with which residuals are stored, 13C and 1H."""
_MOST = 255


@dataclass(frozen=True)
class Recollection:
    """What the memory knows of each atom."""

    correction: np.ndarray
    """(n_atoms, 2) ppm to add to the network's 13C and 1H shift; zero where nothing is known."""
    counts: np.ndarray
    """(n_atoms, RADII, 2) training atoms with the same surroundings, by radius and nucleus (at most 255 are counted)."""
    spread: np.ndarray
    """(n_atoms, 2) mean absolute deviation in ppm of their residuals at the widest radius with three or more; nan: none."""


class EnvironmentMemory:
    """Residuals of the network by surroundings.

    Parameters
    ----------
    arrays : dict of str to ndarray
        As `build_memory_arrays` returns them: 'steps' (n,) uint64, differences of the ascending codes; 'residual' (n, 2) int16;
        'count' (n, 2) uint8; 'spread' (n, 2) float16.
    """

    def __init__(self, arrays: dict[str, np.ndarray] | None = None):
        arrays = arrays or build_memory_arrays(np.zeros((0, RADII), np.uint64), np.zeros((0, 2)))
        self.arrays = arrays
        self.codes = np.cumsum(arrays["steps"], dtype=np.uint64)

    def recall(self, codes: np.ndarray) -> Recollection:
        """Look up atoms.

        Parameters
        ----------
        codes : ndarray of shape (n_atoms, RADII), uint64
            From `compute_environment_codes`.
        """
        n = len(codes)
        correction, spread = np.zeros((n, 2)), np.full((n, 2), np.nan)
        counts = np.zeros((n, RADII, 2), dtype=np.int64)
        if len(self.codes):
            for k in range(RADII):
                place = np.minimum(np.searchsorted(self.codes, codes[:, k]), len(self.codes) - 1)
                hit = (self.codes[place] == codes[:, k])[:, None]
                if not hit.any():
                    break  # wider surroundings hold the narrower ones
                count = np.where(hit, self.arrays["count"][place], 0)
                residual = self.arrays["residual"][place] * _UNIT
                shrunk = (count * residual + _SHRINKAGE[k] * correction) / (count + _SHRINKAGE[k])
                correction = np.where(count > 0, shrunk, correction)
                spread = np.where(count >= 3, self.arrays["spread"][place], spread)
                counts[:, k] = count
        return Recollection(correction, counts, spread)


def build_memory_arrays(codes: np.ndarray, residuals: np.ndarray) -> dict[str, np.ndarray]:
    """Sum up residuals by surroundings.

    Parameters
    ----------
    codes : ndarray of shape (n_atoms, RADII), uint64
        Of training atoms, one for each set of equivalent atoms.
    residuals : ndarray of shape (n_atoms, 2)
        Observed minus network, 13C and 1H, in ppm; nan: not observed.

    Returns
    -------
    dict of str to ndarray
        For `EnvironmentMemory`.
    """
    known = ~np.isnan(residuals)
    every = np.unique(codes[known.any(axis=1)])
    residual = np.zeros((len(every), 2), dtype=np.int16)
    count = np.zeros((len(every), 2), dtype=np.uint8)
    spread = np.zeros((len(every), 2), dtype=np.float16)
    for column in (0, 1):
        for k in range(codes.shape[1]):
            here, values = codes[known[:, column], k], residuals[known[:, column], column]
            if not len(here):
                continue
            found, number, median, deviation = _compute_medians(here, values)
            place = np.searchsorted(every, found)
            residual[place, column] = np.clip(np.rint(median / _UNIT[column]), -32767, 32767)
            count[place, column] = np.minimum(number, _MOST)
            spread[place, column] = deviation
    steps = np.diff(every, prepend=np.uint64(0)).astype(np.uint64)
    return dict(steps=steps, residual=residual, count=count, spread=spread)


def merge_memory_arrays(old: dict[str, np.ndarray], new: dict[str, np.ndarray]) -> dict[str, np.ndarray]:
    """Add the memory of one archive to that of another; where both know a surrounding, means weighted by number."""
    codes = [np.cumsum(part["steps"], dtype=np.uint64) for part in (old, new)]
    every = np.union1d(*codes)
    total = np.zeros((len(every), 2))
    sums = {"residual": np.zeros((len(every), 2)), "spread": np.zeros((len(every), 2))}
    for part, own in zip((old, new), codes):
        place, weight = np.searchsorted(every, own), part["count"].astype(float)
        total[place] += weight
        for name, values in sums.items():
            values[place] += weight * part[name]
    mean = {name: values / np.maximum(total, 1) for name, values in sums.items()}
    return dict(
        steps=np.diff(every, prepend=np.uint64(0)).astype(np.uint64),
        residual=np.rint(mean["residual"]).astype(np.int16),
        count=np.minimum(total, _MOST).astype(np.uint8),
        spread=mean["spread"].astype(np.float16),
    )


def _compute_medians(codes, values):
    """Return the distinct codes with the number, the median and the mean absolute deviation from it of their values."""
    order = np.lexsort((values, codes))
    codes, values = codes[order], values[order]
    found, first, number = np.unique(codes, return_index=True, return_counts=True)
    median = (values[first + (number - 1) // 2] + values[first + number // 2]) / 2
    deviation = np.add.reduceat(np.abs(values - np.repeat(median, number)), first) / number
    return found, number, median, deviation
