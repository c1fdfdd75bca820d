"""A comparison as text for a terminal."""

from __future__ import annotations

from shiftpred.records import Comparison
from shiftpred.reporting.marks import JUDGEMENT_SIGN
from shiftpred.reporting.summaries import compute_comparison_dict
from shiftpred.reporting.text.layout import DEFAULT_WIDTH, clean_text, render_columns, render_points, render_section
from shiftpred.reporting.wording import (
    JUDGEMENT_SENTENCE,
    REASON_CODE_SENTENCE,
    build_setting_lines,
    format_atoms,
    format_count,
    format_interval,
    format_likelihood_ratio,
    format_observed,
    format_probability,
    format_shift,
    format_signed,
    format_site,
)

__all__ = ["render_comparison_text", "render_verdict_line"]


def render_comparison_text(
    comparison: Comparison | dict, sample: str = "", date: str = "", reviewer: str = "", width: int = DEFAULT_WIDTH
) -> str:
    """Show a comparison as text.

    Parameters
    ----------
    comparison : Comparison or dict
        The record, or what `compute_comparison_dict` made of it (then `sample`, `date` and `reviewer` are in it already).
    sample, date, reviewer : str, default ''
        As for `compute_comparison_dict`.
    width : int, default 100
        Sentences are wrapped to it; tables are as wide as they need to be.

    Returns
    -------
    str
        Ends with a line end.
    """
    d = comparison if isinstance(comparison, dict) else compute_comparison_dict(comparison, sample, date, reviewer)
    structure = d["structure"]
    lines = [clean_text("   ".join(filter(None, (d["sample"], structure["smiles"], structure["formula"])))), ""]
    lines += [render_verdict_line(d), JUDGEMENT_SENTENCE[d["judgement"]]]
    if d["reason_code"]:
        lines.append(REASON_CODE_SENTENCE.get(d["reason_code"], d["reason_code"]))
    lines += render_section("Why", render_points(d["reasons"], width, numbered=True))
    for nucleus in ("13C", "1H"):
        lines += render_section(f"Assignment {nucleus}, ppm", render_assignment_lines(d, nucleus))
    lines += render_section("Leftover lines", render_leftover_lines(d))
    lines += render_section("Expected, but no line", render_missing_lines(d))
    lines += render_section("Balance", _render_balance(d))
    lines += render_section("Rivals", _render_rivals(d, width))
    lines += render_section("Reference", _render_offsets(d))
    lines += render_section("About the structure", render_points(structure["notes"], width))
    lines += render_section("About the peaks", render_points(_collect_peak_notes(d), width))
    lines += render_section("Cautions", render_points(d["cautions"], width))
    lines += render_section("Record", render_record_lines(d))
    lines += render_section("Steps", render_points(d["steps"], width, numbered=True))
    return "\n".join(lines) + "\n"


def render_verdict_line(d: dict) -> str:
    """Return the judgement in one line: sign, word, probability, distance to the nearest rival."""
    parts = [f"{JUDGEMENT_SIGN[d['judgement']]} {d['judgement']}", f"probability {format_probability(d['probability'])}"]
    return "   ".join([*parts, *filter(None, [format_likelihood_ratio(d["likelihood_ratio"])])])


def render_assignment_lines(d: dict, nucleus: str) -> list[str]:
    """Return the assignment table of one nucleus, highest shift first."""
    rows = [
        (
            format_atoms(a["equivalent_atoms"], a["hydrogen"]),
            format_site(nucleus, a["attached_h"], len(a["equivalent_atoms"]), a["hydrogen"]),
            format_observed(a["observed_ppm"], nucleus),
            format_shift(a["shift_ppm"], nucleus),
            format_interval(a["lower_ppm"], a["upper_ppm"], nucleus),
            format_signed(a["deviation_ppm"], nucleus),
            "" if a["within_interval"] else "outside",
            format_probability(a["probability"]),
            format_atoms(a["interchangeable_atoms"]),
            a["note"],
        )
        for a in sort_by_observed(d["assignments"], nucleus)
    ]
    heading = (
        "atoms", "site", "observed", "predicted", "interval", "difference", "", "probability", "or atoms", "note",
    )  # fmt: skip
    return render_columns(heading, rows, "llrrrrlrll") if rows else []


