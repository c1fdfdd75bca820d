"""Look-up of identical environments: the mean shift of the training sites with the same surroundings, as far out as possible.

A baseline without chemistry: who has seen exactly this environment knows its shift. The environment of an atom is coded shell
by shell, each atom's code being mixed with those of its neighbours and the bonds to them, once for every bond further out (the
refinement of Morgan, J. Chem. Doc. 1965, 5, 107, doi 10.1021/c160017a018), so that the code does not depend on the order of the
atoms. Stereo is left out.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from rdkit import Chem

__all__ = ["EnvironmentLookup", "build_environment_lookup", "compute_environment_codes"]

REACH = 5
"""Bonds out to which environments are compared at most."""
_KEYS = np.random.default_rng(19650115).integers(1, 2**62, 8, dtype=np.uint64) | np.uint64(1)
_MIX = np.uint64(0x9E3779B97F4A7C15)


def compute_environment_codes(mol: Chem.Mol) -> np.ndarray:
    """Compute codes of every atom's surroundings.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised, hydrogens implicit.

    Returns
    -------
    ndarray of shape (n_atoms, REACH + 1), uint64
        Column k: equal codes mean equal surroundings out to k bonds (elements, hydrogens, charges, aromaticity, ring
        membership, bond orders), up to chance collisions (one in 10¹⁹ for each pair).
    """
    n = mol.GetNumAtoms()
    properties = np.array(
        [
            (a.GetAtomicNum(), a.GetTotalNumHs(), a.GetFormalCharge() + 8, a.GetIsAromatic(), a.IsInRing(), a.GetDegree())
            for a in mol.GetAtoms()
        ],
        dtype=np.uint64,
    ).reshape(n, 6)
    source, target, order = _list_bonds(mol)
    code = _scramble((properties * _KEYS[:6]).sum(axis=1, dtype=np.uint64))
    out = np.empty((n, REACH + 1), dtype=np.uint64)
    out[:, 0] = code
    for shell in range(1, REACH + 1):
        code = _mix_shell(code, source, target, order)
        out[:, shell] = code
    return out


def _list_bonds(mol):
    """Return source, target and coded order of every bond, in both directions."""
    bonds = [(b.GetBeginAtomIdx(), b.GetEndAtomIdx(), int(2 * b.GetBondTypeAsDouble())) for b in mol.GetBonds()]
    begin, end, order = np.array(bonds, dtype=np.int64).reshape(-1, 3).T
    order = order.astype(np.uint64) * _KEYS[6]
    return np.concatenate([begin, end]), np.concatenate([end, begin]), np.concatenate([order, order])


def _mix_shell(code, source, target, order):
    heard = np.zeros(len(code), dtype=np.uint64)
    np.add.at(heard, target, _scramble(code[source] ^ order))
    return _scramble(code * _KEYS[7] + heard)


def _scramble(x: np.ndarray) -> np.ndarray:
    x = (x ^ (x >> np.uint64(31))) * np.uint64(0xBF58476D1CE4E5B9)
    return (x ^ (x >> np.uint64(27))) + _MIX


@dataclass(frozen=True)
class EnvironmentLookup:
    """Mean shifts by environment code."""

    codes: tuple[np.ndarray, ...]
    """One sorted (n_codes,) uint64 array for each reach, 0 to REACH bonds."""
    means: tuple[np.ndarray, ...]
    """One (n_codes, 2) array for each reach: mean 13C and 1H shift in ppm; nan: none seen."""

    def predict(self, codes: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Look up the largest environment that has been seen.

        Parameters
        ----------
        codes : ndarray of shape (n_atoms, REACH + 1)
            From `compute_environment_codes`.

        Returns
        -------
        shifts : ndarray of shape (n_atoms, 2)
            13C and 1H, ppm; nan where not even the atom by itself has been seen with that nucleus.
        reach : ndarray of shape (n_atoms, 2), int
            Bonds out to which the environment was the same; -1: not seen.
        """
        shifts = np.full((len(codes), 2), np.nan)
        reach = np.full((len(codes), 2), -1)
        for k in range(REACH, -1, -1):
            known = self.codes[k]
            if not len(known):
                continue
            place = np.minimum(np.searchsorted(known, codes[:, k]), len(known) - 1)
            found = np.where((known[place] == codes[:, k])[:, None], self.means[k][place], np.nan)
            fresh = np.isnan(shifts) & ~np.isnan(found)
            shifts[fresh] = found[fresh]
            reach[fresh] = k
        return shifts, reach


def build_environment_lookup(codes: Sequence[np.ndarray], shifts: Sequence[np.ndarray]) -> EnvironmentLookup:
    """Collect training sites.

    Parameters
    ----------
    codes : sequence of ndarray of shape (n_atoms, REACH + 1)
        One for each molecule, from `compute_environment_codes`.
    shifts : sequence of ndarray of shape (n_atoms, 2)
        13C and 1H in ppm; nan: not observed.

    Returns
    -------
    EnvironmentLookup
    """
    all_codes = np.concatenate([np.zeros((0, REACH + 1), dtype=np.uint64), *codes])
    all_shifts = np.concatenate([np.zeros((0, 2)), *shifts])
    known = ~np.isnan(all_shifts)
    used = known.any(axis=1)
    all_codes, all_shifts, known = all_codes[used], np.nan_to_num(all_shifts[used]), known[used]
    sorted_codes, means = [], []
    for k in range(REACH + 1):
        unique, place = np.unique(all_codes[:, k], return_inverse=True)
        columns = []
        for column in (0, 1):
            count = np.bincount(place, weights=known[:, column], minlength=len(unique))
            total = np.bincount(place, weights=np.where(known[:, column], all_shifts[:, column], 0.0), minlength=len(unique))
            with np.errstate(invalid="ignore", divide="ignore"):
                columns.append(total / count)
        sorted_codes.append(unique)
        means.append(np.stack(columns, axis=1))
    return EnvironmentLookup(tuple(sorted_codes), tuple(means))
