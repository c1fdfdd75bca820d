"""A file that brings peaks and an assignment of its own: which lists are used, and what the comparison says about it."""

from __future__ import annotations

from dataclasses import replace

from shiftpred.assignment.check_given_assignment import check_given_assignment
from shiftpred.peaks.nmredata import NmredataRecord
from shiftpred.records import Comparison

__all__ = ["add_given_assignment", "choose_lists"]

_MOST_PROBLEMS = 20


def choose_lists(given: NmredataRecord | None, c13, h1) -> tuple:
    """Return the 13C and 1H lists: those that were given beside the file, else those that it holds."""
    if given is None or c13 is not None or h1 is not None:
        return c13, h1
    return given.build_peak_list("13C"), given.build_peak_list("1H")


def add_given_assignment(comparison: Comparison, given: NmredataRecord | None) -> Comparison:
    """Add what is wrong with the file's own assignment to the reasons, and what is malformed in the file to the cautions."""
    if given is None:
        return comparison
    exchanged = check_given_assignment(comparison.prediction, given, comparison.reference_offset_ppm)
    assigned = sum(bool(s.atoms) and s.shift_ppm is not None for s in given.signals)
    step = f"the file's own assignment: {assigned} labels with shift and atoms, {len(exchanged)} pairs look exchanged"
    problems = [str(p) for p in given.problems[:_MOST_PROBLEMS]]
    if len(given.problems) > _MOST_PROBLEMS:
        problems.append(f"{len(given.problems) - _MOST_PROBLEMS} more problems in the file")
    return replace(
        comparison,
        reasons=(*comparison.reasons[:1], *exchanged, *comparison.reasons[1:]),
        cautions=(*comparison.cautions, *problems, *given.notes),
        steps=(*comparison.steps, step),
    )
