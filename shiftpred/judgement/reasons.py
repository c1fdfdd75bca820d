"""Reasons in words with numbers, the weightiest first."""

from __future__ import annotations

import math

import numpy as np

from shiftpred.assignment.nucleus_fit import NucleusFit
from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.assignment.structure_fit import StructureFit
from shiftpred.judgement.fit_summary import FitSummary
from shiftpred.records import Rival

__all__ = ["build_offset_cautions", "build_reasons"]

_MOST_NUCLEI = 3
_OFF_FROM = 1.0
"""Deviations are told from this many half-widths of the interval on."""
_NOTHING_NEAR_FROM = 2.0
"""From this many half-widths on there is 'nothing near' the expected place."""
_WEIGHT_OF_EXTRA = 7.0
_DIGITS = {"13C": 1, "1H": 2}
_H_WORDS = {0: "carbon without hydrogen", 1: "CH", 2: "CH2", 3: "CH3"}


def build_reasons(
    fit: StructureFit, summary: FitSummary, margin: float | None, nearest: Rival | None, calibrated_share: float
) -> tuple[str, ...]:
    """Return why the judgement is what it is.

    Parameters
    ----------
    fit : StructureFit
        Of the proposal.
    summary : FitSummary
    margin : float or None
        Log likelihood of the proposal less that of its nearest rival; None: there is no rival.
    nearest : Rival or None
    calibrated_share : float
        What a unit of the log likelihood ratio is worth after calibration, for the order of the reasons.
    """
    weighted: list[tuple[float, str]] = []
    if margin is not None and nearest is not None:
        weighted.append((calibrated_share * min(abs(margin), 30.0), _describe_rival(margin, nearest)))
    weighted.append(_describe_absolute_fit(fit, summary))
    for nucleus, one in fit.nuclei.items():
        weighted += _describe_nuclei(nucleus, one)
        weighted += _describe_leftovers(nucleus, one)
        weighted += _describe_missing(nucleus, one)
        weighted += _describe_found(nucleus, one)
        weighted.append(_describe_offset(nucleus, one))
    weighted.sort(key=lambda w: -round(w[0], 6))
    return tuple(text for _, text in weighted)


def _describe_rival(margin: float, nearest: Rival) -> str:
    if abs(margin) < math.log(2.0):
        return f"fits about as well as its nearest rival {nearest.smiles} ({nearest.how})"
    times = _format_times(abs(margin))
    if margin >= 0:
        return f"fits {times} better than its nearest rival {nearest.smiles} ({nearest.how})"
    return f"the rival {nearest.smiles} ({nearest.how}) fits {times} better"


def _format_times(log_ratio: float) -> str:
    if log_ratio > math.log(1e6):
        return "more than a million times"
    ratio = math.exp(log_ratio)
    # Two figures: a likelihood ratio is not known better.
    return f"{float(f'{ratio:.2g}'):,.0f} times" if ratio >= 9.95 else f"{ratio:.1f} times"


def _describe_absolute_fit(fit: StructureFit, summary: FitSummary) -> tuple[float, str]:
    inside = total = 0
    for one in fit.nuclei.values():
        flags = _inside_flags(one)
        inside, total = inside + sum(flags), total + len(flags)
    if not total:
        return 20.0, "no line could be assigned to any nucleus"
    # A nucleus that the structure lacks (the carbons of HCl) has a fit without rows.
    coverage = next(row.coverage for one in fit.nuclei.values() for row in one.units.rows)
    text = f"{inside} of {total} assigned sites lie within their {coverage:.0%} interval"
    if summary.misfit > 2:
        text += f"; taken together the deviations are {summary.misfit:.1f} standard deviations larger than usual"
    return max(1.0, summary.misfit), text


def _inside_flags(one: NucleusFit) -> list[bool]:
    return [abs(r) <= 1.0 for _, r in _ratios(one)]


def _ratios(one: NucleusFit) -> list[tuple[int, float]]:
    """Return (unit, deviation in half-widths of its interval) for the units with a line, labile ones left out."""
    out = []
    for k, row in enumerate(one.units.rows):
        if one.terms["has_line"][k] and not one.units.labile[k]:
            half = (row.upper_ppm - row.lower_ppm) / 2
            out.append((k, one.terms["z"][k] * one.units.scale[k] / half if math.isfinite(half) and half > 0 else 0.0))
    return out


def _describe_site(one: NucleusFit, k: int) -> str:
    row = one.units.rows[k]
    if row.nucleus == "13C":
        return f"atom {row.atom} ({_H_WORDS.get(row.attached_h, 'CH4')})"
    return f"H{row.hydrogen} on atom {row.atom}"


