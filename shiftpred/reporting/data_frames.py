"""Results as pandas data frames; pandas is loaded only when one is asked for."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from shiftpred.records import MoleculePrediction, RecordFailure
from shiftpred.reporting.prediction_rows import PREDICTION_COLUMNS, build_failure_row, build_prediction_rows

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["build_prediction_frame"]

_NUMBERS = ("shift_ppm", "lower_ppm", "upper_ppm", "coverage")
_COUNTS = ("atom", "attached_h")


def build_prediction_frame(predictions: Iterable[MoleculePrediction | RecordFailure]) -> pd.DataFrame:
    """Return one row a site and nucleus.

    Parameters
    ----------
    predictions : iterable of MoleculePrediction or RecordFailure

    Returns
    -------
    pandas.DataFrame
        Columns as `PREDICTION_COLUMNS`; counts are nullable integers, a record that failed has them missing.
    """
    import pandas as pd

    rows: list[dict] = []
    for entry in predictions:
        rows += [build_failure_row(entry)] if isinstance(entry, RecordFailure) else build_prediction_rows(entry)
    table = pd.DataFrame(rows, columns=list(PREDICTION_COLUMNS))
    for column in _NUMBERS:
        table[column] = pd.to_numeric(table[column], errors="coerce")
    for column in _COUNTS:
        table[column] = pd.to_numeric(table[column], errors="coerce").astype("Int64")
    return table
