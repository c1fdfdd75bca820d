"""A chemist's own list of candidates, best first."""

from __future__ import annotations

from collections.abc import Sequence

from shiftpred.assignment.describe import build_assignments, build_missing, build_unexplained
from shiftpred.assignment.prepared_peaks import PreparedPeaks
from shiftpred.assignment.structure_fit import StructureFit
from shiftpred.judgement.deciding import build_decision
from shiftpred.judgement.fit_summary import compute_fit_summary
from shiftpred.judgement.judge import compute_input_hash
from shiftpred.judgement.probability import JudgementMap, compute_candidate_probabilities, require_prior
from shiftpred.judgement.reasons import build_offset_cautions, build_reasons
from shiftpred.records import RankedCandidate, Ranking, RecordFailure, Rival, Settings

__all__ = ["build_ranking"]

_SAME_FIT = 0.5
"""Log likelihood below which two candidates are said to fit equally well."""


def build_ranking(
    settings: Settings,
    peaks: dict[str, PreparedPeaks],
    fits: Sequence[StructureFit],
    positions: Sequence[int],
    judgement_map: JudgementMap,
    model: str,
    failures: Sequence[RecordFailure] = (),
    steps: Sequence[str] = (),
) -> Ranking:
    """Rank candidates by how well they explain the same lists.

    Parameters
    ----------
    settings : Settings
    peaks : dict of str to PreparedPeaks
    fits : sequence of StructureFit
        One for each candidate that could be read.
    positions : sequence of int
        0-based position of each in the list as given.
    judgement_map : JudgementMap
    model : str
        Edition of the model.
    failures : sequence of RecordFailure
    steps : sequence of str

    Returns
    -------
    Ranking
        Ties are broken by the position in the list.
    """
    prior = require_prior(settings.prior)
    lists = "+".join(peaks)
    summaries = [compute_fit_summary(f) for f in fits]
    probabilities, none = compute_candidate_probabilities(summaries, lists, judgement_map, [prior] * len(fits))
    order = sorted(range(len(fits)), key=lambda k: (-round(summaries[k].log_evidence, 9), positions[k]))
    ranked = []
    for k in order:
        best = order[0]
        close = k != best and summaries[best].log_evidence - summaries[k].log_evidence < _SAME_FIT
        ranked.append(
            RankedCandidate(
                candidate=positions[k],
                structure=fits[k].prediction.structure,
                probability=probabilities[k],
                misfit=-summaries[k].log_evidence,
                assignments=build_assignments(fits[k]),
                unexplained=build_unexplained(fits[k]),
                missing=build_missing(fits[k]),
                decided_by="" if k == best else _name_candidates(build_decision(fits[best], fits[k])),
                note="fits as well as the first" if close else "",
            )
        )
    reasons = ()
    if order:
        second = None
        margin = None
        if len(order) > 1:
            margin = summaries[order[0]].log_evidence - summaries[order[1]].log_evidence
            second = Rival(fits[order[1]].prediction.structure.smiles, "second of the list", "candidate")
        reasons = build_reasons(fits[order[0]], summaries[order[0]], margin, second, 0.5)
    return Ranking(
        candidates=tuple(ranked),
        none_of_these=none,
        settings=settings,
        model=model,
        reasons=reasons,
        cautions=build_offset_cautions(fits[order[0]]) if order else (),
        peaks={n: p.peak_list for n, p in peaks.items()},
        input_hash=compute_input_hash([f.prediction.structure.text for f in fits], {n: p.peak_list for n, p in peaks.items()}),
        steps=(*steps, f"{len(fits)} candidates compared, {len(failures)} could not be read"),
        failures=tuple(failures),
    )


def _name_candidates(decision: str) -> str:
    """In a list of candidates there is no proposal: say 'the first' for the best one and 'this one' for the other."""
    return decision.replace("the proposal", "the first").replace("the rival", "this one")
