"""The arrays of one assignment: who may take what, and what it is worth."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from shiftpred.assignment.guests import Guest, GuestSet
from shiftpred.assignment.lines import Offer, build_offers
from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.assignment.prepared_peaks import PreparedPeaks
from shiftpred.assignment.solver import CountPenalty, improve_with_counts, solve_assignment
from shiftpred.assignment.units import Units
from shiftpred.assignment.weights import compute_line_weights, compute_log_student, compute_offer_weights

__all__ = ["Problem", "ProblemBuilder", "gather_guests"]

_GUEST_ON_STATED = 2.0
"""Log penalty of a solvent or impurity on a range, on a split line, or on one stated to hold several nuclei."""
_LOWEST = -1e6


@dataclass(frozen=True)
class Problem:
    """n rows (the structure's units, then guests), m columns (single lines, then lines that go together)."""

    weight: np.ndarray
    """(n, m) log density of the column's lines if they belong to the row."""
    without: np.ndarray
    """(n,) log chance of a row without a line of its own: missing, or sharing one by chance or by symmetry."""
    absent: np.ndarray
    """(n,) log chance of a row that is missing altogether."""
    leftover: np.ndarray
    """(m,) log weight of a column that nothing takes."""
    columns: tuple[Offer, ...]
    count: np.ndarray
    """(n,) nuclei of each row; 0 for guests, whose amount is not known."""
    stated: np.ndarray
    """(m,) nuclei that the list states; nan: not stated."""
    resolution_ppm: float

    @property
    def counted(self) -> bool:
        """True where the list states numbers of nuclei, so that sharing is weighed line by line."""
        return not np.isnan(self.stated).all()

    @property
    def gain(self) -> np.ndarray:
        """(n, m) log weight of a pairing over both being without a partner."""
        return self.weight - self.without[:, None] - self.leftover[None, :]

    def solve(self) -> tuple[np.ndarray, float]:
        """Return the column of each row (-1: none) and the log weight of the whole."""
        gain = self.gain
        if self.counted:
            gain = gain + self._pairwise_counts()
        chosen = solve_assignment(gain, [o.lines for o in self.columns])
        if self.counted:
            return self._improve(chosen)
        used = np.flatnonzero(chosen >= 0)
        single = sum(len(o.lines) == 1 for o in self.columns)
        base = self.without.sum() + self.leftover[:single].sum()
        return chosen, float(base + gain[used, chosen[used]].sum())

    def _pairwise_counts(self) -> np.ndarray:
        """For the one-to-one start: a unit with too many nuclei for a line is worse than one with too few."""
        difference = self.count[:, None] - self.stated[None, :]
        penalty = np.where(difference > 0, -1.2 * difference, 0.3 * difference)
        return np.where(np.isnan(penalty) | (self.count[:, None] == 0), 0.0, np.maximum(penalty, -7.0))

    def _improve(self, chosen: np.ndarray) -> tuple[np.ndarray, float]:
        """Moves and exchanges under the count penalties; lines that were taken together stay together."""
        smaller, start = self.keep_used_columns(chosen)
        kept = self._used_columns(chosen)
        improved, total = improve_with_counts(
            start,
            smaller.weight,
            smaller.absent,
            smaller.leftover,
            smaller.count,
            CountPenalty(smaller.stated),
            math.log(self.resolution_ppm),
        )
        return np.array([kept[c] if c >= 0 else -1 for c in improved], dtype=int), total

    def _used_columns(self, chosen: np.ndarray) -> list[int]:
        """Lines taken together, and single lines that are not among these."""
        split = sorted({int(c) for c in chosen if c >= 0 and len(self.columns[c].lines) > 1})
        taken = {j for c in split for j in self.columns[c].lines}
        return [c for c, o in enumerate(self.columns) if (len(o.lines) == 1 and o.lines[0] not in taken) or c in split]

    def keep_used_columns(self, chosen: np.ndarray) -> tuple[Problem, np.ndarray]:
        """Return the problem without the columns that overlap with what was chosen, and `chosen` in its numbering."""
        kept = self._used_columns(chosen)
        if len(kept) == len(self.columns):
            return self, chosen
        back = {c: k for k, c in enumerate(kept)}
        smaller = replace(
            self,
            weight=self.weight[:, kept],
            leftover=self.leftover[kept],
            columns=tuple(self.columns[c] for c in kept),
            stated=self.stated[kept],
        )
        return smaller, np.array([back.get(int(c), -1) for c in chosen], dtype=int)


class ProblemBuilder:
    """Builds the problem of one structure and one list for any offset and any guests.

    Parameters
    ----------
    units : Units
    peaks : PreparedPeaks
    others : dict or None
        Atom index → (shift, scale, degrees) of the other nucleus, for C-H pairs.
    pair_share : float
        Share of the pairs' evidence that counts here.
    """

    def __init__(self, units: Units, peaks: PreparedPeaks, others: dict | None, pair_share: float):
        self.units, self.peaks, self.others, self.pair_share = units, peaks, others, pair_share
        lines = peaks.lines
        patterns = _list_patterns(units)
        self.offers = build_offers(lines, min(peaks.carbon_frequencies), patterns) if patterns else []
        self.columns = (*(Offer((j,), float(x), "", ()) for j, x in enumerate(lines.shift)), *self.offers)
        together = [lines.extra[list(o.lines)].sum() for o in self.offers]
        self.leftover = np.concatenate([lines.extra, together]) if together else lines.extra
        self.stated = np.concatenate([lines.count, np.full(len(self.offers), np.nan)])
        hidden = peaks.compute_hidden(units) if peaks.hiding is not None and len(units) else 0.0
        self.missing = units.missing + (1 - units.missing) * hidden

    def build(self, offset_ppm: float, guests: tuple[Guest, ...]) -> Problem:
        """Return the problem at a reference offset with these guests."""
        units, lines, m = self.units, self.peaks.lines, len(self.peaks.lines)
        resolution = PARAMETERS[units.nucleus].resolution_ppm
        own = compute_line_weights(units, lines, offset_ppm, self.others, self.pair_share)
        if self.offers:
            split = compute_offer_weights(units, self.offers, offset_ppm, self.peaks.carbon_frequencies)
            own = np.concatenate([own, split], axis=1)
        missing, together, count = self.missing, units.together, units.count
        if guests:
            own = np.concatenate([own, self._weigh_guests(guests, offset_ppm, own.shape[1])])
            missing = np.concatenate([missing, [g.missing for g in guests]])
            together = np.concatenate([together, np.zeros(len(guests))])
            count = np.concatenate([count, np.zeros(len(guests))])
        weight = np.maximum(own + np.log1p(-missing)[:, None], _LOWEST)
        # A unit without a line of its own is missing, or shares a line: its partner's, or one that happens to be there.
        sharing = resolution * np.exp(np.minimum(weight[:, :m], 20.0)).sum(axis=1)
        without = np.log(missing + (1 - missing) * np.minimum(sharing + together, 0.95))
        return Problem(
            weight, without, np.log(missing), self.leftover, self.columns, count, self.stated, resolution
        )  # fmt: skip

    def _weigh_guests(self, guests, offset_ppm, width) -> np.ndarray:
        lines, m = self.peaks.lines, len(self.peaks.lines)
        shift, scale, degrees = np.array([(g.shift, g.scale, g.degrees) for g in guests]).T[:, :, None]
        out = np.full((len(guests), width), -np.inf)
        out[:, :m] = compute_log_student((lines.shift[None, :] - offset_ppm - shift) / scale, scale, degrees)
        out[:, :m] -= _GUEST_ON_STATED * (lines.is_range | (lines.count > 1) | lines.is_split)[None, :]
        return out


def gather_guests(*sets: GuestSet) -> tuple[Guest, ...]:
    """Return the lines of several sets in their order."""
    return tuple(g for group in sets for g in group.guests)


def _list_patterns(units: Units) -> frozenset[str]:
    found = set()
    for couplings in units.couplings:
        found |= {{1: "d", 2: "t", 3: "q"}.get(c.nuclei, "") for c in couplings}
        if sum(c.nuclei == 1 for c in couplings) > 1:
            found.add("dd")
    return frozenset(found - {""})
