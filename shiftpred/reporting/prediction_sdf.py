"""`predict --format sdf`: structures with their shifts as properties."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from shiftpred.records import MoleculePrediction, NucleusPrediction, RecordFailure
from shiftpred.reporting.molfiles import render_molfile, render_sdf_property
from shiftpred.reporting.prediction_rows import build_molecule_notes

__all__ = ["iterate_prediction_sdf"]

_DIGITS = {"13C": 2, "1H": 3}
_COLUMNS = "atom hydrogen shift_ppm lower_ppm upper_ppm equivalent_atoms"
_EMPTY = "{title}\n  shiftpred\n\n  0  0  0  0  0  0  0  0  0  0999 V2000\nM  END\n"


def iterate_prediction_sdf(predictions: Iterable[MoleculePrediction | RecordFailure]) -> Iterator[str]:
    """Return an SDF piece by piece.

    Parameters
    ----------
    predictions : iterable of MoleculePrediction or RecordFailure

    Yields
    ------
    str
        One record at a time: the molfile with the user's own atom numbers, then properties `SHIFTS_13C` and `SHIFTS_1H` with a line
        of column names and one line a site (`-` for a hydrogen without a letter), `COVERAGE`, `SOLVENT`, `MODEL` and `NOTE`. A record
        that could not be read is an empty molfile with only `NOTE`.
    """
    for entry in predictions:
        if isinstance(entry, RecordFailure):
            title = " ".join(str(entry.name).split())[:80].lstrip("$>")
            yield _EMPTY.format(title=title) + render_sdf_property("NOTE", [str(entry.error)]) + "$$$$\n"
        else:
            yield _render_record(entry)


def _render_record(prediction: MoleculePrediction) -> str:
    parts = [render_molfile(prediction.structure)]
    for nucleus in _DIGITS:
        rows = [n for n in prediction.nuclei if n.nucleus == nucleus]
        if rows:
            parts.append(render_sdf_property(f"SHIFTS_{nucleus}", [_COLUMNS, *map(_render_row, rows)]))
    if prediction.nuclei:
        parts.append(render_sdf_property("COVERAGE", [f"{prediction.nuclei[0].coverage:g}"]))
    if prediction.solvent:
        parts.append(render_sdf_property("SOLVENT", [prediction.solvent]))
    parts.append(render_sdf_property("MODEL", [prediction.model]))
    notes = build_molecule_notes(prediction)
    notes += [f"{n.nucleus} {n.atom}{n.hydrogen}: {n.note}" for n in prediction.nuclei if n.note]
    if notes:
        parts.append(render_sdf_property("NOTE", notes))
    return "".join(parts) + "$$$$\n"


def _render_row(row: NucleusPrediction) -> str:
    digits = _DIGITS[row.nucleus]
    shifts = " ".join(f"{value:.{digits}f}" for value in (row.shift_ppm, row.lower_ppm, row.upper_ppm))
    return f"{row.atom} {row.hydrogen or '-'} {shifts} {';'.join(map(str, row.equivalent_atoms))}"
