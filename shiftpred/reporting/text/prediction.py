"""Predictions as aligned text, one block a molecule."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from shiftpred.records import MoleculePrediction, NucleusPrediction, RecordFailure
from shiftpred.reporting.prediction_rows import build_molecule_notes
from shiftpred.reporting.text.layout import clean_text, render_columns, render_points
from shiftpred.reporting.wording import format_atoms, format_interval, format_shift, format_site

__all__ = [
    "iterate_prediction_table",
    "merge_equivalent",
    "render_failure_block",
    "render_prediction_block",
    "render_prediction_table",
]


def render_prediction_table(predictions: Iterable[MoleculePrediction | RecordFailure]) -> str:
    """Show predictions as text, one block a molecule.

    Parameters
    ----------
    predictions : iterable of MoleculePrediction or RecordFailure

    Returns
    -------
    str
        Blocks with an empty line between them; equivalent atoms share one row.
    """
    return "".join(iterate_prediction_table(predictions))


def iterate_prediction_table(predictions: Iterable[MoleculePrediction | RecordFailure]) -> Iterator[str]:
    """Return the text block by block, so that memory stays flat."""
    separator = ""
    for p in predictions:
        yield separator + (render_failure_block(p) if isinstance(p, RecordFailure) else render_prediction_block(p))
        separator = "\n"


def render_failure_block(failure: RecordFailure) -> str:
    """Return the block of a record that could not be read."""
    return f"{clean_text(failure.name)}   not predicted: {clean_text(str(failure.error))}\n"


def render_prediction_block(prediction: MoleculePrediction) -> str:
    """Return the block of one molecule: a title line, one row a set of equivalent nuclei, notes."""
    structure = prediction.structure
    parts = [structure.name, structure.smiles, f"model {prediction.model}"]
    if prediction.solvent:
        parts.append(f"in {prediction.solvent}")
    lines = [clean_text("   ".join(parts))]
    rows = [_build_row(n) for n in merge_equivalent(prediction.nuclei)]
    if rows:
        coverage = f"interval {100 * prediction.nuclei[0].coverage:g} %"
        lines += render_columns(("nucleus", "atoms", "site", "shift/ppm", coverage, "environment", "note"), rows, "llrrrll")
    else:
        lines.append("  nothing to predict: no carbon or hydrogen of the kind that was asked for")
    lines += render_points(build_molecule_notes(prediction))
    return "\n".join(lines) + "\n"


def merge_equivalent(nuclei: Iterable[NucleusPrediction]) -> list[NucleusPrediction]:
    """Keep one row of each set of equivalent nuclei: its first."""
    kept, seen = [], set()
    for nucleus in nuclei:
        key = (nucleus.nucleus, min(nucleus.equivalent_atoms, default=nucleus.atom), nucleus.hydrogen)
        if key not in seen:
            seen.add(key)
            kept.append(nucleus)
    return kept


def _build_row(nucleus: NucleusPrediction) -> tuple[str, ...]:
    return (
        nucleus.nucleus,
        format_atoms(list(nucleus.equivalent_atoms), nucleus.hydrogen),
        format_site(nucleus.nucleus, nucleus.attached_h, len(nucleus.equivalent_atoms), nucleus.hydrogen),
        format_shift(nucleus.shift_ppm, nucleus.nucleus),
        _format_bounds(nucleus),
        nucleus.environment,
        nucleus.note,
    )


def _format_bounds(nucleus: NucleusPrediction) -> str:
    ends = (nucleus.lower_ppm, nucleus.upper_ppm)
    return format_interval(*(None if abs(end) == float("inf") else end for end in ends), nucleus.nucleus)
