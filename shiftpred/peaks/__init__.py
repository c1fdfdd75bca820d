"""Read peak lists; solvent and impurity lines."""

from shiftpred.peaks.impurities import find_known_set, impurity_sets, name_leftovers
from shiftpred.peaks.multiplets import group_multiplets, looks_line_by_line, pair_doublets, require_grouped
from shiftpred.peaks.reading import PeakListError, parse_peaks
from shiftpred.peaks.rendering import render_journal_text
from shiftpred.peaks.solvents import (
    is_deuterated_exchange,
    normalise_solvent,
    reference_line,
    solvent_lines,
    water_line,
)

__all__ = [
    "PeakListError",
    "find_known_set",
    "group_multiplets",
    "impurity_sets",
    "is_deuterated_exchange",
    "looks_line_by_line",
    "name_leftovers",
    "normalise_solvent",
    "pair_doublets",
    "parse_peaks",
    "reference_line",
    "render_journal_text",
    "require_grouped",
    "solvent_lines",
    "water_line",
]
