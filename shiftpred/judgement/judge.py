"""From fits to a judgement: probability, supported / open / contradicted, reasons, rivals."""

from __future__ import annotations

import hashlib
import math
from collections.abc import Sequence
from dataclasses import replace

from rdkit import Chem

from shiftpred.assignment.describe import build_assignments, build_balance, build_missing, build_unexplained
from shiftpred.assignment.prepared_peaks import PreparedPeaks
from shiftpred.assignment.structure_fit import StructureFit
from shiftpred.judgement.deciding import build_decision
from shiftpred.judgement.fit_summary import FEATURES, FitSummary, compute_features, compute_fit_summary
from shiftpred.judgement.probability import JudgementMap, compute_candidate_probabilities, require_prior
from shiftpred.judgement.reasons import build_offset_cautions, build_reasons
from shiftpred.records import Comparison, PeakList, Rival, Settings, Structure

__all__ = ["build_comparison", "compute_input_hash", "decide_judgement"]

_OVERWHELMED, _DOUBTED = 8.0, 0.3
"""A structure is contradicted, too, where a rival fits e^8 (3,000) times better and its probability is at most this: on the 500
calibration compounds that called 1 % more near relatives contradicted and no right structure."""
_NOVEL_FROM = 0.3
"""Share of sites unlike the training data from which an open judgement is put down to that."""
_MIXTURE_FROM = 2
"""Unexplained lines from which a mixture is suspected."""
_IONISED_BETTER_BY = 3.0
"""Log likelihood by which an ionised form must fit better before it is mentioned."""
_CLEARLY_BETTER = math.log(3.0)
"""Log likelihood by which a structure must beat its nearest rival before it is supported, whatever its probability; a ratio
below 3 is not worth more than a bare mention (Kass and Raftery, J. Am. Stat. Assoc. 1995, 90, 773)."""
_FEWEST_LINES = 0.5
"""Lines for each set of equivalent nuclei below which a list is too short to decide (common practice, no source)."""
_DECISIONS = 5
"""Rivals, nearest first, for which what would decide is worked out."""


def decide_judgement(
    summaries: Sequence[FitSummary], lists: str, judgement_map: JudgementMap, prior: float, several_components: bool = False
) -> tuple[str, str, float]:
    """Return judgement, reason code and probability of the first of `summaries` against the others.

    Parameters
    ----------
    summaries : sequence of FitSummary
        The proposal, then its rivals.
    lists : str
        '13C', '1H' or '13C+1H'.
    judgement_map : JudgementMap
    prior : float
    several_components : bool
        True for a salt or mixture as proposal.
    """
    summaries, own = list(summaries), summaries[0]
    features = compute_features(summaries, 0)
    probability = judgement_map.compute_probability(lists, features, prior)
    margin = own.log_evidence - max((s.log_evidence for s in summaries[1:]), default=-math.inf)
    gate = judgement_map.gate
    passes = (
        own.misfit <= gate["misfit"]
        and own.worst <= gate["worst"]
        and own.extra <= gate["extra"]
        and own.missing <= gate["missing"]
        and own.lines > 0
        # Lines that belong to solvents and impurities alone say nothing for a structure.
        and (own.assigned < 0 or own.assigned >= max(1, _FEWEST_LINES * own.units))
    )
    if probability >= judgement_map.supported_from and passes and margin >= _CLEARLY_BETTER:
        return "supported", "", probability
    if probability <= judgement_map.contradicted_to or (margin <= -_OVERWHELMED and probability <= _DOUBTED):
        return "contradicted", "", probability
    alone = judgement_map.compute_probability(lists, compute_features([own], 0), prior)
    if own.novel >= _NOVEL_FROM:
        code = "outside_training_data"
    elif own.extra >= _MIXTURE_FROM or (several_components and alone < judgement_map.supported_from):
        code = "mixture_or_salt"
    elif own.lines < _FEWEST_LINES * own.units or 0 <= own.assigned < max(1, _FEWEST_LINES * own.units):
        code = "too_little_evidence"
    elif alone >= judgement_map.supported_from or margin < _CLEARLY_BETTER:
        code = "rival_fits"
    else:
        code = "too_little_evidence"
    return "open", code, probability