def sort_by_observed(entries: list[dict], nucleus: str) -> list[dict]:
    """Return the entries of one nucleus, highest observed shift first, then by atom."""
    chosen = [e for e in entries if e["nucleus"] == nucleus]
    return sorted(chosen, key=lambda e: (-e["observed_ppm"], e.get("atom", 0), e.get("hydrogen", "")))


def render_leftover_lines(d: dict) -> list[str]:
    """Return the table of lines that no nucleus takes."""
    rows = [
        (nucleus, format_observed(u["observed_ppm"], nucleus), u["likely"] or "nothing known fits", u["note"])
        for nucleus in ("13C", "1H")
        for u in sort_by_observed(d["unexplained"], nucleus)
    ]
    return render_columns(("nucleus", "observed", "likely", "note"), rows, "lrll") if rows else []


def render_missing_lines(d: dict) -> list[str]:
    """Return the table of expected nuclei without a line."""
    rows = [
        (
            m["nucleus"],
            format_atoms(m["equivalent_atoms"], m["hydrogen"]),
            format_site(m["nucleus"], m["attached_h"], len(m["equivalent_atoms"]), m["hydrogen"]),
            format_shift(m["shift_ppm"], m["nucleus"]),
            format_interval(m["lower_ppm"], m["upper_ppm"], m["nucleus"]),
            m["note"] or "nothing excuses it",
        )
        for m in d["missing"]
    ]
    return render_columns(("nucleus", "atoms", "site", "predicted", "interval", "note"), rows, "lllrrl") if rows else []


def _render_balance(d: dict) -> list[str]:
    rows = [
        (
            "carbons" if b["nucleus"] == "13C" else "hydrogens",
            *(format_count(b[key]) for key in ("expected", "found", "missing", "excess")),
            f"{format_count(b['labile'])} of those expected may exchange" if b["labile"] else "",
        )
        for b in d["balance"]
    ]
    return render_columns(("", "expected", "found", "missing", "in excess", "note"), rows, "lrrrrl") if rows else []


def _render_rivals(d: dict, width: int) -> list[str]:
    rows = [(r["smiles"], r["how"], r["kind"], format_probability(r["probability"])) for r in d["rivals"]]
    lines = render_columns(("structure", "how", "kind", "probability"), rows, "lllr") if rows else []
    deciding = [f"{r['smiles']}: {r['decided_by']}" for r in d["rivals"] if r["decided_by"]]
    if deciding:
        lines += ["  What would decide:", *render_points(deciding, width)]
    return lines


def _render_offsets(d: dict) -> list[str]:
    return [f"  {n}: offset {format_offset(v, n)} ppm" for n, v in d["reference_offset_ppm"].items() if v is not None]


def format_offset(ppm: float, nucleus: str) -> str:
    """Return a reference offset with one decimal more than a shift has."""
    return f"{ppm:+.{2 if nucleus == '13C' else 3}f}".replace("-", "−")


def _collect_peak_notes(d: dict) -> list[str]:
    return [f"{nucleus}: {note}" for nucleus, peaks in d["peaks"].items() for note in peaks["notes"]]


def render_record_lines(d: dict) -> list[str]:
    """Return what makes the result traceable: model, settings, versions, hash, date, reviewer."""
    libraries = ", ".join(f"{name} {version}" for name, version in d["tool"]["libraries"].items())
    pairs = [
        ("model", d["model"]),
        *build_setting_lines(d["settings"]),
        ("made by", f"shiftpred {d['tool']['version']} ({libraries})"),
        ("input SHA-256", d["input_sha256"] or "not computed"),
        *([("date", d["date"])] if d["date"] else []),
        *([("reviewer", d["reviewer"])] if d["reviewer"] else []),
    ]
    longest = max(len(name) for name, _ in pairs)
    return [f"  {name:<{longest}}  {clean_text(value)}" for name, value in pairs]
