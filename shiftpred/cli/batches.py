"""Predict a stream of records batch by batch: flat memory, the order of the input, one bad record costs one row."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from itertools import islice

from shiftpred.errors import BundleError, InputError, SettingError
from shiftpred.records import MoleculePrediction, RecordFailure, Structure

__all__ = ["BATCH", "Tally", "iterate_outcomes"]

BATCH = 256


@dataclass
class Tally:
    """What became of the records."""

    records: int = 0
    failed: int = 0
    faults: int = 0
    """Of the failed, those that are a fault of ours."""


def iterate_outcomes(
    records: Iterable[Structure | RecordFailure],
    predict: Callable[[list[Structure]], list[MoleculePrediction]],
    tally: Tally,
    raise_faults: bool = False,
) -> Iterator[MoleculePrediction | RecordFailure]:
    """Predict every record that could be read.

    Parameters
    ----------
    records : iterable of Structure or RecordFailure
    predict : callable
        Predicts a list of structures.
    tally : Tally
        Counts are added to it.
    raise_faults : bool, default False
        Whether an unforeseen error stops the run; otherwise it becomes that record's failure and is counted.

    Yields
    ------
    MoleculePrediction or RecordFailure
        One a record, in order.

    Raises
    ------
    SettingError, BundleError
        What concerns all records stops the run.
    """
    source = iter(records)
    while batch := list(islice(source, BATCH)):
        structures = [record for record in batch if isinstance(record, Structure)]
        try:
            outcomes = iter(predict(structures) if structures else [])
        except (SettingError, BundleError):
            raise
        except Exception as error:
            if raise_faults and not isinstance(error, InputError):
                raise
            # Somebody in this batch cannot be predicted: find out who, and spare the others.
            outcomes = (_predict_alone(structure, predict, tally) for structure in structures)
        for record in batch:
            outcome = record if isinstance(record, RecordFailure) else next(outcomes)
            tally.records += 1
            tally.failed += isinstance(outcome, RecordFailure)
            yield outcome


def _predict_alone(structure: Structure, predict, tally: Tally) -> MoleculePrediction | RecordFailure:
    try:
        return predict([structure])[0]
    except InputError as error:
        return RecordFailure(structure.name, error)
    except (SettingError, BundleError):
        raise
    except Exception as error:
        tally.faults += 1
        return RecordFailure(structure.name, RuntimeError(f"a fault of ours: {type(error).__name__}: {error}"))
