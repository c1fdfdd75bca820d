"""The environment model at prediction time: message passing on the molecular graph in plain numpy.

What electronegativity equalisation does with fixed constants, this does with learned ones: each atom hears from its
neighbours, adjusts, and is heard again, once for every layer.
"""

from __future__ import annotations

import numpy as np

from shiftpred.features.molecule_arrays import MoleculeArrays

__all__ = ["EnvironmentModel", "OUTPUT_CENTRE", "OUTPUT_UNIT", "SOLVENT_RANK"]

OUTPUT_CENTRE = (90.0, 4.0, 0.0)
"""13C shift, 1H shift and half gap of a CH2 (ppm) at which the outputs are zero."""
OUTPUT_UNIT = (50.0, 2.5, 0.25)
"""ppm for one unit of output."""
SOLVENT_RANK = 24
"""Width of the solvent term."""


class EnvironmentModel:
    """Predicts raw shifts and raw error sizes for every atom of a graph.

    Parameters
    ----------
    arrays : dict of str to ndarray
        Weights as `shiftpred.training.network.export_arrays` names them.
    """

    def __init__(self, arrays: dict[str, np.ndarray]):
        self.arrays = {k: np.asarray(v, dtype=np.float32) for k, v in arrays.items()}
        self.depth = 1 + max(int(k.split(".")[1]) for k in self.arrays if k.startswith("layers."))

    def predict_raw(self, graph: MoleculeArrays) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Predict without a solvent.

        Returns
        -------
        values : ndarray of shape (n_atoms, 3)
            13C shift, 1H shift, half gap of a CH2's hydrogens, in ppm; meaningful only where the atom is a carbon or bears
            a hydrogen.
        scales : ndarray of shape (n_atoms, 2)
            Raw size of the error of 13C and 1H, in ppm, before calibration.
        inner : ndarray of shape (n_atoms, width)
            What the network knows of each environment; used for the solvent term and for the distance to training data.
        """
        w = self.arrays
        n = len(graph.atoms)
        first, heard_by = _segments(graph.target, n)
        h = np.maximum(graph.atoms @ w["embed.weight"] + w["embed.bias"], 0)
        for k in range(self.depth):
            p = f"layers.{k}."
            projected = _normalise(h, w[p + "norm.weight"], w[p + "norm.bias"]) @ w[p + "project.weight"]
            projected += w[p + "project.bias"]
            width = w[p + "from_edge.weight"].shape[1]
            inside = projected[:, 2 * width :]
            if len(graph.source):
                message = projected[graph.source, :width]
                message += projected[graph.target, width : 2 * width]
                message += graph.edges @ w[p + "from_edge.weight"]
                np.maximum(message, 0, out=message)
                heard = np.zeros((n, width), dtype=np.float32)
                heard[heard_by] = np.add.reduceat(message, first, axis=0)
                inside = inside + heard @ w[p + "update_heard.weight"]
            h = h + np.maximum(inside, 0) @ w[p + "update_out.weight"] + w[p + "update_out.bias"]
        inner = _normalise(h, w["norm.weight"], w["norm.bias"])
        inside = np.maximum(inner @ w["head_in.weight"] + w["head_in.bias"], 0).reshape(n, 3, -1)
        out = (inside * w["head_out"]).sum(2) + w["head_bias"]
        out[:, 2] = np.logaddexp(0, out[:, 2])
        inside = np.maximum(inner @ w["scale_in.weight"] + w["scale_in.bias"], 0).reshape(n, 2, -1)
        log_scale = (inside * w["scale_out"]).sum(2) + w["scale_bias"]
        unit = np.array(OUTPUT_UNIT, dtype=np.float32)
        values = out * unit + np.array(OUTPUT_CENTRE, dtype=np.float32)
        return values, np.exp(np.clip(log_scale, -8, 3)) * unit[:2], inner

    def predict_solvent_effect(self, inner: np.ndarray, solvent: int) -> np.ndarray:
        """Return (n_atoms, 2) ppm to add for a solvent (index into `shiftpred.features.solvents.SOLVENTS`; 0: none)."""
        w = self.arrays
        shape = np.tanh(inner @ w["solvent_in.weight"] + w["solvent_in.bias"])
        return (shape @ w["solvent_out"][solvent].T) * np.array(OUTPUT_UNIT[:2], dtype=np.float32)


def _segments(target: np.ndarray, n: int) -> tuple[np.ndarray, np.ndarray]:
    """Return where each run of equal targets starts, and whose run it is (atoms without neighbours have none)."""
    if len(target) == 0:
        return np.zeros(0, dtype=np.int64), np.zeros(0, dtype=np.int64)
    first = np.flatnonzero(np.concatenate([[True], target[1:] != target[:-1]]))
    return first, target[first]


def _normalise(x: np.ndarray, weight: np.ndarray, bias: np.ndarray) -> np.ndarray:
    centred = x - x.mean(axis=1, keepdims=True)
    variance = np.einsum("ij,ij->i", centred, centred)[:, None] / x.shape[1]
    return centred / np.sqrt(variance + np.float32(1e-5)) * weight + bias
