"""What cannot be a peak list of this nucleus in ppm is refused; what is unusual is noted."""

from __future__ import annotations

import math
import re
from dataclasses import replace

from shiftpred.peaks.problems import PeakListError
from shiftpred.records import PeakList

__all__ = ["ACCEPTED_PPM", "compute_duplicate_notes", "require_plausible"]

ACCEPTED_PPM = {"13C": (-150.0, 400.0), "1H": (-40.0, 25.0)}
"""Beyond these a shift is refused. 13C from triiodomethane (-140) to carbene complexes (360), 1H from metal hydrides (-30) to
short hydrogen bonds (20); all from memory."""
_USUAL_PPM = {"13C": (-60.0, 240.0), "1H": (-3.0, 17.0)}
"""Beyond these a shift is noted."""
_HIGHEST_OF_A_PROTON_LIST = 13.5
_LOWEST_OF_A_CARBON_LIST = 25.0


def require_plausible(found: PeakList, where: str) -> PeakList:
    """Refuse what cannot be a list of this nucleus in ppm.

    Parameters
    ----------
    found : PeakList
    where : str
        Name of the argument, for messages.

    Returns
    -------
    PeakList
        With notes on what is unusual.

    Raises
    ------
    PeakError
        Shifts that are not finite, outside any range, in Hz, or of the other nucleus; `.problems` lists them all.
    """
    _require_finite(found, where)
    _require_own_nucleus(found, where)
    _require_range(found, where)
    notes = list(found.notes)
    low, high = _USUAL_PPM[found.nucleus]
    odd = [p for p in found.peaks if p.lower_ppm < low or p.upper_ppm > high]
    notes += [f"{found.nucleus} {p.shift_ppm:g} (peak {p.position}) is unusual: check sign and decimal point" for p in odd[:5]]
    for peak in found.peaks:
        if peak.pair_ppm is not None:
            other = "1H" if found.nucleus == "13C" else "13C"
            low, high = ACCEPTED_PPM[other]
            if not low <= peak.pair_ppm <= high:
                raise _problem(
                    where,
                    peak,
                    f"the paired {other} shift {peak.pair_ppm:g} is outside any range",
                    f"{other} shifts from {low:g} to {high:g} ppm",
                    "write pairs as 13C/1H, '60.9/4.38'",
                )
    return replace(found, notes=(*notes, *compute_duplicate_notes(found)))


def compute_duplicate_notes(found: PeakList) -> list[str]:
    """Return one note for every shift that is listed twice."""
    seen: dict[float, int] = {}
    notes = []
    for peak in found.peaks:
        if peak.is_range:
            continue
        if peak.shift_ppm in seen:
            notes.append(
                f"{found.nucleus} {peak.shift_ppm:g} is listed twice (peaks {seen[peak.shift_ppm]} and {peak.position})"
            )
        seen.setdefault(peak.shift_ppm, peak.position)
    return notes


def _problem(where, peak, came, would_do, try_next, more=()):
    snippet = peak.text or f"{peak.shift_ppm:g}"
    problems = [(f"peak {p.position}", p.text or f"{p.shift_ppm:g}", reason) for p, reason in [(peak, came), *more]]
    others = f" (and {len(more)} more)" if more else ""
    return PeakListError(f"{where}, peak {peak.position}", f"'{snippet[:60]}': {came}{others}", would_do, try_next, problems)


def _require_finite(found: PeakList, where: str) -> None:
    bad = [p for p in found.peaks if not all(map(math.isfinite, (p.shift_ppm, p.lower_ppm, p.upper_ppm)))]
    if bad:
        reason = "not a finite number"
        raise _problem(where, bad[0], reason, "a finite number", "remove or correct that peak", [(p, reason) for p in bad[1:]])


def _require_own_nucleus(found: PeakList, where: str) -> None:
    """Tell a 13C list from a 1H list by its middle, its highest shift, and hydrogens counted in brackets."""
    shifts = sorted(p.shift_ppm for p in found.peaks)
    middle, highest = shifts[(len(shifts) - 1) // 2], shifts[-1]
    counted = sum(bool(re.search(r"(?<![\w.])\d{1,2}\s?H\b", p.text)) for p in found.peaks)
    if found.nucleus == "1H" and len(shifts) > 1 and middle > _LOWEST_OF_A_CARBON_LIST and highest < 300:
        came = f"shifts up to {highest:g} ppm, half of them above {_LOWEST_OF_A_CARBON_LIST:g}, which look like a 13C list"
        raise PeakListError(where, came, "1H shifts in ppm", "give them as --c13", [("whole list", "", came)])
    if found.nucleus == "13C" and -5 < shifts[0] and highest < _HIGHEST_OF_A_PROTON_LIST and (len(shifts) > 2 or counted):
        came = f"shifts of {shifts[0]:g} to {highest:g} ppm, which look like a 1H list"
        raise PeakListError(where, came, "13C shifts in ppm", "give them as --h1", [("whole list", "", came)])


def _require_range(found: PeakList, where: str) -> None:
    low, high = ACCEPTED_PPM[found.nucleus]
    outside = [p for p in found.peaks if p.lower_ppm < low or p.upper_ppm > high]
    if not outside:
        return
    reasons = []
    for peak in outside:
        far = max(abs(peak.lower_ppm), abs(peak.upper_ppm))
        if far > (400 if found.nucleus == "13C" else 300):
            reasons.append("Hz instead of ppm?")
        elif found.nucleus == "1H" and 25 < far:
            reasons.append("outside any 1H range; a 13C shift, or Hz?")
        else:
            reasons.append("outside any range")
    hertz = reasons[0].startswith("Hz")
    negative = sum(p.shift_ppm < 0 for p in found.peaks) > len(found.peaks) / 2
    advice = "divide Hz by the spectrometer frequency in MHz" if hertz else "check decimal points and the nucleus"
    if negative:
        advice = "leave out the hyphens before the numbers"
    raise _problem(
        where,
        outside[0],
        reasons[0],
        f"{found.nucleus} shifts from {low:g} to {high:g} ppm",
        advice,
        list(zip(outside[1:], reasons[1:])),
    )
