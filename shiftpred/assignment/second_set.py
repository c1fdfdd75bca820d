"""A second, weaker set of lines: slow rotamers, E/Z mixtures, diastereomer mixtures, slow tautomers.

Such a set is penalised as a whole; each of its lines then lies near the line of the same nucleus in the main set.
"""

from __future__ import annotations

import numpy as np
from rdkit import Chem
from scipy.optimize import linear_sum_assignment

from shiftpred.assignment.weights import compute_log_student

__all__ = ["assign_second_set", "find_second_set_reason"]

_LOG_PRIOR = float(np.log(0.03))
_SCALE_PPM = {"13C": 1.2, "1H": 0.12}
_FARTHEST_PPM = {"13C": 4.0, "1H": 0.5}
_FEWEST_LINES = 2
"""Chance that such a compound shows a second set, and how far its lines lie from the first (common practice, no source)."""

_REASONS = (
    ("rotamers of a tertiary amide or carbamate", "[CX3](=[OX1])[NX3;H0]([#6])[#6]"),
    ("rotamers of a formamide", "[CX3;H1](=[OX1])[NX3;H1]"),
    ("rotamers of a nitrosamine", "[NX3][NX2]=O"),
    ("E/Z isomers of an oxime, imine or hydrazone", "[CX3]=[NX2][OX2,NX3,#6]"),
    ("slow keto and enol forms", "[CX3](=O)[CX4;!H0][CX3]=O"),
)
_PATTERNS = tuple((reason, Chem.MolFromSmarts(smarts)) for reason, smarts in _REASONS)


def find_second_set_reason(mol: Chem.Mol) -> str:
    """Return why a second set of lines may be seen, '' if there is no reason.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
    """
    for reason, pattern in _PATTERNS:
        if mol.HasSubstructMatch(pattern):
            return reason
    for bond in mol.GetBonds():
        if bond.GetBondType() == Chem.BondType.DOUBLE and bond.GetStereo() > Chem.BondStereo.STEREOANY:
            return "E/Z isomers"
    if len(Chem.FindMolChiralCenters(mol, includeUnassigned=True, useLegacyImplementation=True)) >= 2:
        return "diastereomers"
    return ""


def assign_second_set(
    nucleus: str, leftover_ppm: np.ndarray, extra: np.ndarray, unit_ppm: np.ndarray
) -> tuple[list[tuple[int, int]], float]:
    """Pair leftover lines with the units whose main lines they lie near.

    Parameters
    ----------
    nucleus : {'13C', '1H'}
    leftover_ppm : ndarray of shape (k,)
    extra : ndarray of shape (k,)
        Log weight of each as a line of unknown origin.
    unit_ppm : ndarray of shape (n,)
        Observed shift of the units' lines, nan where missing.

    Returns
    -------
    pairs : list of (int, int)
        (place in `leftover_ppm`, unit); empty if a second set is not the better explanation.
    gain : float
        Log weight gained over leaving these lines unexplained.
    """
    known = np.flatnonzero(~np.isnan(unit_ppm))
    if len(leftover_ppm) < _FEWEST_LINES or len(known) == 0:
        return [], 0.0
    distance = leftover_ppm[:, None] - unit_ppm[None, known]
    scale = np.array(_SCALE_PPM[nucleus])
    # A few of a molecule's nuclei are doubled, the others coincide.
    gain = compute_log_student(distance / scale, scale, np.array(3.0)) - np.log(2.0) - extra[:, None]
    gain = np.where(np.abs(distance) <= _FARTHEST_PPM[nucleus], gain, -np.inf)
    rows, columns = linear_sum_assignment(np.maximum(gain, 0.0), maximize=True)
    pairs = [(int(r), int(known[c])) for r, c in zip(rows, columns) if gain[r, c] > 0]
    total = float(sum(gain[r, c] for r, c in zip(rows, columns) if gain[r, c] > 0)) + _LOG_PRIOR
    if len(pairs) < _FEWEST_LINES or total <= 0:
        return [], 0.0
    return pairs, total
