"""`Explanation` → dictionary (schemas/explanation-1.json)."""

from __future__ import annotations

from collections.abc import Iterable

from shiftpred.records import Contribution, Explanation
from shiftpred.reporting.summaries.common import (
    CAUTION,
    SCHEMA_VERSION,
    compute_number,
    compute_significant,
    compute_structure_dict,
    compute_tool_dict,
)

__all__ = ["compute_explanation_dict"]


def compute_explanation_dict(explanations: Explanation | Iterable[Explanation], date: str = "") -> dict:
    """Put explanations of one structure into one plain dictionary.

    Parameters
    ----------
    explanations : Explanation or iterable of Explanation
        All of the same structure (one atom's 13C and 1H shift, say); at least one.
    date : str, default ''
        Date in ISO form; '' leaves it out.

    Returns
    -------
    dict
        As in `schemas/explanation-1.json`. The contributions are not rounded: they add up to `shift_ppm`.
    """
    explanations = [explanations] if isinstance(explanations, Explanation) else list(explanations)
    first = explanations[0]
    return {
        "schema_version": SCHEMA_VERSION,
        "kind": "explanation",
        "tool": compute_tool_dict(),
        "model": first.model,
        "date": date,
        "structure": compute_structure_dict(first.structure),
        "explanations": [_build_explanation(e) for e in explanations],
        "cautions": [CAUTION],
    }


def _build_explanation(explanation: Explanation) -> dict:
    return {
        "nucleus": explanation.nucleus,
        "atom": explanation.atom,
        "shift_ppm": float(explanation.shift_ppm),
        "lower_ppm": compute_number(explanation.lower_ppm),
        "upper_ppm": compute_number(explanation.upper_ppm),
        "coverage": explanation.coverage,
        "contributions": [_build_contribution(c) for c in explanation.contributions],
        "notes": list(explanation.notes),
    }


def _build_contribution(contribution: Contribution) -> dict:
    return {
        "label": contribution.label,
        "kind": contribution.kind,
        "position": contribution.position,
        "group": contribution.group,
        "atoms": list(contribution.atoms),
        "constants": {name: compute_significant(value) for name, value in contribution.constants.items()},
        "contribution_ppm": float(contribution.contribution_ppm),
        "flag": contribution.flag,
    }
