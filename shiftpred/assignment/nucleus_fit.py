"""One structure against one peak list: the assignment, its probabilities and the log evidence."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from rdkit import Chem

from shiftpred.assignment.guests import Guest, GuestSet
from shiftpred.assignment.lines import Lines, Offer
from shiftpred.assignment.offset import compute_offset
from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.assignment.prepared_peaks import PreparedPeaks
from shiftpred.assignment.problem import Problem, ProblemBuilder, gather_guests
from shiftpred.assignment.second_set import assign_second_set, find_second_set_reason
from shiftpred.assignment.softening import compute_evidence
from shiftpred.assignment.units import Units

__all__ = ["NucleusFit", "assign_nucleus"]

_MOST_IMPURITIES = 3
_EXCUSED_FROM = 0.3
"""Chance of being missing from which a missing unit is not counted against a structure."""
_ANCHORED_PRIOR = 3.0
"""How much wider the prior of the offset is where a solvent line fixes it: such a list may be off by any amount."""


@dataclass(frozen=True)
class NucleusFit:
    """How one structure explains one peak list. n units of the structure, then the guests; m columns."""

    units: Units
    lines: Lines
    guests: tuple[Guest, ...]
    columns: tuple[Offer, ...]
    """What a unit can take: every single line that is not part of a split carbon, and every split carbon."""
    chosen: np.ndarray
    """(n + guests,) column of each, -1: none."""
    sharing: np.ndarray
    """(n + guests,) column that a unit without a line of its own shares with another, -1: none, so it is missing."""
    probability: np.ndarray
    """(n + guests, m) probability that the column belongs to the unit."""
    offset_ppm: float
    anchored: bool
    """True where a listed solvent line fixed the offset."""
    log_evidence: float
    """Log density of the list under the structure, summed over assignments."""
    leftover: tuple[int, ...]
    """Lines that nothing takes."""
    second_set: tuple[tuple[int, int], ...]
    """(line, unit): lines of a second, weaker set (rotamer, diastereomer, …); they are not among `leftover`."""
    impurities: tuple[str, ...]
    """Names of the coherent sets that were found."""
    missing_notes: tuple[str, ...]
    """(n,) what may excuse each unit, should it be missing."""
    has_line: np.ndarray
    """(n,) bool: a line of its own, or one that it shares."""
    z: np.ndarray
    """(n,) observed minus predicted, after the offset, in units of the error scale; to the nearer end of a range; 0 where no
    line is."""
    missing: tuple[int, ...]
    """Units without a line."""
    unexcused: int
    """How many of these nothing excuses."""

    def get_column(self, unit: int) -> int:
        """Return the column that a unit has or shares, -1: none."""
        return int(self.chosen[unit] if self.chosen[unit] >= 0 else self.sharing[unit])


def assign_nucleus(
    units: Units, peaks: PreparedPeaks, others: dict | None = None, pair_share: float = 1.0, expected: tuple[GuestSet, ...] = ()
) -> NucleusFit:
    """Assign one peak list to the units of one structure.

    Parameters
    ----------
    units : Units
    peaks : PreparedPeaks
    others : dict, optional
        Atom index → (shift, scale, degrees) of the other nucleus, for C-H pairs.
    pair_share : float
        Share of the pairs' evidence that counts here.
    expected : tuple of GuestSet
        What the user expects beside the structure.

    Returns
    -------
    NucleusFit
    """
    builder = ProblemBuilder(units, peaks, others, pair_share)
    always, offset, anchored = (*peaks.always, *expected), 0.0, False
    guests = gather_guests(*always)
    problem = builder.build(offset, guests)
    for _ in range(2):
        chosen, total = problem.solve()
        offset, anchored = _estimate_offset(units, guests, problem, chosen, offset)
        problem = builder.build(offset, guests)
    chosen, total = problem.solve()
    accepted: list[GuestSet] = []
    candidates = _leave_out_itself(units.mol, peaks.impurities)
    while candidates and len(accepted) < _MOST_IMPURITIES:
        better = None
        for candidate in candidates:
            found = _try_impurity(builder, offset, gather_guests(*always, *accepted), candidate)
            if found is not None and found[0] > (better or (total,))[0] + 1e-9:
                better = (*found, candidate)
        if better is None:
            break
        total, problem, chosen, candidate = better
        accepted.append(candidate)
        candidates.remove(candidate)
    problem, chosen = problem.keep_used_columns(chosen)
    probability, evidence = compute_evidence(problem, chosen, units)
    evidence += sum(s.log_prior for s in accepted)
    if not anchored:
        evidence -= 0.5 * (offset / PARAMETERS[units.nucleus].reference_prior_ppm) ** 2
    return _describe(
        units, peaks, gather_guests(*always, *accepted), accepted, problem, chosen, probability, evidence, offset, anchored
    )  # fmt: skip


def _leave_out_itself(mol: Chem.Mol, impurities: tuple[GuestSet, ...]) -> list[GuestSet]:
    if not impurities:
        return []
    own = set(Chem.MolToSmiles(mol, isomericSmiles=False).split("."))
    return [s for s in impurities if s.smiles not in own]


def _try_impurity(builder, offset, guests, candidate):
    """Return (log weight, problem, chosen) with the candidate's lines allowed; None unless all of them are there."""
    problem = builder.build(offset, (*guests, *candidate.guests))
    chosen, total = problem.solve()
    begin = len(chosen) - len(candidate.guests)
    if candidate.coherent and not all(_is_found(problem, chosen, k) for k in range(begin, len(chosen))):
        return None
    return total + candidate.log_prior, problem, chosen


