"""From a trained network to everything else that a model folder holds: memory, intervals, substituent model."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shiftpred.bundles import ModelBundle
from shiftpred.calibration.novelty import NoveltyTable
from shiftpred.features.concentric_environments import compute_environment_codes
from shiftpred.features.molecule_arrays import MoleculeArrays
from shiftpred.features.solvents import SOLVENTS
from shiftpred.regression.environment_memory import EnvironmentMemory, build_memory_arrays, merge_memory_arrays
from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.regression.explanation_parts import compute_residual_scale
from shiftpred.training.assign_open_peaks import PeakPlacer
from shiftpred.training.fit_calibration import build_novelty_arrays, fit_calibration
from shiftpred.training.fit_substituent_model import fit_substituent_model
from shiftpred.training.open_tables import Compound
from shiftpred.training.predict_graphs import GraphPrediction, predict_graphs
from shiftpred.training.progress import show_progress
from shiftpred.training.train_environment_model import compute_errors, is_strange

__all__ = [
    "PlacedPeaks",
    "build_calibration",
    "build_memory",
    "build_substituents",
    "compute_held_out_errors",
    "place_peaks",
    "render_set_aside",
]

_ENOUGH_TO_CALIBRATE = 200
"""Held-out compounds of an archive from which on its own intervals replace those of the model it was trained on top of."""


@dataclass(frozen=True)
class PlacedPeaks:
    """The peaks of one compound on its atoms."""

    observed: np.ndarray
    """(n_atoms, 2) 13C and 1H shifts in ppm; nan: none."""
    first_of_group: np.ndarray
    """(n_atoms,) bool: the first atom of each set of equivalent ones."""
    strange: bool
    """The peaks fit so badly that spectrum or structure is probably wrong."""


def place_peaks(compounds: list[Compound], predicted: list[GraphPrediction], label_order: float) -> list[PlacedPeaks]:
    """Assign the peaks of training compounds as the last pass of training does."""
    out = []
    for compound, prediction in zip(show_progress(compounds, "assign", len(compounds)), predicted):
        placer = PeakPlacer(compound)
        assignment = placer.assign(prediction.values[:, :2], label_order)
        first = np.zeros(placer.n_atoms, dtype=bool)
        first[np.unique(placer.group, return_index=True)[1]] = True
        strange = is_strange(compound, assignment, prediction.values)
        out.append(PlacedPeaks(placer.place_observed(assignment), first, strange))
    return out


def build_memory(
    graphs: list[MoleculeArrays], predicted: list[GraphPrediction], placed: list[PlacedPeaks], base: ModelBundle | None = None
) -> EnvironmentMemory:
    """Remember what the network missed on the training compounds; strange ones are left out.

    Parameters
    ----------
    graphs, predicted, placed : list
        Of the training compounds; predictions by the network alone.
    base : ModelBundle, optional
        A model that the network was trained on top of: its memory is kept where the archive has nothing to say.
    """
    codes, residuals = [], []
    for graph, prediction, peaks in zip(graphs, predicted, placed):
        if not peaks.strange:
            use = peaks.first_of_group
            codes.append(compute_environment_codes(graph)[use])
            residuals.append((peaks.observed - prediction.values[:, :2])[use])
    arrays = build_memory_arrays(np.concatenate(codes), np.concatenate(residuals))
    return EnvironmentMemory(merge_memory_arrays(base.memory.arrays, arrays) if base else arrays)


def build_calibration(
    compounds: list[Compound], graphs: list[MoleculeArrays], network, memory, train_graphs, base: ModelBundle | None = None
) -> tuple[dict, dict[str, np.ndarray]]:
    """Fit error sizes and intervals on held-out compounds, or keep those of the base where there are too few.

    Returns
    -------
    calibration : dict
        'error_size' and 'intervals', JSON-ready.
    novelty_arrays : dict of str to ndarray
        For `NoveltyTable`.
    """
    novelty = build_novelty_arrays(train_graphs)
    if base:
        novelty = {name: np.union1d(codes, getattr(base.novelty, name)) for name, codes in novelty.items()}
    if base and len(compounds) < _ENOUGH_TO_CALIBRATE:
        return dict(error_size=base.error_size.coefficients, intervals=base.intervals.tables), novelty
    predicted = predict_graphs(graphs, network, memory)
    return fit_calibration(compounds, graphs, predicted, NoveltyTable(**novelty)), novelty


def build_substituents(compounds: list[Compound], placed: list[PlacedPeaks], held_out, held_out_predicted):
    """Fit the substituent model to the network's assignments.

    Parameters
    ----------
    compounds, placed : list
        Training compounds and their peaks.
    held_out : list of Compound
    held_out_predicted : list of GraphPrediction
        By the whole model; they say how large the remainder of an explanation usually is.

    Returns
    -------
    SubstituentModel
    """
    model = fit_substituent_model(
        [c.mol for c in compounds], [p.observed for p in placed], solvents=[_find_only_solvent(c) for c in compounds]
    )
    totals = [_mask(c, p.values) for c, p in zip(held_out, held_out_predicted)]
    for nucleus, table in compute_residual_scale(model, [c.mol for c in held_out], totals).items():
        model.set_residual_scale(nucleus, table)
    return model


def compute_held_out_errors(
    compounds: list[Compound], graphs: list[MoleculeArrays], network: EnvironmentModel, memory: EnvironmentMemory | None = None
) -> dict:
    """Return mean and median errors (ppm; 1H on carbon) of held-out compounds after the best assignment."""
    cases = []
    for compound, prediction in zip(compounds, predict_graphs(graphs, network, memory)):
        placer = PeakPlacer(compound)
        cases.append((placer, compound, placer.assign(prediction.values[:, :2]), prediction.values))
    return {**compute_errors(cases), "compounds": len(cases)}


def render_set_aside(compounds: list[Compound], predicted: list[GraphPrediction], placed: list[PlacedPeaks]) -> str:
    """Render the training compounds whose peaks fit far worse than the rest as CSV."""
    lines = ["compound,mean_13C_error_ppm,smiles"]
    for compound, prediction, peaks in zip(compounds, predicted, placed):
        if peaks.strange:
            error = np.abs(peaks.observed[:, 0] - prediction.values[:, 0])
            mean = "" if np.isnan(error).all() else f"{np.nanmean(error):.2f}"
            lines.append(f"{compound.key},{mean},{compound.smiles}")
    return "\n".join(lines) + "\n"


def _find_only_solvent(compound: Compound) -> str | None:
    """Return the compound's solvent where all its peaks were measured in one that is known."""
    names = {SOLVENTS[k] for k, _ in compound.samples}
    return names.pop() or None if len(names) == 1 else None


def _mask(compound: Compound, predicted: np.ndarray) -> np.ndarray:
    """Return (n_atoms, 2) predicted shifts with nan where the atom has no such nucleus."""
    out = predicted[:, :2].copy()
    for atom in compound.mol.GetAtoms():
        if atom.GetAtomicNum() != 6:
            out[atom.GetIdx(), 0] = np.nan
        if atom.GetTotalNumHs() == 0:
            out[atom.GetIdx(), 1] = np.nan
    return out
