"""Predict the graphs of many compounds as a finished model does, straight from its parts."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from shiftpred.calibration.error_size import ErrorSize
from shiftpred.features.molecule_arrays import MoleculeArrays, join_molecule_arrays
from shiftpred.predicting import predict_values
from shiftpred.regression.environment_memory import EnvironmentMemory, Recollection
from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.training.progress import show_progress

__all__ = ["GraphPrediction", "predict_graphs", "predict_shifts"]

_BATCH = 64


@dataclass(frozen=True)
class GraphPrediction:
    """What a model says of the atoms of one molecule."""

    values: np.ndarray
    """(n_atoms, 5) 13C shift, 1H shift, half gap of a CH2, error sizes of 13C and 1H, in ppm."""
    known: Recollection
    """What was measured in the same surroundings."""


def predict_graphs(
    graphs: Iterable[MoleculeArrays],
    network: EnvironmentModel,
    memory: EnvironmentMemory | None = None,
    error_size: ErrorSize | None = None,
) -> list[GraphPrediction]:
    """Predict without a solvent; without a memory and an error size the network speaks alone."""
    memory, error_size = memory or EnvironmentMemory(), error_size or ErrorSize()
    graphs, out = list(graphs), []
    for begin in show_progress(range(0, len(graphs), _BATCH), "predict"):
        joined, offsets = join_molecule_arrays(graphs[begin : begin + _BATCH])
        values, scales, known = predict_values(joined, network, memory, error_size)
        both = np.concatenate([values, scales], axis=1)
        for first, last in zip(offsets[:-1], offsets[1:]):
            part = slice(first, last)
            own = Recollection(known.correction[part], known.counts[part], known.spread[part])
            out.append(GraphPrediction(both[part], own))
    return out


def predict_shifts(graphs: Iterable[MoleculeArrays], network: EnvironmentModel) -> list[np.ndarray]:
    """Return (n_atoms, 2) 13C and 1H in ppm for every graph, from the network alone."""
    return [p.values[:, :2] for p in predict_graphs(graphs, network)]