def build_comparison(
    structure: Structure,
    settings: Settings,
    peaks: dict[str, PreparedPeaks],
    fits: Sequence[StructureFit],
    rivals: Sequence[Rival],
    judgement_map: JudgementMap,
    ionised: Sequence[tuple[StructureFit, str]] = (),
    steps: Sequence[str] = (),
) -> Comparison:
    """Judge a proposal against its rivals.

    Parameters
    ----------
    structure : Structure
    settings : Settings
    peaks : dict of str to PreparedPeaks
    fits : sequence of StructureFit
        Of the proposal, then of each rival, to the same lists.
    rivals : sequence of Rival
        As many as `fits` less one, in their order.
    judgement_map : JudgementMap
    ionised : sequence of (StructureFit, str)
        Fits of the proposal's ionised forms and what was done to it, in words.
    steps : sequence of str
        What was done before.

    Returns
    -------
    Comparison
    """
    prior = require_prior(settings.prior)
    proposal, lists = fits[0], "+".join(peaks)
    summaries = [compute_fit_summary(f) for f in fits]
    several = len(Chem.GetMolFrags(structure.mol)) > 1
    judgement, code, probability = decide_judgement(summaries, lists, judgement_map, prior, several)
    order = sorted(range(1, len(fits)), key=lambda k: (-summaries[k].log_evidence, rivals[k - 1].smiles))
    margin = summaries[0].log_evidence - summaries[order[0]].log_evidence if order else None
    shares = _share_among_rivals(summaries, lists, judgement_map, prior, probability)
    described = tuple(
        replace(
            rivals[k - 1],
            probability=shares[k],
            log_likelihood=summaries[k].log_evidence,
            decided_by=build_decision(proposal, fits[k]) if place < _DECISIONS else "",
        )
        for place, k in enumerate(order)
    )
    reasons = build_reasons(
        proposal, summaries[0], margin, described[0] if described else None, _worth_of_margin(judgement_map, lists)
    )
    return Comparison(
        structure=structure,
        settings=settings,
        judgement=judgement,
        reason_code=code,
        probability=probability,
        likelihood_ratio=math.exp(min(max(margin, -700.0), 700.0)) if margin is not None else math.inf,
        reasons=_put_judgement_first(judgement, code, described, reasons, margin),
        assignments=build_assignments(proposal),
        unexplained=build_unexplained(proposal),
        missing=build_missing(proposal),
        balance=build_balance(proposal),
        reference_offset_ppm={n: round(f.offset_ppm, 4) for n, f in proposal.nuclei.items()},
        rivals=described,
        cautions=_build_cautions(proposal, peaks, settings, ionised, several),
        prediction=proposal.prediction,
        peaks={n: p.peak_list for n, p in peaks.items()},
        input_hash=compute_input_hash([structure.text], {n: p.peak_list for n, p in peaks.items()}),
        steps=(*steps, *_build_steps(proposal, peaks, fits, settings, judgement_map, lists)),
    )


def _worth_of_margin(judgement_map: JudgementMap, lists: str) -> float:
    return max(0.05, judgement_map.maps[lists]["weights"].get(FEATURES[0], 0.5))


def _share_among_rivals(summaries, lists, judgement_map, prior, probability) -> list[float]:
    """Return the probability of each; the rivals share what the proposal leaves, and 'none of these' has the rest."""
    if len(summaries) == 1:
        return [probability]
    raw, _ = compute_candidate_probabilities(summaries, lists, judgement_map, [prior] * len(summaries))
    left, claimed = 1.0 - probability, sum(raw[1:])
    scale = min(1.0, 0.999 * left / claimed) if claimed > 0 else 0.0
    return [probability, *(p * scale for p in raw[1:])]


