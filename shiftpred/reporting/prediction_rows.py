"""One row a site and nucleus: the columns of `predict --format csv` and of `shiftpred.predict`'s DataFrame."""

from __future__ import annotations

import csv
from collections.abc import Iterable
from io import StringIO
from typing import TextIO

from shiftpred.records import MoleculePrediction, RecordFailure
from shiftpred.reporting.summaries.common import build_molecule_notes

__all__ = ["PREDICTION_COLUMNS", "build_failure_row", "build_prediction_rows", "render_prediction_csv", "write_rows"]

PREDICTION_COLUMNS = (
    "molecule",
    "atom",
    "nucleus",
    "hydrogen",
    "attached_h",
    "equivalent_atoms",
    "shift_ppm",
    "lower_ppm",
    "upper_ppm",
    "coverage",
    "environment",
    "note",
)


def build_prediction_rows(prediction: MoleculePrediction) -> list[dict]:
    """Turn one prediction into rows.

    Parameters
    ----------
    prediction : MoleculePrediction

    Returns
    -------
    list of dict
        One a site and nucleus with the keys of `PREDICTION_COLUMNS`; `equivalent_atoms` is a `;`-separated text; notes on
        the molecule as a whole are repeated in every row's `note`. A molecule without a nucleus to predict gives one
        row with only `molecule` and `note` filled.
    """
    name, common = prediction.structure.name, build_molecule_notes(prediction)
    if not prediction.nuclei:
        note = "; ".join((*common, "nothing to predict: no carbon or hydrogen of the kind that was asked for"))
        return [_build_empty_row(name, note)]
    return [
        {
            "molecule": name,
            "atom": nucleus.atom,
            "nucleus": nucleus.nucleus,
            "hydrogen": nucleus.hydrogen,
            "attached_h": nucleus.attached_h,
            "equivalent_atoms": ";".join(map(str, nucleus.equivalent_atoms)),
            "shift_ppm": nucleus.shift_ppm,
            "lower_ppm": nucleus.lower_ppm,
            "upper_ppm": nucleus.upper_ppm,
            "coverage": nucleus.coverage,
            "environment": nucleus.environment,
            "note": "; ".join(part for part in (nucleus.note, *common) if part),
        }
        for nucleus in prediction.nuclei
    ]


def build_failure_row(failure: RecordFailure) -> dict:
    """Return the row of a record that could not be read: only `molecule` and `note` are filled."""
    return _build_empty_row(failure.name, " ".join(str(failure.error).split()))


def _build_empty_row(name: str, note: str) -> dict:
    return dict.fromkeys(PREDICTION_COLUMNS, "") | {"molecule": name, "note": note}


def write_rows(stream: TextIO, rows: Iterable[dict], heading: bool = False) -> None:
    """Append rows to a CSV stream, after the line of column names where `heading` is set."""
    writer = csv.DictWriter(stream, PREDICTION_COLUMNS, lineterminator="\n")
    if heading:
        writer.writeheader()
    writer.writerows(rows)


def render_prediction_csv(predictions: Iterable[MoleculePrediction | RecordFailure]) -> str:
    """Return predictions as CSV text with the contract's columns.

    Parameters
    ----------
    predictions : iterable of MoleculePrediction or RecordFailure

    Returns
    -------
    str
        A line of column names, then one line a row; shifts in ppm as the prediction carries them.
    """
    stream = StringIO()
    write_rows(stream, (), heading=True)
    for entry in predictions:
        write_rows(stream, [build_failure_row(entry)] if isinstance(entry, RecordFailure) else build_prediction_rows(entry))
    return stream.getvalue()
