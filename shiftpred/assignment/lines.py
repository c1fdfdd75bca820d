"""Observed peaks as arrays, and which lines may together be one carbon split by fluorine or phosphorus."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shiftpred.assignment.background import compute_background_density, compute_background_mass
from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.records import Peak, PeakList

__all__ = ["Lines", "Offer", "build_lines", "build_offers"]

_WIDEST_SPLITTING_HZ = 310.0
_SPACING_TOLERANCE_PPM = 0.025
"""How well two spacings of one multiplet agree in a printed list (two decimals; common practice, no source)."""
_MOST_OFFERS = 400
_RANGE_EDGE_PPM = 0.015
_STATED_H_CHANCE = 0.3
"""Chance of one hydrogen count for a line of unknown origin."""


@dataclass(frozen=True)
class Lines:
    """One peak list; m lines."""

    nucleus: str
    peaks: tuple[Peak, ...]
    shift: np.ndarray
    """(m,) ppm."""
    lower: np.ndarray
    upper: np.ndarray
    """(m,) ends of a range, a little widened; both equal to `shift` for a plain line."""
    is_range: np.ndarray
    count: np.ndarray
    """(m,) hydrogens or carbons as stated; nan: not stated."""
    attached_h: np.ndarray
    """(m,) -1: not stated."""
    pair: np.ndarray
    """(m,) shift of the other nucleus of a C-H pair; nan: not stated."""
    extra: np.ndarray
    """(m,) log weight of being a line of unknown origin."""
    is_split: np.ndarray
    """(m,) bool: 13C lines that come with a splitting."""
    split_stated: bool
    """True where any line comes with a splitting, so that a line without one is a singlet."""

    def __len__(self) -> int:
        return len(self.shift)


@dataclass(frozen=True)
class Offer:
    """Several lines that may be one carbon."""

    lines: tuple[int, ...]
    centre_ppm: float
    pattern: str
    """'d', 't', 'q' or 'dd'."""
    splittings_ppm: tuple[float, ...]


def build_lines(peak_list: PeakList) -> Lines:
    """Turn a peak list into arrays.

    Parameters
    ----------
    peak_list : PeakList

    Returns
    -------
    Lines
    """
    nucleus, peaks = peak_list.nucleus, peak_list.peaks
    parameters = PARAMETERS[nucleus]
    shift = np.array([p.shift_ppm for p in peaks], dtype=float)
    is_range = np.array([p.is_range for p in peaks], dtype=bool)
    edge = np.where(is_range, _RANGE_EDGE_PPM, 0.0)
    lower = np.array([p.lower_ppm for p in peaks], dtype=float) - edge
    upper = np.array([p.upper_ppm for p in peaks], dtype=float) + edge
    stated = [p.hydrogens if nucleus == "1H" else p.carbons for p in peaks]
    count = np.array([np.nan if c is None else float(c) for c in stated], dtype=float)
    attached = np.array([-1 if p.attached_h is None else p.attached_h for p in peaks], dtype=int)
    pair = np.array([np.nan if p.pair_ppm is None else p.pair_ppm for p in peaks], dtype=float)
    density = compute_background_density(nucleus, shift, attached)
    if is_range.any():
        mass = compute_background_mass(nucleus, lower, upper) / parameters.resolution_ppm
        density = np.where(is_range, np.maximum(mass, 1e-6), density)
    extra = np.log(parameters.extra_lines * density)
    extra += np.where(attached >= 0, np.log(_STATED_H_CHANCE), 0.0)
    known = ~np.isnan(pair)
    if known.any():
        other = "1H" if nucleus == "13C" else "13C"
        extra[known] += np.log(compute_background_density(other, pair[known]))
    is_split = np.array([nucleus == "13C" and bool(p.couplings_hz) for p in peaks], dtype=bool)
    return Lines(
        nucleus,
        peaks,
        shift,
        lower,
        upper,
        is_range,
        count,
        attached,
        pair,
        extra,
        is_split=is_split,
        split_stated=bool(is_split.any()),
    )


def build_offers(lines: Lines, frequency_mhz: float, patterns: frozenset[str]) -> list[Offer]:
    """Find sets of plain 13C lines that have the spacing of a multiplet.

    Parameters
    ----------
    lines : Lines
    frequency_mhz : float
        Lowest 13C frequency that comes into question; it sets the widest spacing in ppm.
    patterns : frozenset of str
        Which of 'd', 't', 'q', 'dd' some carbon of the structure may show.

    Returns
    -------
    list of Offer
        At most 400, the closest spacings first.
    """
    plain = [
        i for i, p in enumerate(lines.peaks) if not p.couplings_hz and not p.is_range and (p.carbons is None or p.carbons < 2)
    ]
    plain.sort(key=lambda i: lines.shift[i])
    y = lines.shift
    widest = _WIDEST_SPLITTING_HZ / frequency_mhz
    doublets = [(i, j) for a, i in enumerate(plain) for j in plain[a + 1 :] if 0.005 < y[j] - y[i] <= widest]
    offers = []
    if "d" in patterns:
        offers += [Offer((i, j), (y[i] + y[j]) / 2, "d", (y[j] - y[i],)) for i, j in doublets]
    if patterns & {"t", "q"}:
        offers += _build_progressions(doublets, y, patterns)
    if "dd" in patterns:
        offers += _build_double_doublets(doublets, y)
    offers.sort(key=lambda o: (o.splittings_ppm, o.lines))
    return offers[:_MOST_OFFERS]


def _build_progressions(doublets, y, patterns):
    """Three or four lines at equal spacing; of a quartet the two inner ones alone will do."""
    following: dict[int, list[int]] = {}
    for i, j in doublets:
        following.setdefault(i, []).append(j)
    out = []
    for i, j in doublets:
        gap = y[j] - y[i]
        if "q" in patterns:
            out.append(Offer((i, j), (y[i] + y[j]) / 2, "q", (gap,)))
        for k in following.get(j, ()):
            if abs(y[k] - y[j] - gap) > _SPACING_TOLERANCE_PPM:
                continue
            if "t" in patterns:
                out.append(Offer((i, j, k), y[j], "t", ((y[k] - y[i]) / 2,)))
            if "q" in patterns:
                out += [
                    Offer((i, j, k, m), (y[i] + y[m]) / 2, "q", ((y[m] - y[i]) / 3,))
                    for m in following.get(k, ())
                    if abs(y[m] - y[k] - gap) <= _SPACING_TOLERANCE_PPM
                ]
    return out


def _build_double_doublets(doublets, y):
    out = []
    for a, (i, j) in enumerate(doublets):
        for k, m in doublets[a + 1 :]:
            if len({i, j, k, m}) < 4 or abs((y[j] - y[i]) - (y[m] - y[k])) > _SPACING_TOLERANCE_PPM:
                continue
            small, large = y[j] - y[i], abs(y[k] + y[m] - y[i] - y[j]) / 2
            if large > small:
                lines = tuple(sorted((i, j, k, m), key=lambda x: y[x]))
                out.append(Offer(lines, (y[i] + y[j] + y[k] + y[m]) / 4, "dd", (large, small)))
    return out
