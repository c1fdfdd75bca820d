"""From a fit to the records that a report prints: assignments, leftovers, missing nuclei, balance."""

from __future__ import annotations

import numpy as np

from shiftpred.assignment.nucleus_fit import NucleusFit
from shiftpred.assignment.second_set import find_second_set_reason
from shiftpred.assignment.structure_fit import StructureFit
from shiftpred.records import Assignment, Balance, Missing, NucleusPrediction, Unexplained

__all__ = ["build_assignments", "build_balance", "build_missing", "build_unexplained"]

_INTERCHANGEABLE_FROM = 0.15
"""Probability from which another unit counts as one that could as well have the line."""
_PATTERN_WORDS = {"d": "doublet", "t": "triplet", "q": "quartet", "dd": "doublet of doublets"}


def build_assignments(fit: StructureFit) -> tuple[Assignment, ...]:
    """Return every pairing of an observed line with a set of equivalent nuclei, in the order of the predicted rows."""
    out = []
    for nucleus_fit in fit.nuclei.values():
        for k in range(len(nucleus_fit.units)):
            column = int(nucleus_fit.chosen[k])
            shared = column < 0
            if shared:
                column = int(nucleus_fit.sharing[k])
            if column >= 0:
                out.append(_build_assignment(fit, nucleus_fit, k, column, shared))
    return tuple(out)


def _build_assignment(fit, nucleus_fit: NucleusFit, k: int, column: int, shared: bool) -> Assignment:
    units, lines, offer = nucleus_fit.units, nucleus_fit.lines, nucleus_fit.columns[column]
    row: NucleusPrediction = units.rows[k]
    line = offer.lines[0]
    lower_line, upper_line = lines.lower[line], lines.upper[line]
    observed = offer.centre_ppm
    corrected = observed - nucleus_fit.offset_ppm
    low, high = row.lower_ppm, row.upper_ppm
    if len(offer.lines) == 1 and lines.is_range[line]:
        # A range holds its hydrogens anywhere: the deviation is the distance to its nearer end.
        inside = lower_line - nucleus_fit.offset_ppm <= high and upper_line - nucleus_fit.offset_ppm >= low
        nearest = min(max(units.shift[k] + nucleus_fit.offset_ppm, lower_line), upper_line)
        deviation = nearest - nucleus_fit.offset_ppm - units.shift[k]
    else:
        inside = low <= corrected <= high
        deviation = corrected - units.shift[k]
    probability = float(nucleus_fit.probability[k, column])
    if shared:
        probability = max(probability, float(1 - nucleus_fit.probability[k].sum()) * _share_of(nucleus_fit, k, column))
    notes = _build_notes(nucleus_fit, k, column, shared, deviation)
    own = tuple(int(a) for a in lines.peaks[line].assignment)
    if own and row.atom not in own and not set(own) & set(row.equivalent_atoms):
        notes.append(f"assigned by hand to atom {', '.join(map(str, own))}")
    return Assignment(
        row.nucleus,
        row.atom,
        row.equivalent_atoms,
        row.hydrogen,
        row.attached_h,
        row.shift_ppm,
        low,
        high,
        round(float(observed), 4),
        round(float(deviation), 4),
        bool(inside),
        round(min(max(probability, 0.0), 1.0), 3),
        _find_interchangeable(nucleus_fit, k, column),
        int(line),
        "; ".join(notes),
    )


def _share_of(nucleus_fit, k, column) -> float:
    """Share of one column in the chance that a unit shares some line."""
    units, offer = nucleus_fit.units, nucleus_fit.columns
    centre = np.array([o.centre_ppm for o in offer])
    z = (centre - nucleus_fit.offset_ppm - units.shift[k]) / units.scale[k]
    weight = (1 + z * z / units.degrees[k]) ** (-(units.degrees[k] + 1) / 2)
    return float(weight[column] / max(weight.sum(), 1e-300))


def _build_notes(nucleus_fit, k, column, shared, deviation) -> list[str]:
    units, lines, offer = nucleus_fit.units, nucleus_fit.lines, nucleus_fit.columns[column]
    notes = []
    if len(offer.lines) > 1:
        shifts = ", ".join(f"{lines.shift[j]:g}" for j in sorted(offer.lines, key=lambda j: -lines.shift[j]))
        element = {"F": "fluorine", "P": "phosphorus"}[units.couplings[k][0].element]
        notes.append(f"{_PATTERN_WORDS[offer.pattern]} by {element}: lines {shifts}")
    together = [
        i
        for i in range(len(units))
        if i != k and column in (nucleus_fit.chosen[i], nucleus_fit.sharing[i] if nucleus_fit.chosen[i] < 0 else -1)
    ]
    if together:
        numbers = ", ".join(str(units.rows[i].atom) + units.rows[i].hydrogen for i in together)
        notes.append(f"one line with atom {numbers}")
    if units.labile[k]:
        notes.append("labile: place not predictable")
    if units.rows[k].note:
        notes.append(units.rows[k].note)
    return notes