_CODE_WORDS = {
    "too_little_evidence": "open: the lines are too few or fit too loosely to decide",
    "rival_fits": "open: a rival fits about as well",
    "mixture_or_salt": "open: lines remain that suggest a mixture, a salt or a second compound",
    "outside_training_data": "open: the structure is unlike the training data, so its intervals say little",
}


def _put_judgement_first(judgement, code, rivals, reasons, margin) -> tuple[str, ...]:
    """An open judgement starts with why it is open, and with what would decide it."""
    if judgement != "open":
        return reasons
    first = [_CODE_WORDS[code]]
    if code == "rival_fits" and margin is not None and margin < -_CLEARLY_BETTER:
        first[0] = "open: a rival fits better, but not so much that the lines exclude the proposal"
    if code == "rival_fits" and rivals:
        first[0] += f" ({rivals[0].smiles}, {rivals[0].how}); {rivals[0].decided_by}"
    return (*first, *reasons)


def _build_cautions(proposal, peaks, settings, ionised, several) -> tuple[str, ...]:
    out = list(build_offset_cautions(proposal))
    best = max(ionised, key=lambda i: i[0].log_evidence, default=None)
    if best is not None and best[0].log_evidence > proposal.log_evidence + _IONISED_BETTER_BY:
        times = math.exp(min(best[0].log_evidence - proposal.log_evidence, 14.0))
        out.append(f"the ionised form ({best[1]}) fits {times:,.0f} times better: the sample may be a salt, or the pH differs")
    if several:
        out.append("salt or mixture: the lines of every component were expected")
    if "13C" not in peaks:
        out.append("no 13C list: judged by 1H alone, which tells close isomers apart less well")
    if settings.solvent is None and not any(p.peak_list.solvent for p in peaks.values()):
        out.append("solvent not given: solvent lines cannot fix the reference")
    for nucleus, one in proposal.nuclei.items():
        for name in one.impurities:
            bare = name.removeprefix("possibly ")
            out.append(f"{nucleus}: {'possibly ' if bare != name else ''}{bare} in the tube")
    for prepared in peaks.values():
        out += [note for note in prepared.peak_list.notes]
    out += list(proposal.prediction.notes)
    return tuple(dict.fromkeys(out))


def _build_steps(proposal, peaks, fits, settings, judgement_map, lists) -> tuple[str, ...]:
    steps = []
    for nucleus, one in proposal.nuclei.items():
        n = len(one.units)
        assigned = int((one.chosen[:n] >= 0).sum())
        shared = int((one.sharing[:n] >= 0).sum())
        guests = int((one.chosen[n:] >= 0).sum())
        steps.append(
            f"{nucleus}: {len(one.lines)} lines, {n} sets of equivalent nuclei; {assigned} assigned, {shared} share a "
            f"line, {len(one.terms['missing'])} missing; {guests} solvent, water or impurity, {len(one.leftover)} unexplained"
        )
    steps.append(f"compared with {len(fits) - 1} rivals; prior {settings.prior:g}; map for {lists}")
    steps.append(
        f"supported from {judgement_map.supported_from:g}, contradicted up to {judgement_map.contradicted_to:g}; "
        f"absolute fit: {', '.join(f'{k} up to {v:g}' for k, v in judgement_map.gate.items())}"
    )
    return tuple(steps)


def compute_input_hash(structure_texts: Sequence[str], peaks: dict[str, PeakList]) -> str:
    """Return the SHA-256 of structure texts and peak lists as given."""
    digest = hashlib.sha256()
    for text in structure_texts:
        digest.update(text.encode() + b"\0")
    for nucleus in sorted(peaks):
        listed = peaks[nucleus].text or " ".join(p.text or f"{p.shift_ppm:g}" for p in peaks[nucleus].peaks)
        digest.update(f"{nucleus}\0{listed}\0".encode())
    return digest.hexdigest()
