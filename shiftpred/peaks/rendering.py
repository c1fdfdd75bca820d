"""Write a peak list the way journals print it."""

from __future__ import annotations

from shiftpred.records import Peak, PeakList

__all__ = ["render_journal_text"]


def render_journal_text(peaks: PeakList) -> str:
    """Return journal text that `parse_journal_text` reads back to the same values."""
    conditions = [f"{peaks.frequency_mhz:g} MHz"] if peaks.frequency_mhz else []
    conditions += [peaks.solvent] if peaks.solvent else []
    heading = f"{peaks.nucleus} NMR" + (f" ({', '.join(conditions)})" if conditions else "")
    return f"{heading} δ " + ", ".join(_render_peak(p) for p in peaks.peaks) + "."


def _render_peak(peak: Peak) -> str:
    text = f"{peak.upper_ppm:g}–{peak.lower_ppm:g}" if peak.is_range else f"{peak.shift_ppm:g}"
    if peak.pair_ppm is not None:
        text += f"/{peak.pair_ppm:.6g}" if "." in f"{peak.pair_ppm:.6g}" else f"/{peak.pair_ppm:.1f}"
    inside = [peak.multiplicity] if peak.multiplicity else []
    if peak.couplings_hz:
        inside.append("J = " + ", ".join(f"{j:g}" for j in peak.couplings_hz) + " Hz")
    if peak.hydrogens is not None:
        inside.append(f"{peak.hydrogens:g}H")
    if peak.carbons is not None:
        inside.append(f"{peak.carbons}C")
    if peak.attached_h is not None:
        inside.append(("C", "CH", "CH2", "CH3")[peak.attached_h])
    return text + (f" ({', '.join(inside)})" if inside else "")
