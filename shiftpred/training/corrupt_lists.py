"""Peak lists as they are in life: something missing, something too many, off reference, merged, split."""

from __future__ import annotations

import numpy as np
from rdkit import Chem

from shiftpred.assignment.couplings import compute_expected_couplings

__all__ = ["CORRUPTIONS", "corrupt_carbon_list", "corrupt_hydrogen_list"]

CORRUPTIONS = (
    "", "a carbon missing", "solvent line too many", "ethyl acetate too many", "unknown line too many",
    "off by 0.3 ppm (1H 0.03)", "off by 2 ppm (1H 0.3)", "two lines merged", "split by fluorine",
)  # fmt: skip
"""The blank one leaves the list as it is."""
_ETHYL_ACETATE = {"13C": (171.36, 60.49, 21.04, 14.19), "1H": (4.12, 2.05, 1.26)}
_CARBON_MHZ = 100.6


def corrupt_carbon_list(shifts: np.ndarray, corruption: str, mol: Chem.Mol, random: np.random.Generator) -> np.ndarray | None:
    """Return the 13C list after `corruption`; None where it cannot be done to this compound.

    Parameters
    ----------
    shifts : ndarray of shape (n,)
    corruption : str
        One of `CORRUPTIONS`.
    mol : rdkit.Chem.Mol
        The right structure, for the splittings by fluorine.
    random : numpy.random.Generator
    """
    return _corrupt(shifts, corruption, mol, random, "13C", 0.3, 2.0, (77.16,))


def corrupt_hydrogen_list(shifts: np.ndarray, corruption: str, mol: Chem.Mol, random: np.random.Generator) -> np.ndarray | None:
    """Return the 1H list after `corruption`; see `corrupt_carbon_list`."""
    return _corrupt(shifts, corruption, mol, random, "1H", 0.03, 0.3, (7.26, 1.56))


def _corrupt(shifts, corruption, mol, random, nucleus, small, large, solvent):
    shifts = np.asarray(shifts, dtype=float)
    if corruption == "":
        return shifts
    if corruption == "a carbon missing":
        return np.delete(shifts, random.integers(len(shifts))) if len(shifts) > 3 and nucleus == "13C" else shifts
    if corruption == "solvent line too many":
        return np.append(shifts, solvent)
    if corruption == "ethyl acetate too many":
        return np.append(shifts, _ETHYL_ACETATE[nucleus])
    if corruption == "unknown line too many":
        low, high = (10.0, 180.0) if nucleus == "13C" else (0.8, 8.5)
        return np.append(shifts, round(random.uniform(low, high), 2))
    if corruption.startswith("off by 0.3"):
        return shifts + small * random.choice((-1, 1))
    if corruption.startswith("off by 2"):
        return shifts + large * random.choice((-1, 1))
    if corruption == "two lines merged":
        return _merge(shifts)
    return _split(shifts, mol) if nucleus == "13C" else shifts


def _merge(shifts):
    if len(shifts) < 4:
        return None
    ordered = np.sort(shifts)
    k = int(np.argmin(np.diff(ordered)))
    return np.concatenate([ordered[:k], [(ordered[k] + ordered[k + 1]) / 2], ordered[k + 2 :]])


def _split(shifts, mol):
    """Split the line nearest to where a C-F carbon lies, as a decoupled spectrum shows it; only for one aryl fluorine."""
    couplings = compute_expected_couplings(mol)
    bearing = [i for i, c in couplings.items() if c[0].element == "F" and c[0].bonds == 1 and c[0].nuclei == 1]
    if len(bearing) != 1 or not mol.GetAtomWithIdx(bearing[0]).GetIsAromatic():
        return None
    k = int(np.argmin(np.abs(shifts - 162.0)))
    half = 247.0 / 2 / _CARBON_MHZ
    return np.round(np.concatenate([np.delete(shifts, k), [shifts[k] + half, shifts[k] - half]]), 2)
