"""Fit the interval tables on compounds that training has not seen."""

from __future__ import annotations

import numpy as np

from shiftpred.calibration.intervals import fit_interval_table
from shiftpred.calibration.novelty import NoveltyTable, compute_surroundings_codes
from shiftpred.features.molecule_arrays import MoleculeArrays
from shiftpred.structures.environments import compute_environments
from shiftpred.training.assign_open_peaks import PeakPlacer
from shiftpred.training.open_tables import Compound

__all__ = ["build_novelty_arrays", "collect_calibration_sites", "find_certain_sites", "fit_calibration"]

_APART = 3.0
"""Two predictions are apart if they differ by more than this many times the sum of their raw error sizes."""


def build_novelty_arrays(graphs: list[MoleculeArrays]) -> dict[str, np.ndarray]:
    """Return the sorted codes of all surroundings in the training graphs: 'one_bond', 'two_bonds'."""
    codes = np.concatenate([compute_surroundings_codes(g) for g in graphs])
    return dict(one_bond=np.unique(codes[:, 0]), two_bonds=np.unique(codes[:, 1]))


def find_certain_sites(placer: PeakPlacer, mol, predicted: np.ndarray, nucleus_column: int) -> np.ndarray:
    """Say of which atoms the assignment is certain.

    An atom is certain if every other, not equivalent atom that could have its peak (same element, for 13C also the same
    number of hydrogens) is predicted far away. Only predictions decide, never the observed shift, so that the choice does not
    favour small errors.

    Parameters
    ----------
    placer : PeakPlacer
    mol : rdkit Mol
    predicted : ndarray of shape (n_atoms, 5)
        13C, 1H, half gap, raw scales of 13C and 1H; ppm.
    nucleus_column : {0, 1}
        13C or 1H.

    Returns
    -------
    ndarray of shape (n_atoms,), bool
    """
    hydrogens = np.array([a.GetTotalNumHs() for a in mol.GetAtoms()])
    carbon = np.array([a.GetAtomicNum() == 6 for a in mol.GetAtoms()])
    shift, scale = predicted[:, nucleus_column], predicted[:, 3 + nucleus_column]
    if nucleus_column == 0:
        rival = carbon[:, None] & carbon & (hydrogens[:, None] == hydrogens)
    else:
        rival = (hydrogens[:, None] > 0) & (hydrogens > 0)
    rival &= placer.group[:, None] != placer.group
    near = np.abs(shift[:, None] - shift) < _APART * (scale[:, None] + scale)
    return ~(rival & near).any(axis=1)


def collect_calibration_sites(compounds: list[Compound], predicted: list[np.ndarray], nucleus: str, levels) -> dict:
    """Assign the peaks of held-out compounds and collect one row for each set of equivalent atoms.

    Returns
    -------
    dict of ndarrays: 'molecule', 'environment', 'score', 'error_ppm', 'scale_ppm', 'certain', 'novelty'
    """
    column = ("13C", "1H").index(nucleus)
    rows = []
    for number, (compound, values, level) in enumerate(zip(compounds, predicted, levels)):
        placer = PeakPlacer(compound)
        assignment = placer.assign(values[:, :2])
        y = placer.place(np.stack([compound.c13, compound.h1], axis=1), assignment)[:, column]
        known = ~np.isnan(y)
        if not known.any():
            continue
        environments = [str(e) for e in compute_environments(compound.mol, nucleus)]
        certain = find_certain_sites(placer, compound.mol, values, column)
        if nucleus == "1H":
            # A hydrogen whose carbon is certain is certain too: both carry one label.
            on_carbon = placer.place(compound.c13[:, None], assignment)[:, 0]
            certain |= find_certain_sites(placer, compound.mol, values, 0) & ~np.isnan(on_carbon)
        for i in np.flatnonzero(known):
            error, scale = float(y[i] - values[i, column]), float(values[i, 3 + column])
            rows.append((number, environments[i], abs(error) / scale, error, scale, certain[i], level[i]))
    names = ("molecule", "environment", "score", "error_ppm", "scale_ppm", "certain", "novelty")
    return {name: np.array(values) for name, values in zip(names, zip(*rows))}


def fit_calibration(compounds: list[Compound], graphs, predicted: list[np.ndarray], novelty: NoveltyTable) -> dict:
    """Fit the interval tables of both nuclei.

    Parameters
    ----------
    compounds : list of Compound
        Held out from training.
    graphs : list of MoleculeArrays
    predicted : list of ndarray of shape (n_atoms, 5)
    novelty : NoveltyTable

    Returns
    -------
    dict
        Nucleus → table for `IntervalTable`.
    """
    levels = [novelty.compute_levels(compute_surroundings_codes(g)) for g in graphs]
    out = {}
    for nucleus in ("13C", "1H"):
        sites = collect_calibration_sites(compounds, predicted, nucleus, levels)
        use = sites["certain"].astype(bool)
        out[nucleus] = fit_interval_table(
            nucleus, sites["environment"][use], sites["score"][use], sites["molecule"][use], sites["novelty"][use]
        )
    return out
