"""`Ranking` → dictionary (schemas/ranking-1.json)."""

from __future__ import annotations

from dataclasses import asdict

from shiftpred.records import RankedCandidate, Ranking
from shiftpred.reporting.summaries.common import (
    CAUTION,
    SCHEMA_VERSION,
    compute_number,
    compute_probability,
    compute_structure_dict,
    compute_tool_dict,
)
from shiftpred.reporting.summaries.comparison import (
    build_assignment_entry,
    build_missing_entry,
    build_peak_list_entry,
    build_unexplained_entry,
)

__all__ = ["compute_ranking_dict"]


def compute_ranking_dict(ranking: Ranking, sample: str = "", date: str = "", reviewer: str = "") -> dict:
    """Put a ranking into one plain dictionary.

    Parameters
    ----------
    ranking : Ranking
    sample, date, reviewer : str, default ''
        Name of the sample, date in ISO form, name of the person who reviews the report; '' leaves them out.

    Returns
    -------
    dict
        As in `schemas/ranking-1.json`; candidates best first.
    """
    return {
        "schema_version": SCHEMA_VERSION,
        "kind": "ranking",
        "tool": compute_tool_dict(),
        "model": ranking.model,
        "sample": sample,
        "date": date,
        "reviewer": reviewer,
        "input_sha256": ranking.input_hash,
        "settings": asdict(ranking.settings) | {"expected": list(ranking.settings.expected)},
        "candidates": [_build_candidate(c, ranking) for c in ranking.candidates],
        "none_of_these": compute_probability(ranking.none_of_these),
        "failures": [{"name": f.name, "note": str(f.error)} for f in ranking.failures],
        "reasons": list(ranking.reasons),
        "cautions": list(dict.fromkeys((*ranking.cautions, CAUTION))),
        "peaks": {nucleus: build_peak_list_entry(peaks) for nucleus, peaks in ranking.peaks.items()},
        "steps": list(ranking.steps),
    }


def _build_candidate(candidate: RankedCandidate, ranking: Ranking) -> dict:
    return {
        "candidate": candidate.candidate,
        "structure": compute_structure_dict(candidate.structure),
        "probability": compute_probability(candidate.probability),
        "misfit": compute_number(candidate.misfit),
        "assignments": [build_assignment_entry(a, ranking.peaks) for a in candidate.assignments],
        "unexplained": [build_unexplained_entry(line) for line in candidate.unexplained],
        "missing": [build_missing_entry(m) for m in candidate.missing],
        "decided_by": candidate.decided_by,
        "note": candidate.note,
    }