def _is_found(problem: Problem, chosen: np.ndarray, row: int) -> bool:
    """Say whether a row has a line of its own, or one within resolution that something else has."""
    if chosen[row] >= 0:
        return True
    return problem.weight[row].max(initial=-np.inf) > math.log(0.25 / problem.resolution_ppm) - 2.0


def _estimate_offset(units, guests, problem, chosen, offset) -> tuple[float, bool]:
    """Return the offset that the assigned lines suggest, and whether a solvent line fixes it."""
    parameters, n = PARAMETERS[units.nucleus], len(units)
    place = np.array([(g.shift, g.scale, g.degrees) for g in guests]).reshape(-1, 3).T
    shift, scale, degrees = np.concatenate([np.stack([units.shift, units.scale, units.degrees]), place], axis=1)
    usable = chosen >= 0
    usable[:n] &= ~units.labile
    usable[n:] &= scale[n:] <= 2 * parameters.solvent_scale_ppm
    if not usable.any():
        return 0.0, False
    observed = np.array([problem.columns[c].centre_ppm for c in chosen[usable]])
    anchored = any(g.anchor for g, used in zip(guests, usable[n:]) if used)
    prior = parameters.reference_prior_ppm * (_ANCHORED_PRIOR if anchored else 1.0)
    return compute_offset(observed - shift[usable], scale[usable], degrees[usable], prior, offset), anchored


def _describe(units, peaks, guests, accepted, problem, chosen, probability, evidence, offset, anchored) -> NucleusFit:
    n, lines = len(units), peaks.lines
    users = np.bincount(chosen[chosen >= 0], minlength=len(problem.columns))
    sharing = _find_sharing(units, problem, chosen, users)
    column = np.where(chosen >= 0, chosen, sharing)[:n]
    has_line = column >= 0
    observed = np.array([problem.columns[c].centre_ppm if c >= 0 else np.nan for c in column], dtype=float)
    leftover = tuple(sorted(j for c, o in enumerate(problem.columns) if users[c] == 0 for j in o.lines))
    second: tuple[tuple[int, int], ...] = ()
    if len(leftover) > 1 and find_second_set_reason(units.mol):
        rest = list(leftover)
        pairs, gain = assign_second_set(units.nucleus, lines.shift[rest], lines.extra[rest], observed)
        second = tuple((leftover[i], k) for i, k in pairs)
        evidence += gain
        leftover = tuple(j for j in leftover if j not in {line for line, _ in second})
    missing = tuple(int(k) for k in np.flatnonzero(~has_line))
    notes = _explain_missing(units, peaks)
    return NucleusFit(
        units=units,
        lines=lines,
        guests=guests,
        columns=problem.columns,
        chosen=chosen,
        sharing=sharing,
        probability=probability,
        offset_ppm=offset,
        anchored=anchored,
        log_evidence=float(evidence),
        leftover=leftover,
        second_set=second,
        impurities=tuple(s.name for s in accepted),
        missing_notes=notes,
        has_line=has_line,
        z=_compute_deviations(units, lines, problem, column, offset),
        missing=missing,
        unexcused=sum(math.exp(problem.absent[k]) < _EXCUSED_FROM for k in missing),
    )


def _compute_deviations(units, lines, problem, column, offset) -> np.ndarray:
    """Return (n,) deviations in units of the error scale; inside a range there is none."""
    z = np.zeros(len(units))
    for k in np.flatnonzero(column >= 0):
        offer = problem.columns[column[k]]
        expected = units.shift[k] + offset
        if len(offer.lines) == 1 and lines.is_range[offer.lines[0]]:
            observed = min(max(expected, lines.lower[offer.lines[0]]), lines.upper[offer.lines[0]])
        else:
            observed = offer.centre_ppm
        z[k] = (observed - expected) / units.scale[k]
    return z


def _explain_missing(units, peaks) -> tuple[str, ...]:
    notes = list(units.missing_note)
    if peaks.hiding is not None and len(units):
        for k, hidden in enumerate(peaks.compute_hidden(units)):
            if hidden > 0.15:
                notes[k] = "; ".join(filter(None, (notes[k], "may lie under the solvent line")))
    return tuple(notes)


def _find_sharing(units: Units, problem: Problem, chosen: np.ndarray, users: np.ndarray) -> np.ndarray:
    """A unit without a line of its own shares one if that is likelier than being missing."""
    sharing = np.full(len(chosen), -1)
    taken = np.flatnonzero(users)
    if not len(taken):
        return sharing
    for k in np.flatnonzero(chosen < 0):
        if k < len(units) and units.partner[k] >= 0:
            column = chosen[units.partner[k]]
            near = column >= 0 and problem.weight[k, column] > problem.weight[k].max() - 6.0
            if near and math.log(units.together[k]) > problem.absent[k]:
                sharing[k] = column
                continue
        values = problem.weight[k, taken]
        best = int(np.argmax(values))
        if values[best] + math.log(problem.resolution_ppm) > problem.absent[k]:
            sharing[k] = taken[best]
    return sharing