def _find_interchangeable(nucleus_fit, k, column) -> tuple[int, ...]:
    """Return the user's numbers of atoms of other units that could as well have this line."""
    units, n = nucleus_fit.units, len(nucleus_fit.units)
    likely = set(np.flatnonzero(nucleus_fit.probability[:n, column] >= _INTERCHANGEABLE_FROM).tolist())
    if units.labile[k]:
        # Their places are not predictable, so any two labile hydrogens may have each other's lines.
        likely |= set(np.flatnonzero(units.labile & (nucleus_fit.chosen[:n] >= 0)).tolist())
    own = set(units.rows[k].equivalent_atoms)
    numbers: list[int] = []
    for i in sorted(likely):
        if i != k and not _on_column(nucleus_fit, i, column):
            numbers += [a for a in units.rows[i].equivalent_atoms if a not in own and a not in numbers]
    return tuple(sorted(numbers))


def _on_column(nucleus_fit, i, column) -> bool:
    return column in (nucleus_fit.chosen[i], nucleus_fit.sharing[i])


def build_unexplained(fit: StructureFit) -> tuple[Unexplained, ...]:
    """Return the lines that no nucleus of the structure takes: solvent, water, impurities, and what remains unknown."""
    out = []
    for nucleus, nucleus_fit in fit.nuclei.items():
        n, found = len(nucleus_fit.units), []
        for g, guest in enumerate(nucleus_fit.guests):
            column = int(nucleus_fit.chosen[n + g])
            if column >= 0:
                line = nucleus_fit.columns[column].lines[0]
                found.append((line, guest.name, ""))
        found += [(line, None, "") for line in nucleus_fit.leftover]
        for line, k in nucleus_fit.second_set:
            row = nucleus_fit.units.rows[k]
            reason = find_second_set_reason(nucleus_fit.units.mol)
            found.append((line, f"second set: {reason}", f"beside the line of atom {row.atom}{row.hydrogen}"))
        for line, likely, note in sorted(found, key=lambda f: f[0]):
            out.append(Unexplained(nucleus, float(nucleus_fit.lines.shift[line]), likely, note))
    return tuple(out)


def build_missing(fit: StructureFit) -> tuple[Missing, ...]:
    """Return the nuclei without an observed line, with what may excuse each."""
    out = []
    for nucleus_fit in fit.nuclei.values():
        for k, row in enumerate(nucleus_fit.units.rows):
            if nucleus_fit.chosen[k] < 0 and nucleus_fit.sharing[k] < 0:
                out.append(
                    Missing(
                        row.nucleus,
                        row.atom,
                        row.equivalent_atoms,
                        row.hydrogen,
                        row.attached_h,
                        row.shift_ppm,
                        row.lower_ppm,
                        row.upper_ppm,
                        nucleus_fit.missing_notes[k],
                    )
                )
    return tuple(out)


def build_balance(fit: StructureFit) -> tuple[Balance, ...]:
    """Count expected, found, missing and surplus carbons and hydrogens.

    Hydrogens are counted by stated integrals where the list has them; a line without one counts as the nuclei on it.
    """
    out = []
    for nucleus, f in fit.nuclei.items():
        units, n = f.units, len(f.units)
        column = np.where(f.chosen >= 0, f.chosen, f.sharing)[:n]
        expected = float(units.count[~units.labile].sum())
        labile = float(units.count[units.labile].sum())
        missing = float(units.count[(column < 0) & ~units.labile].sum())
        found, excess = float(units.count[column >= 0].sum()), 0.0
        for c, offer in enumerate(f.columns):
            stated = f.lines.count[offer.lines[0]] if len(offer.lines) == 1 else np.nan
            load = float(units.count[column == c].sum())
            by_guest = any(x == c for x in f.chosen[n:])
            if np.isnan(stated):
                if load == 0 and not by_guest:
                    excess += len(offer.lines) and 1.0
            elif not by_guest:
                found += min(stated, load) - load
                missing += max(0.0, load - stated)
                excess += max(0.0, stated - load)
        out.append(Balance(nucleus, expected, found, missing, excess, labile))
    return tuple(out)
