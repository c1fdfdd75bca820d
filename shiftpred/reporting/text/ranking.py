"""A ranking as text."""

from __future__ import annotations

from shiftpred.records import Ranking
from shiftpred.reporting.summaries import compute_ranking_dict
from shiftpred.reporting.text.comparison import render_record_lines
from shiftpred.reporting.text.layout import DEFAULT_WIDTH, clean_text, render_columns, render_points, render_section
from shiftpred.reporting.wording import format_probability

__all__ = ["render_ranking_text"]


def render_ranking_text(
    ranking: Ranking | dict, sample: str = "", date: str = "", reviewer: str = "", width: int = DEFAULT_WIDTH
) -> str:
    """Show a ranking as text, best candidate first.

    Parameters
    ----------
    ranking : Ranking or dict
        The record, or what `compute_ranking_dict` made of it.
    sample, date, reviewer : str, default ''
    width : int, default 100

    Returns
    -------
    str
    """
    d = ranking if isinstance(ranking, dict) else compute_ranking_dict(ranking, sample, date, reviewer)
    best = min((c["misfit"] for c in d["candidates"] if c["misfit"] is not None), default=0.0)
    rows = [
        (
            str(place),
            c["structure"]["name"],
            c["structure"]["smiles"],
            format_probability(c["probability"]),
            "unbounded" if c["misfit"] is None else f"{c['misfit'] - best:+.1f}",
            str(sum(not a["within_interval"] for a in c["assignments"])),
            str(len(c["unexplained"])),
            str(sum(not m["note"] for m in c["missing"])),
            c["note"],
        )
        for place, c in enumerate(d["candidates"], start=1)
    ]
    rows.append(("", "none of these", "", format_probability(d["none_of_these"]), "", "", "", "", ""))
    heading = ("", "candidate", "structure", "probability", "misfit", "outside", "leftover", "missing", "note")
    lines = [clean_text(d["sample"]), ""] if d["sample"] else []
    lines += ["Candidates, best first", *render_columns(heading, rows, "rllrrrrrl")]
    lines += ["  misfit: minus log likelihood, above the best; outside, leftover, missing: numbers of lines"]
    deciding = [f"{c['structure']['name']}: {c['decided_by']}" for c in d["candidates"] if c["decided_by"]]
    lines += render_section("What would decide", render_points(deciding, width))
    lines += render_section("Why", render_points(d["reasons"], width, numbered=True))
    lines += render_section("Not read", render_points([f"{f['name']}: {f['note']}" for f in d["failures"]], width))
    lines += render_section("Cautions", render_points(d["cautions"], width))
    lines += render_section("Record", render_record_lines(d))
    lines += render_section("Steps", render_points(d["steps"], width, numbered=True))
    return "\n".join(lines) + "\n"
