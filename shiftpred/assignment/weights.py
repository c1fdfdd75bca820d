"""Log weights of units on lines: heavy-tailed densities, stated counts, C-H pairs, splittings."""

from __future__ import annotations

import math

import numpy as np
from scipy.special import gammaln, stdtr

from shiftpred.assignment.couplings import ExpectedCoupling, compute_coupling_density
from shiftpred.assignment.lines import Lines, Offer
from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.assignment.units import Units

__all__ = [
    "COMMON_CARBON_FREQUENCIES",
    "compute_line_weights",
    "compute_log_student",
    "compute_offer_weights",
]

COMMON_CARBON_FREQUENCIES = (75.5, 100.6, 125.8, 150.9)
"""MHz; tried with equal chance where the frequency is not given."""
_WRONG_HYDROGEN_COUNT = -12.0
_LABILE_ANYWHERE = 0.35
_LABILE_RANGE_PPM = 14.0
"""A labile hydrogen's line: predicted distribution, and with this share anywhere over so many ppm (common practice)."""
_UNEXPLAINED_SPLITTING = -7.0
_LEAST_UNRESOLVED = 0.3
_LEAST_UNRESOLVED_STATED = 0.1
"""Floor for the chance that a list gives a split carbon as one line; lower where the list states splittings."""
_REDUNDANT_LINE = math.log(1 / (math.sqrt(2 * math.pi) * 0.02))
"""Log density per ppm of a multiplet's further lines, whose places follow from the others to 0.02 ppm."""
_MULTIPLICITY = {"s": 0, "d": 1, "t": 2, "q": 3, "quint": 4, "p": 4, "sext": 5, "sept": 6, "hept": 6}
_MULTIPLICITY_FLOOR = 0.12


def compute_log_student(z: np.ndarray, scale: np.ndarray, degrees: np.ndarray) -> np.ndarray:
    """Return the log density per ppm of a Student t distribution at `z` scales from its centre."""
    constant = gammaln((degrees + 1) / 2) - gammaln(degrees / 2) - 0.5 * np.log(degrees * np.pi) - np.log(scale)
    return constant - (degrees + 1) / 2 * np.log1p(z * z / degrees)


def compute_line_weights(units: Units, lines: Lines, offset_ppm: float, others: dict | None, pair_share: float) -> np.ndarray:
    """Return (n_units, n_lines) log densities per ppm of each line if it belongs to each unit.

    Parameters
    ----------
    units : Units
    lines : Lines
    offset_ppm : float
        Observed minus true scale.
    others : dict or None
        Atom index → (shift, scale, degrees) arrays of the other nucleus, for C-H pairs.
    pair_share : float
        Share of the pairs' evidence that is counted here (a half where the other list is fitted too).
    """
    shift, scale, degrees = units.shift[:, None], units.scale[:, None], units.degrees[:, None]
    z = (lines.shift[None, :] - offset_ppm - shift) / scale
    weights = compute_log_student(z, scale, degrees)
    ranges = lines.is_range
    resolution = PARAMETERS[units.nucleus].resolution_ppm
    if ranges.any():
        low = (lines.lower[None, ranges] - offset_ppm - shift) / scale
        high = (lines.upper[None, ranges] - offset_ppm - shift) / scale
        mass = stdtr(degrees, high) - stdtr(degrees, low)
        weights[:, ranges] = np.log(np.maximum(mass, 1e-9) / resolution)
    if units.labile.any():
        width = np.where(ranges, (lines.upper - lines.lower) / resolution, 1.0) / _LABILE_RANGE_PPM
        inside = (lines.shift > -0.5) & (lines.shift < 17.0)
        anywhere = _LABILE_ANYWHERE * np.where(inside, np.maximum(width, 1e-12), 1e-9)
        own = units.labile
        weights[own] = np.logaddexp(weights[own] + math.log(1 - _LABILE_ANYWHERE), np.log(anywhere)[None, :])
    stated = lines.attached_h >= 0
    if stated.any():
        # Carbons on deuterium show up in no spectrum that edits by attached hydrogens.
        wrong = stated[None, :] & (units.attached_h[:, None] != lines.attached_h[None, :])
        weights = weights + np.where(wrong, _WRONG_HYDROGEN_COUNT, 0.0)
    if others is not None and not np.isnan(lines.pair).all():
        weights = weights + pair_share * _compute_pair_weights(units, lines, others)
    if units.nucleus == "1H":
        weights = weights + _compute_multiplicity_weights(units, lines)
    else:
        weights = weights + _compute_splitting_weights(units, lines)
    return weights


