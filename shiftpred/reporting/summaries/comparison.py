"""`Comparison` → the contract's dictionary (schemas/comparison-1.json)."""

from __future__ import annotations

from dataclasses import asdict

from shiftpred.records import Assignment, Comparison, Missing, Peak, PeakList, Rival, Unexplained
from shiftpred.reporting.summaries.common import (
    CAUTION,
    SCHEMA_VERSION,
    build_nucleus_entry,
    choose_sample_name,
    compute_number,
    compute_probability,
    compute_significant,
    compute_structure_dict,
    compute_tool_dict,
)

__all__ = [
    "build_assignment_entry",
    "build_missing_entry",
    "build_peak_list_entry",
    "build_unexplained_entry",
    "compute_comparison_dict",
]


def compute_comparison_dict(comparison: Comparison, sample: str = "", date: str = "", reviewer: str = "") -> dict:
    """Put a comparison into the plain dictionary from which JSON, text and page are made.

    Parameters
    ----------
    comparison : Comparison
    sample : str, default ''
        Name of the sample; '' takes the structure's own name.
    date : str, default ''
        Date of the report in ISO form; '' leaves it out, so that equal input gives equal output.
    reviewer : str, default ''
        Name of the person who reviews the report; '' leaves a line to write on.

    Returns
    -------
    dict
        Keys and meanings as in `schemas/comparison-1.json`; only dict, list, str, int, float, bool and None inside.
        An unbounded end of an interval and an unbounded likelihood ratio are None.
    """
    return {
        "schema_version": SCHEMA_VERSION,
        "kind": "comparison",
        "tool": compute_tool_dict(),
        "model": comparison.prediction.model,
        "sample": choose_sample_name(sample, comparison.structure),
        "date": date,
        "reviewer": reviewer,
        "input_sha256": comparison.input_hash,
        "structure": compute_structure_dict(comparison.structure),
        "settings": asdict(comparison.settings) | {"expected": list(comparison.settings.expected)},
        "judgement": comparison.judgement,
        "reason_code": comparison.reason_code,
        "probability": compute_probability(comparison.probability),
        "likelihood_ratio": compute_significant(comparison.likelihood_ratio),
        "reasons": list(comparison.reasons),
        "assignments": [build_assignment_entry(a, comparison.peaks) for a in comparison.assignments],
        "unexplained": [build_unexplained_entry(line) for line in comparison.unexplained],
        "missing": [build_missing_entry(m) for m in comparison.missing],
        "balance": [
            {"nucleus": b.nucleus}
            | {key: compute_number(getattr(b, key), 2) for key in ("expected", "found", "missing", "excess", "labile")}
            for b in comparison.balance
        ],
        "reference_offset_ppm": {n: compute_number(v) for n, v in comparison.reference_offset_ppm.items()},
        "rivals": [_build_rival(r) for r in comparison.rivals],
        "cautions": list(dict.fromkeys((*comparison.cautions, CAUTION))),
        "predicted": [build_nucleus_entry(n) for n in comparison.prediction.nuclei],
        "peaks": {nucleus: build_peak_list_entry(peaks) for nucleus, peaks in comparison.peaks.items()},
        "steps": list(comparison.steps),
    }


def build_assignment_entry(assignment: Assignment, peaks: dict[str, PeakList]) -> dict:
    """Return one observed peak on one set of equivalent nuclei."""
    given = peaks[assignment.nucleus].peaks if assignment.nucleus in peaks else ()
    position = given[assignment.peak].position if assignment.peak < len(given) else 0
    return {
        "nucleus": assignment.nucleus,
        "atom": assignment.atom,
        "equivalent_atoms": list(assignment.equivalent_atoms),
        "hydrogen": assignment.hydrogen,
        "attached_h": assignment.attached_h,
        "shift_ppm": compute_number(assignment.shift_ppm),
        "lower_ppm": compute_number(assignment.lower_ppm),
        "upper_ppm": compute_number(assignment.upper_ppm),
        "observed_ppm": compute_number(assignment.observed_ppm),
        "deviation_ppm": compute_number(assignment.deviation_ppm),
        "within_interval": bool(assignment.within_interval),
        "probability": compute_probability(assignment.probability),
        "interchangeable_atoms": list(assignment.interchangeable),
        "position": position or assignment.peak + 1,
        "note": assignment.note,
    }


def build_unexplained_entry(line: Unexplained) -> dict:
    """Return one line that no nucleus of the structure takes."""
    return {
        "nucleus": line.nucleus,
        "observed_ppm": compute_number(line.observed_ppm),
        "likely": line.likely,
        "note": line.note,
    }


def build_missing_entry(missing: Missing) -> dict:
    """Return expected nuclei without an observed line."""
    return {
        "nucleus": missing.nucleus,
        "atom": missing.atom,
        "equivalent_atoms": list(missing.equivalent_atoms),
        "hydrogen": missing.hydrogen,
        "attached_h": missing.attached_h,
        "shift_ppm": compute_number(missing.shift_ppm),
        "lower_ppm": compute_number(missing.lower_ppm),
        "upper_ppm": compute_number(missing.upper_ppm),
        "note": missing.note,
    }


def _build_rival(rival: Rival) -> dict:
    return {
        "smiles": rival.smiles,
        "how": rival.how,
        "kind": rival.kind,
        "probability": compute_probability(rival.probability),
        "log_likelihood": compute_number(rival.log_likelihood),
        "decided_by": rival.decided_by,
    }


def build_peak_list_entry(peaks: PeakList) -> dict:
    """Return a peak list as it was given and as it was read."""
    return {
        "text": peaks.text,
        "solvent": peaks.solvent,
        "frequency_mhz": compute_number(peaks.frequency_mhz),
        "notes": list(peaks.notes),
        "lines": [_build_peak(p, i) for i, p in enumerate(peaks.peaks, start=1)],
    }


def _build_peak(peak: Peak, place: int) -> dict:
    return {
        "position": peak.position or place,
        "shift_ppm": compute_number(peak.shift_ppm),
        "lower_ppm": compute_number(peak.lower_ppm),
        "upper_ppm": compute_number(peak.upper_ppm),
        "hydrogens": compute_number(peak.hydrogens, 2),
        "attached_h": peak.attached_h,
        "carbons": peak.carbons,
        "multiplicity": peak.multiplicity,
        "couplings_hz": [compute_number(j, 3) for j in peak.couplings_hz],
        "pair_ppm": compute_number(peak.pair_ppm),
        "assignment": list(peak.assignment),
        "text": peak.text,
    }
