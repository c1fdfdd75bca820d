"""One row a site and nucleus: the columns of `predict --format csv` and of `shiftpred.predict`'s DataFrame."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Iterator
from io import StringIO

from shiftpred.records import MoleculePrediction, RecordFailure

__all__ = [
    "PREDICTION_COLUMNS",
    "build_failure_row",
    "build_molecule_notes",
    "build_prediction_rows",
    "iterate_prediction_csv",
    "render_prediction_csv",
]

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


def build_molecule_notes(prediction: MoleculePrediction) -> list[str]:
    """Return what was noticed about the molecule as a whole, each note once."""
    return list(dict.fromkeys((*prediction.structure.notes, *prediction.notes)))


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
    return [dict(zip(PREDICTION_COLUMNS, cells, strict=True)) for cells in _build_cells(prediction)]


def build_failure_row(failure: RecordFailure) -> dict:
    """Return the row of a record that could not be read: only `molecule` and `note` are filled."""
    return dict(zip(PREDICTION_COLUMNS, _build_failure_cells(failure), strict=True))


def iterate_prediction_csv(predictions: Iterable[MoleculePrediction | RecordFailure]) -> Iterator[str]:
    """Return the CSV piece by piece, so that memory stays flat over any number of molecules.

    Parameters
    ----------
    predictions : iterable of MoleculePrediction or RecordFailure

    Yields
    ------
    str
        The line of column names, then the rows of one record at a time.
    """
    stream = StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(PREDICTION_COLUMNS)
    yield stream.getvalue()
    for entry in predictions:
        stream.seek(0)
        stream.truncate()
        writer.writerows([_build_failure_cells(entry)] if isinstance(entry, RecordFailure) else _build_cells(entry))
        yield stream.getvalue()


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
    return "".join(iterate_prediction_csv(predictions))


def _build_cells(prediction: MoleculePrediction) -> list[tuple]:
    name, common = prediction.structure.name, build_molecule_notes(prediction)
    if not prediction.nuclei:
        nothing = "nothing to predict: no carbon or hydrogen of the kind that was asked for"
        return [_build_empty_cells(name, "; ".join((*common, nothing)))]
    shared = "; ".join(common)
    return [
        (
            name,
            nucleus.atom,
            nucleus.nucleus,
            nucleus.hydrogen,
            nucleus.attached_h,
            ";".join(map(str, nucleus.equivalent_atoms)),
            nucleus.shift_ppm,
            nucleus.lower_ppm,
            nucleus.upper_ppm,
            nucleus.coverage,
            nucleus.environment,
            f"{nucleus.note}; {shared}" if nucleus.note and shared else nucleus.note or shared,
        )
        for nucleus in prediction.nuclei
    ]


def _build_failure_cells(failure: RecordFailure) -> tuple:
    return _build_empty_cells(failure.name, " ".join(str(failure.error).split()))


def _build_empty_cells(name: str, note: str) -> tuple:
    return (name, *[""] * (len(PREDICTION_COLUMNS) - 2), note)
