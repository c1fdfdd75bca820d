"""Write a peak list the way journals print it."""

from __future__ import annotations

from shiftpred.records import Peak, PeakList

__all__ = ["render_journal_text"]

_KIND = ("C", "CH", "CH2", "CH3")


def render_journal_text(peaks: PeakList) -> str:
    """Return journal text that `parse_journal_text` reads back to the same values.

    Parameters
    ----------
    peaks : PeakList

    Returns
    -------
    str
        Heading and list. The user's own atom numbers (`Peak.assignment`) have no place in journal text and are left out.

    Examples
    --------
    >>> one = Peak("1H", 4.38, 4.38, 4.38, hydrogens=2.0, multiplicity="q", couplings_hz=(7.1,))
    >>> render_journal_text(PeakList("1H", (one,), "CDCl3", 400.0))
    '1H NMR (400 MHz, CDCl3) δ 4.38 (q, J = 7.1 Hz, 2H).'
    """
    conditions = [f"{_plain(peaks.frequency_mhz)} MHz"] if peaks.frequency_mhz else []
    conditions += [peaks.solvent] if peaks.solvent else []
    heading = f"{peaks.nucleus} NMR" + (f" ({', '.join(conditions)})" if conditions else "")
    return f"{heading} δ " + ", ".join(_render_peak(p) for p in peaks.peaks) + "."


def _plain(value: float) -> str:
    """Return the shortest decimal form, without an exponent."""
    text = f"{value:.10f}".rstrip("0").rstrip(".")
    return "0" if text in ("-0", "") else text


def _render_peak(peak: Peak) -> str:
    text = f"{_plain(peak.upper_ppm)}–{_plain(peak.lower_ppm)}" if peak.is_range else _plain(peak.shift_ppm)
    if peak.pair_ppm is not None:
        pair = _plain(peak.pair_ppm)
        text += f"/{pair}" if "." in pair else f"/{pair}.0"
    inside = [peak.multiplicity] if peak.multiplicity else []
    if peak.couplings_hz:
        inside.append("J = " + ", ".join(_plain(j) for j in peak.couplings_hz) + " Hz")
    if peak.hydrogens is not None:
        inside.append(f"{_plain(peak.hydrogens)}H")
    if peak.carbons is not None:
        inside.append(f"{peak.carbons}C")
    if peak.attached_h is not None:
        inside.append(_KIND[peak.attached_h])
    return text + (f" ({', '.join(inside)})" if inside else "")
