"""One structure against one peak list: the assignment, its probabilities and the log evidence."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from rdkit import Chem

from shiftpred.assignment.guests import Guest, GuestSet
from shiftpred.assignment.lines import Lines, Offer, build_offers
from shiftpred.assignment.offset import compute_offset
from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.assignment.prepared_peaks import PreparedPeaks
from shiftpred.assignment.second_set import assign_second_set, find_second_set_reason
from shiftpred.assignment.soft import compute_soft_assignment
from shiftpred.assignment.solver import CountPenalty, improve_with_counts, solve_assignment
from shiftpred.assignment.units import Units
from shiftpred.assignment.weights import compute_line_weights, compute_log_student, compute_offer_weights

__all__ = ["NucleusFit", "assign_nucleus"]

_NEVER = -60.0
_MOST_IMPURITIES = 3
_GUEST_ON_STATED = 2.0
"""Log penalty of a solvent or impurity on a range, on a split line, or on one stated to hold several nuclei."""


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
    terms: dict = field(default_factory=dict)
    """Parts of the evidence: 'missing', 'extra' (log weights), counts, standardised residuals."""


@dataclass
class _Problem:
    """The arrays of one round."""

    weight: np.ndarray
    without: np.ndarray
    """Log chance of a unit without a line of its own: missing, or sharing one by chance or by symmetry."""
    absent: np.ndarray
    """Log chance of a unit that is missing altogether."""
    leftover: np.ndarray
    columns: list[Offer]
    count: np.ndarray
    stated: np.ndarray

    @property
    def gain(self) -> np.ndarray:
        return self.weight - self.without[:, None] - self.leftover[None, :]


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
    parameters = PARAMETERS[units.nucleus]
    lines = peaks.lines
    patterns = _list_patterns(units)
    offers = build_offers(lines, min(peaks.carbon_frequencies), patterns) if patterns else []
    always = (*peaks.always, *expected)
    offset, anchored = 0.0, False
    accepted: list[GuestSet] = []
    guests = _gather(always, accepted)
    for _ in range(2):
        problem = _build_problem(units, lines, offers, guests, offset, others, pair_share, peaks)
        chosen, total = _solve(problem, parameters.resolution_ppm)
        offset, anchored = _update_offset(units, guests, problem, chosen, offset, parameters)
    candidates = _leave_out_itself(units.mol, peaks.impurities)
    problem = _build_problem(units, lines, offers, guests, offset, others, pair_share, peaks)
    chosen, total = _solve(problem, parameters.resolution_ppm)
    while candidates and len(accepted) < _MOST_IMPURITIES:
        best = None
        for candidate in candidates:
            tried = _gather(always, [*accepted, candidate])
            trial = _build_problem(units, lines, offers, tried, offset, others, pair_share, peaks)
            found, value = _solve(trial, parameters.resolution_ppm)
            value += candidate.log_prior
            if not _all_found(trial, found, len(trial.without) - len(candidate.guests), parameters.resolution_ppm):
                continue
            if value > total + 1e-9 and (best is None or value > best[0] + 1e-9):
                best = (value, candidate, tried, trial, found)
        if best is None:
            break
        total, candidate, guests, problem, chosen = best
        accepted.append(candidate)
        candidates.remove(candidate)
    problem, chosen = _keep_chosen_offers(problem, chosen, len(lines))
    return _finish(units, lines, guests, problem, chosen, offset, anchored, accepted, peaks, parameters)


def _leave_out_itself(mol, impurities) -> list[GuestSet]:
    if not impurities:
        return []
    own = set(Chem.MolToSmiles(mol, isomericSmiles=False).split("."))
    return [s for s in impurities if s.smiles not in own]


def _gather(always, accepted) -> tuple[Guest, ...]:
    return tuple(g for group in (*always, *accepted) for g in group.guests)


def _list_patterns(units: Units) -> frozenset[str]:
    found = set()
    for couplings in units.couplings:
        found |= {{1: "d", 2: "t", 3: "q"}.get(c.nuclei, "") for c in couplings}
        if sum(c.nuclei == 1 for c in couplings) > 1:
            found.add("dd")
    return frozenset(found - {""})


def _build_problem(units, lines, offers, guests, offset, others, pair_share, peaks) -> _Problem:
    parameters = PARAMETERS[units.nucleus]
    own = compute_line_weights(units, lines, offset, others, pair_share)
    if offers:
        own = np.concatenate([own, compute_offer_weights(units, offers, offset, peaks.carbon_frequencies)], axis=1)
    m = len(lines)
    foreign = np.full((len(guests), own.shape[1]), -np.inf)
    missing, together = units.missing, units.together
    if guests:
        shift = np.array([g.shift for g in guests])[:, None]
        scale = np.array([g.scale for g in guests])[:, None]
        degrees = np.array([g.degrees for g in guests])[:, None]
        foreign[:, :m] = compute_log_student((lines.shift[None, :] - offset - shift) / scale, scale, degrees)
        foreign[:, :m] -= _GUEST_ON_STATED * (lines.is_range | (lines.count > 1) | lines.is_split)[None, :]
        missing = np.concatenate([missing, [g.missing for g in guests]])
        together = np.concatenate([together, np.zeros(len(guests))])
    hidden = np.zeros(len(missing))
    if peaks.hiding is not None and len(units):
        hidden[: len(units)] = peaks.compute_hidden(units)
    missing = missing + (1 - missing) * hidden
    weight = np.concatenate([own, foreign]) + np.log1p(-missing)[:, None]
    # A unit without a line of its own is missing, or shares a line: its partner's, or one that happens to be there.
    sharing = parameters.resolution_ppm * np.exp(np.minimum(weight[:, :m], 20.0)).sum(axis=1) if m else 0.0
    without = np.log(missing + (1 - missing) * np.minimum(sharing + together, 0.95))
    columns = [Offer((j,), float(lines.shift[j]), "", ()) for j in range(m)] + offers
    leftover = np.array([lines.extra[list(o.lines)].sum() for o in columns])
    count = np.concatenate([units.count, np.zeros(len(guests))])
    stated = np.concatenate([lines.count, np.full(len(offers), np.nan)])
    return _Problem(np.maximum(weight, -1e6), without, np.log(missing), leftover, columns, count, stated)


def _solve(problem: _Problem, resolution: float) -> tuple[np.ndarray, float]:
    gain = problem.gain
    counted = not np.isnan(problem.stated).all()
    if counted:
        gain = gain + _pairwise_counts(problem)
    chosen = solve_assignment(gain, [o.lines for o in problem.columns])
    if counted:
        return _improve(problem, chosen, resolution)
    used = np.flatnonzero(chosen >= 0)
    base = problem.without.sum() + _sum_single(problem)
    return chosen, float(base + gain[used, chosen[used]].sum())


def _sum_single(problem: _Problem) -> float:
    """Log weight of all lines being left over (single lines only, split carbons are the same lines again)."""
    single = [len(o.lines) == 1 for o in problem.columns]
    return float(problem.leftover[single].sum())


def _pairwise_counts(problem: _Problem) -> np.ndarray:
    """For the one-to-one start: a unit with too many nuclei for a line is worse than one with too few."""
    difference = problem.count[:, None] - problem.stated[None, :]
    penalty = np.where(difference > 0, -1.2 * difference, 0.3 * difference)
    return np.where(np.isnan(penalty) | (problem.count[:, None] == 0), 0.0, np.maximum(penalty, -7.0))


def _improve(problem: _Problem, chosen: np.ndarray, resolution: float):
    """Moves and exchanges under the count penalties; split carbons stay as they are."""
    keep = _columns_in_use(problem, chosen)
    back = {c: k for k, c in enumerate(keep)}
    start = np.array([back.get(c, -1) for c in chosen])
    improved, total = improve_with_counts(
        start,
        problem.weight[:, keep],
        problem.absent,
        problem.leftover[keep],
        problem.count,
        CountPenalty(problem.stated[keep]),
        math.log(resolution),
    )
    return np.array([keep[c] if c >= 0 else -1 for c in improved]), total


def _columns_in_use(problem, chosen) -> list[int]:
    """Split carbons that were chosen, and single lines that are not part of one."""
    split = sorted({c for c in chosen if c >= 0 and len(problem.columns[c].lines) > 1})
    taken = {j for c in split for j in problem.columns[c].lines}
    return [c for c, o in enumerate(problem.columns) if (len(o.lines) == 1 and o.lines[0] not in taken) or c in split]


def _keep_chosen_offers(problem: _Problem, chosen: np.ndarray, m: int):
    keep = _columns_in_use(problem, chosen)
    if len(keep) == len(problem.columns):
        return problem, chosen
    back = {c: k for k, c in enumerate(keep)}
    smaller = _Problem(
        problem.weight[:, keep],
        problem.without,
        problem.absent,
        problem.leftover[keep],
        [problem.columns[c] for c in keep],
        problem.count,
        problem.stated[keep],
    )
    return smaller, np.array([back.get(c, -1) for c in chosen])


def _update_offset(units, guests, problem, chosen, offset, parameters):
    n = len(units)
    used = np.flatnonzero(chosen >= 0)
    keep = [
        k
        for k in used
        if not (k < n and units.labile[k]) and not (k >= n and guests[k - n].scale > 2 * parameters.solvent_scale_ppm)
    ]
    if not keep:
        return 0.0, False
    shift = np.concatenate([units.shift, [g.shift for g in guests]])
    scale = np.concatenate([units.scale, [g.scale for g in guests]])
    degrees = np.concatenate([units.degrees, [g.degrees for g in guests]])
    observed = np.array([problem.columns[c].centre_ppm for c in chosen[keep]])
    anchored = any(k >= n and guests[k - n].anchor for k in keep)
    # An anchored list may be off by any amount; without an anchor only the prior's share of the deviation counts.
    prior = parameters.reference_prior_ppm * (3.0 if anchored else 1.0)
    return compute_offset(observed - shift[keep], scale[keep], degrees[keep], prior, offset), anchored


def _all_found(problem, chosen, begin, resolution) -> bool:
    """Say whether every line of the set that starts at row `begin` has a line, its own or one shared within resolution."""
    for k in range(begin, len(chosen)):
        if chosen[k] >= 0:
            continue
        single = [c for c, o in enumerate(problem.columns) if len(o.lines) == 1]
        near = problem.weight[k, single].max(initial=-np.inf)
        if near < math.log(0.25 / resolution) - 2.0:
            return False
    return True


def _finish(units, lines, guests, problem, chosen, offset, anchored, accepted, peaks, parameters) -> NucleusFit:
    n, m = len(units), len(lines)
    counted = not np.isnan(problem.stated).all()
    if counted:
        probability, evidence = _soften_counted(problem, chosen, parameters.resolution_ppm)
        evidence += _credit_partners(units, problem, chosen, parameters.resolution_ppm)
    else:
        probability, log_sum = compute_soft_assignment(problem.gain)
        evidence = log_sum + float(problem.without.sum() + problem.leftover.sum())
    users = np.zeros(len(problem.columns), dtype=int)
    for c in chosen:
        if c >= 0:
            users[c] += 1
    sharing = _find_sharing(units, guests, problem, chosen, users, parameters)
    evidence += sum(s.log_prior for s in accepted) - 0.5 * (offset / parameters.reference_prior_ppm) ** 2 * (not anchored)
    leftover = tuple(j for c, o in enumerate(problem.columns) if users[c] == 0 for j in o.lines)
    second = ()
    if len(leftover) > 1 and find_second_set_reason(units.mol):
        pairs, gain = assign_second_set(
            units.nucleus,
            lines.shift[list(leftover)],
            lines.extra[list(leftover)],
            _observed_shifts(problem, chosen, sharing, n),
        )
        second = tuple((leftover[i], k) for i, k in pairs)
        evidence += gain
        leftover = tuple(j for j in leftover if j not in {line for line, _ in second})
    terms = _compute_terms(units, problem, chosen, sharing, offset, n)
    terms["extra_lines"] = len(leftover)
    terms["lines"] = m
    return NucleusFit(
        units,
        lines,
        guests,
        tuple(problem.columns),
        chosen,
        sharing,
        probability,
        offset,
        anchored,
        float(evidence),
        tuple(sorted(leftover)),
        second,
        tuple(s.name for s in accepted),
        _explain_missing(units, peaks),
        terms,
    )


def _soften_counted(problem, chosen, resolution):
    """Probabilities and evidence around an assignment with shared lines: each line gets one seat for each of its units."""
    penalty = CountPenalty(problem.stated)
    users = np.bincount(chosen[chosen >= 0], minlength=len(problem.columns))
    sums = np.bincount(chosen[chosen >= 0], weights=problem.count[chosen >= 0], minlength=len(problem.columns))
    seats = np.repeat(np.arange(len(problem.columns)), np.maximum(users, 1))
    own = np.zeros((len(chosen), len(problem.columns)), dtype=bool)
    own[chosen >= 0, chosen[chosen >= 0]] = True
    others = sums[None, :] - np.where(own, problem.count[:, None], 0.0)
    # A unit that would come in on top takes the place of one that is there: compare with the line's usual load.
    typical = np.where(own, others, sums[None, :] * (1 - 1 / np.maximum(users, 1))[None, :])
    factor = penalty.compute(typical + problem.count[:, None]) - penalty.compute(typical)
    factor = np.where(users[None, :] <= 1, penalty.compute(problem.count[:, None] + 0 * sums[None, :]), factor)
    weight = problem.weight + factor
    shared = np.log(resolution) * (users > 1)
    base = (problem.leftover / np.maximum(users, 1) - shared)[None, :] + problem.absent[:, None]
    gain = (weight - base)[:, seats]
    soft, log_sum = compute_soft_assignment(gain)
    probability = np.zeros((len(chosen), len(problem.columns)))
    np.add.at(probability.T, seats, soft.T)
    used = np.flatnonzero(chosen >= 0)
    hard = float((weight - base)[used, chosen[used]].sum())
    exact = float(
        problem.weight[used, chosen[used]].sum()
        + problem.absent[chosen < 0].sum()
        + np.where(users == 0, problem.leftover, penalty.compute(sums) + (users - 1) * np.log(resolution)).sum()
    )
    return np.minimum(probability, 1.0), exact + max(0.0, log_sum - hard)


def _observed_shifts(problem, chosen, sharing, n) -> np.ndarray:
    column = np.where(chosen >= 0, chosen, sharing)[:n]
    return np.array([problem.columns[c].centre_ppm if c >= 0 else np.nan for c in column], dtype=float)


def _explain_missing(units, peaks) -> tuple[str, ...]:
    notes = list(units.missing_note)
    if peaks.hiding is not None and len(units):
        for k, hidden in enumerate(peaks.compute_hidden(units)):
            if hidden > 0.15:
                notes[k] = "; ".join(filter(None, (notes[k], "may lie under the solvent line")))
    return tuple(notes)


def _credit_partners(units, problem, chosen, resolution) -> float:
    """Log weight to add where two groups that are alike but for stereo share a line: that is likelier than by chance."""
    credit = 0.0
    for k in range(len(units)):
        first = units.partner[k]
        if first >= 0 and chosen[k] >= 0 and chosen[k] == chosen[first]:
            credit += max(0.0, math.log(units.together[k]) - problem.weight[k, chosen[k]] - math.log(resolution))
    return credit


def _find_sharing(units, guests, problem, chosen, users, parameters):
    """A unit without a line of its own shares one if that is likelier than being missing."""
    n = len(units)
    sharing = np.full(len(chosen), -1)
    missing = units.missing
    for k in range(len(chosen)):
        if chosen[k] >= 0:
            continue
        if k < n and units.partner[k] >= 0:
            first = units.partner[k]
            column = chosen[first]
            if column >= 0 and math.log(units.together[k]) > math.log(missing[k]) and _is_near(problem, k, column):
                sharing[k] = column
                continue
        open_columns = [c for c, o in enumerate(problem.columns) if users[c] and len(o.lines) >= 1]
        if not open_columns:
            continue
        values = problem.weight[k, open_columns]
        best = int(np.argmax(values))
        absent = missing[k] if k < n else guests[k - n].missing
        if values[best] + math.log(parameters.resolution_ppm) > math.log(absent):
            sharing[k] = open_columns[best]
    return sharing


def _is_near(problem, k, column) -> bool:
    return problem.weight[k, column] > problem.weight[k].max() - 6.0


def _compute_terms(units, problem, chosen, sharing, offset, n):
    """Parts of the fit that the judgement looks at."""
    centre = _observed_shifts(problem, chosen, sharing, n)
    has = ~np.isnan(centre)
    z = np.zeros(n)
    z[has] = (centre[has] - offset - units.shift[has]) / units.scale[has]
    missing = [k for k in range(n) if not has[k]]
    return dict(
        z=z,
        has_line=has,
        missing=tuple(missing),
        missing_weight=float(sum(problem.absent[k] for k in missing if not units.labile[k])),
        unexcused=sum(1 for k in missing if units.missing[k] < 0.3),
    )
