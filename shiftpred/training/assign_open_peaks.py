"""Which site label is which atom: the optimal assignment of one compound's peaks under the present prediction.

Cost of a pair: |d13C|/2.0 (at most 40 ppm count) + |d1H|/0.35 (at most 4 ppm); a wrong hydrogen count is forbidden. The
alternation of assignment and fit follows Kang, Kwon, Lee & Choi, J. Chem. Inf. Comput. Sci. 2020 (doi 10.1021/acs.jcim.0c00494,
doi from memory).
"""

from __future__ import annotations

import numpy as np
from rdkit import Chem
from scipy.optimize import linear_sum_assignment

from shiftpred.training.open_tables import Compound

__all__ = ["PeakPlacer"]

_FORBIDDEN = 1e3
_CAP = np.array([40.0, 4.0])
_UNIT = np.array([2.0, 0.35])


class PeakPlacer:
    """Places the peaks of one compound on its atoms.

    Parameters
    ----------
    compound : Compound
    hydrogen_counts : bool, default True
        False ignores the hydrogen counts that the source states.
    """

    def __init__(self, compound: Compound, hydrogen_counts: bool = True):
        mol = compound.mol
        self.n_atoms = mol.GetNumAtoms()
        is_carbon = np.array([a.GetAtomicNum() == 6 for a in mol.GetAtoms()])
        n_h = np.array([a.GetTotalNumHs() for a in mol.GetAtoms()])
        self.has_c, self.has_h = ~np.isnan(compound.c13), ~np.isnan(compound.h1)
        kind = compound.attached_h if hydrogen_counts else np.full(len(compound.c13), -1)
        forbidden = (
            (self.has_c[:, None] & ~is_carbon)
            | (self.has_h[:, None] & (n_h == 0))
            | ((kind >= 0)[:, None] & (kind[:, None] != n_h))
        )
        self.base = _FORBIDDEN * forbidden
        self.values = np.stack([compound.c13, compound.h1], axis=1)
        self.observed = np.nan_to_num(self.values)
        self.group = np.array(list(Chem.CanonicalRankAtoms(mol, breakTies=False)))
        self.possible = len(compound.c13) <= self.n_atoms
        # Labels often follow the pen that drew the molecule: pairs of consecutive labels, and which atoms are bonded.
        self.consecutive = np.flatnonzero(np.diff(compound.labels) == 1)
        self.bonded = Chem.GetAdjacencyMatrix(mol).astype(bool)

    def compute_costs(self, predicted: np.ndarray) -> np.ndarray:
        """Return (n_sites, n_atoms) costs for `predicted` of shape (n_atoms, 2), ppm; nan: no prediction there."""
        p = np.where(np.isnan(predicted), 1e6, predicted)
        difference = np.minimum(np.abs(self.observed[:, None, :] - p[None]), _CAP) / _UNIT
        return self.base + difference[:, :, 0] * self.has_c[:, None] + difference[:, :, 1] * self.has_h[:, None]

    def assign(self, predicted: np.ndarray, label_order: float = 0.0) -> np.ndarray:
        """Return (n_sites,) the atom index of each site label, -1 where the label can go nowhere.

        With `label_order`, two labels are exchanged where that costs less than the bonds between consecutive labels gained by
        it, each worth so much; it settles what shifts alone leave open.
        """
        out = np.full(len(self.observed), -1)
        if not self.possible:
            return out
        cost = self.compute_costs(predicted)
        rows, columns = linear_sum_assignment(cost)
        good = cost[rows, columns] < _FORBIDDEN / 2
        out[rows[good]] = columns[good]
        return self._follow_labels(out, cost, label_order) if label_order else out

    def _follow_labels(self, out, cost, label_order):
        """Exchange pairs of labels while cost minus the worth of bonds between consecutive labels falls."""
        placed = np.flatnonzero(out >= 0)
        if len(placed) < 2 or not len(self.consecutive):
            return out
        after = np.zeros(len(out), dtype=bool)
        after[self.consecutive] = True

        def bonds_at(k):
            total = 0
            if after[k] and out[k] >= 0 and out[k + 1] >= 0:
                total += self.bonded[out[k], out[k + 1]]
            if k and after[k - 1] and out[k] >= 0 and out[k - 1] >= 0:
                total += self.bonded[out[k - 1], out[k]]
            return total

        for _ in range(3):
            here = cost[placed][:, out[placed]]
            own = np.diag(here)
            change = here + here.T - own[:, None] - own
            first, second = np.nonzero(np.triu(change < 3 * label_order, 1))
            swapped = False
            for p, q in sorted(zip(first, second), key=lambda pair: change[pair]):
                k, m = placed[p], placed[q]
                if self.group[out[k]] == self.group[out[m]]:
                    continue
                now = cost[k, out[k]] + cost[m, out[m]] - label_order * (bonds_at(k) + bonds_at(m))
                out[k], out[m] = out[m], out[k]
                if cost[k, out[k]] + cost[m, out[m]] - label_order * (bonds_at(k) + bonds_at(m)) < now - 1e-9:
                    swapped = True
                else:
                    out[k], out[m] = out[m], out[k]
            if not swapped:
                break
        return out

    def assign_unambiguous(self) -> np.ndarray:
        """Return (n_sites,) atom indices of the labels that can only go to one set of equivalent atoms, else -1."""
        out = np.full(len(self.observed), -1)
        if not self.possible:
            return out
        taken = set()
        for k in range(len(out)):
            places = np.flatnonzero(self.base[k] == 0)
            if len(places) and len(set(self.group[places])) == 1:
                free = [a for a in places if a not in taken]
                if free:
                    out[k] = free[0]
                    taken.add(free[0])
        return out

    def place_observed(self, assignment: np.ndarray) -> np.ndarray:
        """Return (n_atoms, 2) the compound's own 13C and 1H shifts on atoms (see `place`)."""
        return self.place(self.values, assignment)

    def place(self, values: np.ndarray, assignment: np.ndarray) -> np.ndarray:
        """Put site values on atoms and average them over equivalent atoms.

        Parameters
        ----------
        values : ndarray of shape (n_sites, k)
        assignment : ndarray of shape (n_sites,)

        Returns
        -------
        ndarray of shape (n_atoms, k); nan: no peak there.
        """
        y = np.full((self.n_atoms, values.shape[1]), np.nan)
        used = assignment >= 0
        y[assignment[used]] = values[used]
        n_groups = self.group.max() + 1
        if n_groups == self.n_atoms and len(np.unique(self.group)) == self.n_atoms:
            return y
        known = ~np.isnan(y)
        for k in range(values.shape[1]):
            count = np.bincount(self.group, weights=known[:, k], minlength=n_groups)
            total = np.bincount(self.group, weights=np.where(known[:, k], y[:, k], 0), minlength=n_groups)
            with np.errstate(invalid="ignore", divide="ignore"):
                y[:, k] = (total / count)[self.group]
        return y
