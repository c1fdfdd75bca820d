"""Dictionaries → JSON text; the schemas that they keep to."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator
from importlib.resources import files

from shiftpred.errors import SettingError, quote
from shiftpred.records import MoleculePrediction, RecordFailure
from shiftpred.reporting.summaries import build_failure_entry, build_prediction_entry

__all__ = ["SCHEMA_NAMES", "iterate_prediction_json", "load_schema", "render_json"]

SCHEMA_NAMES = ("comparison-1", "explanation-1", "prediction-1", "ranking-1", "substituent-1")


def render_json(document: dict) -> str:
    """Return a dictionary as JSON: UTF-8 text, indented, keys in their order, no NaN or infinity.

    Raises
    ------
    ValueError
        If an infinite or missing number got in, which JSON cannot hold.
    """
    return json.dumps(document, ensure_ascii=False, indent=2, allow_nan=False) + "\n"


def iterate_prediction_json(heading: dict, predictions: Iterable[MoleculePrediction | RecordFailure]) -> Iterator[str]:
    """Return a prediction's JSON piece by piece, so that memory stays flat over any number of molecules.

    Parameters
    ----------
    heading : dict
        From `compute_prediction_heading`.
    predictions : iterable of MoleculePrediction or RecordFailure

    Yields
    ------
    str
        Pieces of one JSON text as in `schemas/prediction-1.json`; each molecule stands on a line of its own.
    """
    opening = json.dumps(heading, ensure_ascii=False, indent=2, allow_nan=False)
    yield opening[: opening.rindex("}")].rstrip() + ',\n  "molecules": ['
    separator = "\n    "
    for prediction in predictions:
        failed = isinstance(prediction, RecordFailure)
        entry = build_failure_entry(prediction) if failed else build_prediction_entry(prediction)
        yield separator + json.dumps(entry, ensure_ascii=False, allow_nan=False)
        separator = ",\n    "
    yield "\n  ]\n}\n"


def load_schema(name: str) -> dict:
    """Return one of the shipped JSON Schemas.

    Parameters
    ----------
    name : str
        One of `SCHEMA_NAMES`, for instance 'comparison-1'.

    Raises
    ------
    SettingError
        For another name.
    """
    if name not in SCHEMA_NAMES:
        raise SettingError("schema", quote(name), f"one of {', '.join(SCHEMA_NAMES)}", "load_schema('comparison-1')")
    return json.loads(files("shiftpred.reporting").joinpath("schemas", f"{name}.json").read_text(encoding="utf-8"))
