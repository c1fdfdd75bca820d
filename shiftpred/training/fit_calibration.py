"""Fit error sizes and interval tables on compounds that training has not seen."""

from __future__ import annotations

import numpy as np
from scipy.optimize import minimize

from shiftpred.calibration.error_size import ErrorSize, compute_error_evidence
from shiftpred.calibration.intervals import fit_interval_table
from shiftpred.calibration.novelty import NoveltyTable, compute_surroundings_codes
from shiftpred.features.molecule_arrays import MoleculeArrays
from shiftpred.structures.environments import compute_environments
from shiftpred.training.assign_open_peaks import PeakPlacer
from shiftpred.training.open_tables import Compound
from shiftpred.training.predict_graphs import GraphPrediction

__all__ = ["build_novelty_arrays", "collect_calibration_sites", "find_certain_sites", "fit_calibration", "fit_error_size"]

_APART = 3.0
"""Two predictions are apart if they differ by more than this many times the sum of their raw error sizes."""
_NUCLEI = ("13C", "1H")
_MOST_SITES = 5
"""A molecule weighs as much as its sites, up to so many."""


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


def collect_calibration_sites(
    compounds: list[Compound], predicted: list[GraphPrediction], levels: list[np.ndarray]
) -> dict[str, dict[str, np.ndarray]]:
    """Assign the peaks of held-out compounds and collect one row for each atom whose peak is known.

    Parameters
    ----------
    compounds : list of Compound
    predicted : list of GraphPrediction
        By the whole model, but with the network's own error sizes.
    levels : list of ndarray of shape (n_atoms,)
        Novelty of each atom.

    Returns
    -------
    dict
        Nucleus → columns 'molecule', 'environment', 'error_ppm', 'scale_ppm', 'certain', 'novelty', and 'evidence' of shape
        (n_sites, n_coefficients) for `fit_error_size`.
    """
    rows: dict[str, list[tuple]] = {nucleus: [] for nucleus in _NUCLEI}
    for number, (compound, prediction, level) in enumerate(zip(compounds, predicted, levels)):
        values, placer = prediction.values, PeakPlacer(compound)
        assignment = placer.assign(values[:, :2])
        placed = placer.place_observed(assignment)
        evidence = compute_error_evidence(values[:, 3:], prediction.known)
        certain = [find_certain_sites(placer, compound.mol, values, column) for column in (0, 1)]
        # A hydrogen whose carbon is certain is certain too: both carry one label.
        certain[1] |= certain[0] & ~np.isnan(placed[:, 0])
        for column, nucleus in enumerate(_NUCLEI):
            known = np.flatnonzero(~np.isnan(placed[:, column]))
            if not len(known):
                continue
            environments = compute_environments(compound.mol, nucleus)
            for i in known:
                error, scale = placed[i, column] - values[i, column], values[i, 3 + column]
                rows[nucleus].append(
                    (number, str(environments[i]), error, scale, certain[column][i], level[i], evidence[i, column])
                )
    names = ("molecule", "environment", "error_ppm", "scale_ppm", "certain", "novelty", "evidence")
    return {n: {name: np.array(values) for name, values in zip(names, zip(*listed))} for n, listed in rows.items()}


def fit_error_size(evidence: np.ndarray, errors: np.ndarray, molecules: np.ndarray) -> list[float]:
    """Fit the coefficients of `ErrorSize` for one nucleus.

    Maximum likelihood of a heavy-tailed density, proportional to 1 / (size (1 + |error| / size)²), a ridge on top.

    Parameters
    ----------
    evidence : ndarray of shape (n_sites, n_coefficients)
        From `compute_error_evidence`, the constant first.
    errors : ndarray of shape (n_sites,)
        Observed minus predicted, ppm.
    molecules : ndarray of shape (n_sites,)
        Which molecule each site belongs to; sites of a molecule beyond the fifth share the weight of five.

    Returns
    -------
    list of float, (n_coefficients,)
    """
    centre, width = evidence.mean(axis=0), evidence.std(axis=0)
    centre[0], width = 0.0, np.where(width > 1e-9, width, 1.0)
    x, size = (evidence - centre) / width, np.abs(errors)
    weights = _compute_molecule_weights(molecules)
    weights = weights / weights.sum()

    def compute_loss(w):
        log_size = x @ w
        ratio = size * np.exp(-log_size)
        loss = (weights * (log_size + 2 * np.log1p(ratio))).sum() + 1e-4 * (w[1:] ** 2).sum()
        slope = x.T @ (weights * (1 - 2 * ratio / (1 + ratio)))
        return loss, slope + 2e-4 * np.concatenate([[0.0], w[1:]])

    found = minimize(compute_loss, np.zeros(x.shape[1]), jac=True, method="L-BFGS-B").x
    coefficients = found / width
    coefficients[0] = found[0] - (found * centre / width)[1:].sum()
    return [round(float(c), 5) for c in coefficients]


def _compute_molecule_weights(molecules: np.ndarray) -> np.ndarray:
    _, place, sites = np.unique(molecules, return_inverse=True, return_counts=True)
    return np.minimum(sites[place], _MOST_SITES) / sites[place]


def fit_calibration(
    compounds: list[Compound], graphs: list[MoleculeArrays], predicted: list[GraphPrediction], novelty: NoveltyTable
) -> dict:
    """Fit error sizes and interval tables of both nuclei on sites whose assignment is certain.

    Parameters
    ----------
    compounds : list of Compound
        Held out from training.
    graphs : list of MoleculeArrays
    predicted : list of GraphPrediction
        By network and memory, with the network's own error sizes.
    novelty : NoveltyTable

    Returns
    -------
    dict
        'error_size': coefficients for `ErrorSize`; 'intervals': nucleus → table for `IntervalTable`.
    """
    levels = [novelty.compute_levels(compute_surroundings_codes(g)) for g in graphs]
    sites = collect_calibration_sites(compounds, predicted, levels)
    coefficients = {
        n: fit_error_size(*(s[c][s["certain"]] for c in ("evidence", "error_ppm", "molecule"))) for n, s in sites.items()
    }
    # Which sites are certain depends on the error sizes: look again with the fitted ones.
    size = ErrorSize(coefficients)
    sites = collect_calibration_sites(compounds, [_resize(p, size) for p in predicted], levels)
    tables = {}
    for nucleus, columns in sites.items():
        use = columns["certain"]
        score = np.abs(columns["error_ppm"]) / columns["scale_ppm"]
        tables[nucleus] = fit_interval_table(
            nucleus, columns["environment"][use], score[use], columns["molecule"][use], columns["novelty"][use]
        )
    return dict(error_size=coefficients, intervals=tables)


def _resize(prediction: GraphPrediction, size: ErrorSize) -> GraphPrediction:
    values = prediction.values.copy()
    values[:, 3:] = size.compute(values[:, 3:], prediction.known)
    return GraphPrediction(values, prediction.known)
