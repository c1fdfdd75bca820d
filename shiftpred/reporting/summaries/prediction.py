"""`MoleculePrediction` → dictionary (schemas/prediction-1.json), in pieces so that any number can be streamed."""

from __future__ import annotations

from collections.abc import Iterable

from shiftpred.records import MoleculePrediction, RecordFailure
from shiftpred.reporting.prediction_rows import build_molecule_notes
from shiftpred.reporting.summaries.common import (
    CAUTION,
    SCHEMA_VERSION,
    build_nucleus_entry,
    compute_structure_dict,
    compute_tool_dict,
)

__all__ = ["build_failure_entry", "build_prediction_entry", "compute_prediction_dict", "compute_prediction_heading"]


def compute_prediction_heading(
    model: str, nucleus: str = "both", solvent: str | None = None, coverage: float = 0.9, date: str = ""
) -> dict:
    """Return everything of a prediction's dictionary but the molecules, which follow one by one."""
    return {
        "schema_version": SCHEMA_VERSION,
        "kind": "prediction",
        "tool": compute_tool_dict(),
        "model": model,
        "date": date,
        "settings": {"nucleus": nucleus, "solvent": solvent, "coverage": coverage},
        "cautions": [CAUTION],
    }


def build_prediction_entry(prediction: MoleculePrediction) -> dict:
    """Return one molecule's entry: its structure and one entry a site and nucleus."""
    return {
        "molecule": prediction.structure.name,
        "structure": compute_structure_dict(prediction.structure),
        "nuclei": [build_nucleus_entry(n) for n in prediction.nuclei],
        "notes": build_molecule_notes(prediction),
    }


def build_failure_entry(failure: RecordFailure) -> dict:
    """Return the entry of a record that could not be read: no structure, no nuclei, the reason as its note."""
    return {"molecule": failure.name, "structure": None, "nuclei": [], "notes": [str(failure.error)]}


def compute_prediction_dict(
    predictions: Iterable[MoleculePrediction | RecordFailure],
    nucleus: str = "both",
    solvent: str | None = None,
    coverage: float = 0.9,
    date: str = "",
) -> dict:
    """Put predictions into one plain dictionary.

    Parameters
    ----------
    predictions : iterable of MoleculePrediction or RecordFailure
        In the order of the input.
    nucleus, solvent, coverage
        What was asked for.
    date : str, default ''
        Date in ISO form; '' leaves it out.

    Returns
    -------
    dict
        As in `schemas/prediction-1.json`.
    """
    predictions = list(predictions)
    model = next((p.model for p in predictions if isinstance(p, MoleculePrediction)), "")
    heading = compute_prediction_heading(model, nucleus, solvent, coverage, date)
    return heading | {
        "molecules": [
            build_failure_entry(p) if isinstance(p, RecordFailure) else build_prediction_entry(p) for p in predictions
        ]
    }
