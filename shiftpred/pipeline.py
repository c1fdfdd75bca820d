"""START HERE: the way of a value, one line per step. Nothing is computed in this file.

text, file ─ structures ─ substituents ─ electronics ─ features ─ regression ─ calibration ─ assignment ─ judgement ─ reporting
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from shiftpred.bundles import ModelBundle, load_bundle, load_default_bundle
from shiftpred.peaks.solvents import normalise_solvent
from shiftpred.predicting import predict_molecules
from shiftpred.records import MoleculePrediction, Structure

__all__ = ["iterate_predictions", "load_model", "predict_structures"]


def load_model(model: ModelBundle | str | None = None) -> ModelBundle:
    """Return the model: one that is loaded already, one from a folder, or the shipped one."""
    if isinstance(model, ModelBundle):
        return model
    return load_bundle(model) if model else load_default_bundle()


def iterate_predictions(
    structures: Iterable[Structure], nucleus: str = "both", solvent: str | None = None, coverage: float = 0.9, model=None
) -> Iterator[MoleculePrediction]:
    """Predict structure after structure, with flat memory."""
    bundle = load_model(model)
    solvent = normalise_solvent(solvent) if solvent else None
    return predict_molecules(structures, bundle, nucleus, solvent, coverage)


def predict_structures(
    structures: Iterable[Structure], nucleus: str = "both", solvent: str | None = None, coverage: float = 0.9, model=None
) -> list[MoleculePrediction]:
    """Predict a list of structures (see `iterate_predictions` for many)."""
    return list(iterate_predictions(structures, nucleus, solvent, coverage, model))