def _compute_pair_weights(units, lines, others):
    """How well the other coordinate of a C-H pair agrees with the prediction for the same heavy atom."""
    out = np.zeros((len(units), len(lines)))
    known = np.flatnonzero(~np.isnan(lines.pair))
    for g, atoms in enumerate(units.atoms):
        partner = others.get(atoms[0])
        if partner is None:
            out[g, known] = _WRONG_HYDROGEN_COUNT
            continue
        shift, scale, degrees = partner
        z = (lines.pair[known][None, :] - shift[:, None]) / scale[:, None]
        out[g, known] = compute_log_student(z, scale[:, None], degrees[:, None]).max(axis=0)
    return out


def _compute_multiplicity_weights(units, lines):
    """A stated s, d, t, q … should be one line more than there are hydrogens next door; m and br say nothing."""
    out = np.zeros((len(units), len(lines)))
    for j, peak in enumerate(lines.peaks):
        words = (peak.multiplicity or "").replace("br", "").split()
        expected = _MULTIPLICITY.get(words[0]) if len(words) == 1 else None
        if expected is None:
            continue
        known = units.neighbours >= 0
        fits = np.where(units.neighbours == expected, 0.6, _MULTIPLICITY_FLOOR)
        out[:, j] = np.where(known, np.log(fits / 0.3), 0.0)
    return out


def _compute_splitting_weights(units, lines):
    """Stated splittings of a carbon line against those that the structure's fluorine and phosphorus would cause."""
    out = np.zeros((len(units), len(lines)))
    split = [j for j, p in enumerate(lines.peaks) if p.couplings_hz]
    floor = _LEAST_UNRESOLVED_STATED if lines.split_stated else _LEAST_UNRESOLVED
    for g, couplings in enumerate(units.couplings):
        if couplings:
            out[g, :] = math.log(max(floor, math.prod(1 - c.resolved for c in couplings)))
    for j in split:
        hertz = lines.peaks[j].couplings_hz
        for g, couplings in enumerate(units.couplings):
            out[g, j] = _match_splittings(hertz, couplings)
    return out


def _match_splittings(hertz: tuple[float, ...], couplings: tuple[ExpectedCoupling, ...]) -> float:
    """Return the log density of stated splittings, each taken by the best coupling that is left."""
    left, total = list(couplings), 0.0
    for value in sorted((abs(h) for h in hertz), reverse=True):
        scored = [(compute_coupling_density(c, value) * c.resolved * 100.0, c) for c in left]
        if not scored:
            total += _UNEXPLAINED_SPLITTING
            continue
        best, coupling = max(scored, key=lambda s: s[0])
        total += max(math.log(max(best, 1e-12)), _UNEXPLAINED_SPLITTING)
        left.remove(coupling)
    return total


def compute_offer_weights(
    units: Units, offers: list[Offer], offset_ppm: float, frequencies_mhz: tuple[float, ...]
) -> np.ndarray:
    """Return (n_units, n_offers) log densities of all lines of an offer if they are one split carbon; -inf: impossible."""
    out = np.full((len(units), len(offers)), -np.inf)
    if not offers:
        return out
    centre = np.array([o.centre_ppm for o in offers])
    for g, couplings in enumerate(units.couplings):
        if not couplings:
            continue
        split = np.array([_score_pattern(o, couplings, frequencies_mhz) for o in offers])
        possible = split > -30
        if possible.any():
            z = (centre[possible] - offset_ppm - units.shift[g]) / units.scale[g]
            out[g, possible] = compute_log_student(z, units.scale[g], units.degrees[g]) + split[possible]
    return out


def _score_pattern(offer: Offer, couplings: tuple[ExpectedCoupling, ...], frequencies) -> float:
    """Return the log density per ppm of the spacings of an offer, averaged over the frequencies that come into question."""
    total = 0.0
    for frequency in frequencies:
        hertz = [s * frequency for s in offer.splittings_ppm]
        if offer.pattern == "dd":
            best = 0.0
            for a, first in enumerate(couplings):
                for second in couplings[a + 1 :]:
                    if first.nuclei == second.nuclei == 1:
                        one = compute_coupling_density(first, hertz[0]) * compute_coupling_density(second, hertz[1])
                        best = max(best, one * first.resolved * second.resolved)
            total += best * frequency * frequency
            continue
        nuclei = {"d": 1, "t": 2, "q": 3}[offer.pattern]
        for coupling in couplings:
            if coupling.nuclei == nuclei:
                others = math.prod(max(0.15, 1 - c.resolved) for c in couplings if c is not coupling)
                total += compute_coupling_density(coupling, hertz[0]) * coupling.resolved * others * frequency
    if total <= 0:
        return -np.inf
    # The first line is the centre, the next one the spacing; any further lines follow from these two.
    informative = 1 + len(offer.splittings_ppm)
    weight = math.log(total / len(frequencies)) + (len(offer.lines) - informative) * _REDUNDANT_LINE
    if offer.pattern == "q" and len(offer.lines) == 2:
        weight += math.log(0.3)  # the outer lines are lost in the noise
    return weight