def _describe_nuclei(nucleus: str, one: NucleusFit) -> list[tuple[float, str]]:
    digits, out = _DIGITS[nucleus], []
    bad = sorted((r for r in _ratios(one) if abs(r[1]) > _OFF_FROM), key=lambda r: (-abs(r[1]), r[0]))
    for k, ratio in bad[:_MOST_NUCLEI]:
        degrees, z = one.units.degrees[k], one.terms["z"][k]
        weight = float((degrees + 1) / 2 * np.log1p(z * z / degrees))
        expected = one.units.shift[k] + one.offset_ppm
        observed = expected + z * one.units.scale[k]
        start = f"{nucleus}: nothing near {expected:.{digits}f} ppm for" if abs(ratio) > _NOTHING_NEAR_FROM else f"{nucleus}:"
        if abs(ratio) > _NOTHING_NEAR_FROM:
            text = f"{start} {_describe_site(one, k)}; its best line is {observed:.{digits}f}, {abs(ratio):.1f} intervals away"
        else:
            text = (
                f"{start} {_describe_site(one, k)} expected at {expected:.{digits}f}, found at {observed:.{digits}f} ppm, "
                f"{abs(ratio):.1f} times its own interval"
            )
        out.append((weight, text))
    if len(bad) > _MOST_NUCLEI:
        out.append((0.5, f"{nucleus}: {len(bad) - _MOST_NUCLEI} more sites outside their intervals"))
    return out


def _describe_leftovers(nucleus: str, one: NucleusFit) -> list[tuple[float, str]]:
    digits, out = _DIGITS[nucleus], []
    if one.leftover:
        shifts = ", ".join(f"{one.lines.shift[j]:.{digits}f}" for j in one.leftover)
        noun = "line" if len(one.leftover) == 1 else "lines"
        out.append((_WEIGHT_OF_EXTRA * len(one.leftover), f"{nucleus}: {len(one.leftover)} {noun} unexplained ({shifts} ppm)"))
    named: dict[str, list[float]] = {}
    for g, guest in enumerate(one.guests):
        column = one.chosen[len(one.units) + g]
        if column >= 0:
            named.setdefault(guest.name, []).append(one.columns[column].centre_ppm)
    for name, shifts in sorted(named.items()):
        listed = ", ".join(f"{s:.2f}" for s in sorted(shifts, reverse=True))
        out.append((0.4, f"{nucleus}: {listed} ppm named as {name}"))
    if one.second_set:
        listed = ", ".join(f"{one.lines.shift[j]:.{digits}f}" for j, _ in one.second_set)
        out.append((3.0, f"{nucleus}: a second set of lines ({listed} ppm): rotamers, or isomers of it"))
    return out


def _describe_missing(nucleus: str, one: NucleusFit) -> list[tuple[float, str]]:
    digits, out = _DIGITS[nucleus], []
    for k in one.terms["missing"]:
        if one.units.labile[k]:
            continue
        note = one.missing_notes[k]
        weight = -math.log(max(float(one.units.missing[k]), 1e-3))
        expected = one.units.shift[k] + one.offset_ppm
        excuse = f" ({note})" if note else ""
        out.append((weight, f"{nucleus}: nothing near {expected:.{digits}f} ppm for {_describe_site(one, k)}{excuse}"))
    return out


def _describe_found(nucleus: str, one: NucleusFit) -> list[tuple[float, str]]:
    """Labile hydrogens are only told of, never held against a structure."""
    if nucleus != "1H" or not one.units.labile.any():
        return []
    labile = one.units.labile
    seen = int((one.chosen[: len(labile)][labile] >= 0).sum())
    return [(0.2, f"1H: {seen} of {int(labile.sum())} labile sites seen (not held against the structure)")]


def _describe_offset(nucleus: str, one: NucleusFit) -> tuple[float, str]:
    parameters = PARAMETERS[nucleus]
    digits = _DIGITS[nucleus] + 1
    source = "from the solvent line" if one.anchored else "from the lines themselves"
    weight = 0.1 if one.anchored else 0.1 + 0.5 * (one.offset_ppm / parameters.reference_prior_ppm) ** 2
    return weight, f"{nucleus}: reference offset {one.offset_ppm:+.{digits}f} ppm ({source})"


def build_offset_cautions(fit: StructureFit) -> tuple[str, ...]:
    """Return a warning for each list that is off its reference by more than its limit."""
    return tuple(
        f"the {nucleus} list is {one.offset_ppm:+.2f} ppm off its reference "
        f"(limit {PARAMETERS[nucleus].warn_offset_ppm:g} ppm): check the referencing"
        for nucleus, one in fit.nuclei.items()
        if abs(one.offset_ppm) > PARAMETERS[nucleus].warn_offset_ppm
    )
