"""The work behind each route: plain dictionaries in, plain dictionaries out. Runs in a worker process."""

from __future__ import annotations

import re

from shiftpred.errors import InputError, ShiftpredError
from shiftpred.records import NucleusPrediction

__all__ = ["ANSWERS", "build_error", "warm_up"]

_MOST_CANDIDATES = 100


def build_error(error: ShiftpredError) -> dict:
    """Return the four parts of a message, and every place of a peak list that was not understood."""
    found = {
        "where": error.where,
        "came": error.came,
        "would_do": error.would_do,
        "try_next": error.try_next,
        "message": str(error),
    }
    problems = getattr(error, "problems", ())
    return found | {"problems": [{"place": place, "text": text, "reason": reason} for place, text, reason in problems]}


def warm_up() -> None:
    """Load the model and everything that the first answer needs."""
    answer_compare({"structure": "CCO", "c13": "58.0, 18.2", "h1": "", "rivals": 2, "width": 760})


def answer_structure(asked: dict) -> dict:
    from shiftpred.reporting.summaries.common import compute_structure_dict
    from shiftpred.web.pictures import render_linked_structure
    from shiftpred.web.reading import parse_structure_text

    structure = compute_structure_dict(parse_structure_text(asked["structure"]))
    return {"structure": structure, "picture": render_linked_structure(structure)}


def answer_peaks(asked: dict) -> dict:
    """Say how a peak list was understood; what was not is part of the answer, not an error."""
    from shiftpred.peaks.problems import PeakListError
    from shiftpred.reporting.summaries.comparison import build_peak_list_entry
    from shiftpred.web.reading import parse_peak_text

    try:
        found = parse_peak_text(asked["text"], asked["nucleus"])
    except PeakListError as error:
        return {"understood": None, "error": build_error(error)}
    return {"understood": build_peak_list_entry(found) if found else None, "error": None}


def answer_predict(asked: dict) -> dict:
    from shiftpred.pipeline import predict_structures
    from shiftpred.reporting import compute_prediction_dict
    from shiftpred.web.pictures import render_linked_structure
    from shiftpred.web.reading import parse_structure_text

    structure = parse_structure_text(asked["structure"])
    solvent, nucleus, coverage = asked.get("solvent") or None, asked.get("nucleus", "both"), asked.get("coverage", 0.9)
    predictions = predict_structures([structure], nucleus, solvent, coverage)
    document = compute_prediction_dict(predictions, nucleus, predictions[0].solvent, coverage)
    molecule = document["molecules"][0]
    pictures = {
        one: render_linked_structure(molecule["structure"], _collect_shifts(predictions[0].nuclei, one))
        for one in ("13C", "1H")
        if any(n.nucleus == one for n in predictions[0].nuclei)
    }
    return {"prediction": document, "pictures": {"structure": pictures}}


def answer_compare(asked: dict) -> dict:
    from shiftpred.reporting import compute_comparison_dict, render_lane_svg
    from shiftpred.web.pictures import link_lane, render_linked_structure

    comparison = _compare(asked)
    document = compute_comparison_dict(comparison, asked.get("sample", ""))
    if not asked.get("pictures", True):
        return {"comparison": document, "pictures": {"structure": {}, "lanes": {}}}
    nuclei = comparison.prediction.nuclei
    marks = _collect_marks(document)
    structure = {
        one: render_linked_structure(document["structure"], _collect_shifts(nuclei, one), marks[one])
        for one in ("13C", "1H")
        if any(n.nucleus == one for n in nuclei)
    }
    lanes = {one: link_lane(render_lane_svg(document, one, asked["width"]), document, one) for one in document["peaks"]}
    return {"comparison": document, "pictures": {"structure": structure, "lanes": lanes}}


def answer_report(asked: dict) -> dict:
    import datetime

    from shiftpred.reporting import compute_comparison_dict, render_comparison_html, render_prediction_csv

    comparison = _compare(asked)
    if asked["format"] == "csv":
        return {"text": render_prediction_csv([comparison.prediction])}
    document = compute_comparison_dict(comparison, asked.get("sample", ""), datetime.date.today().isoformat())
    return {"text": render_comparison_html(document)}


def answer_rank(asked: dict) -> dict:
    from shiftpred.pipeline import rank_structures
    from shiftpred.reporting import compute_ranking_dict
    from shiftpred.web.reading import parse_candidate_texts

    candidates = parse_candidate_texts(asked["structures"])
    if len(candidates) > _MOST_CANDIDATES:
        raise InputError(
            "structures", f"{len(candidates):,} candidates", f"at most {_MOST_CANDIDATES}", "use `shiftpred rank` for more"
        )
    ranking = rank_structures(candidates, **_read_sample(asked))
    return {"ranking": compute_ranking_dict(ranking, asked.get("sample", ""))}


def answer_explain(asked: dict) -> dict:
    from shiftpred.pipeline import explain
    from shiftpred.reporting import compute_explanation_dict, render_waterfall_svg
    from shiftpred.web.reading import parse_structure_text

    structure = parse_structure_text(asked["structure"])
    if asked["atom"] not in structure.atom_numbers:
        raise InputError(
            "atom",
            str(asked["atom"]),
            f"one of the heavy atoms, {min(structure.atom_numbers)} to {max(structure.atom_numbers)}",
            "click an atom",
        )
    index = structure.atom_numbers.index(asked["atom"])
    found = explain(structure, index, asked["nucleus"], asked.get("solvent") or None, asked.get("coverage", 0.9))
    document = compute_explanation_dict(found)
    return {"explanation": document, "picture": render_waterfall_svg(document["explanations"][0], asked["width"])}


def _compare(asked: dict):
    from shiftpred.pipeline import compare
    from shiftpred.web.reading import parse_structure_text

    structure = parse_structure_text(asked["structure"])
    rivals, confirmed = asked.get("rivals", 9), asked.get("mass_confirmed", False)
    return compare(structure, rivals=rivals, mass_confirmed=confirmed, **_read_sample(asked))


def _read_sample(asked: dict) -> dict:
    """Return the pipeline's keywords; everything that is text has been read when it leaves here."""
    from shiftpred.web.reading import parse_peak_text, parse_structure_text

    return {
        "c13": parse_peak_text(asked.get("c13", ""), "13C"),
        "h1": parse_peak_text(asked.get("h1", ""), "1H"),
        "solvent": asked.get("solvent") or None,
        "coverage": asked.get("coverage", 0.9),
        "frequency_mhz": asked.get("frequency_mhz"),
        "prior": asked.get("prior", 0.5),
        "expected": tuple(parse_structure_text(text, "expected").smiles for text in asked.get("expected", ())),
    }


def _collect_shifts(nuclei: tuple[NucleusPrediction, ...], nucleus: str) -> dict[int, str]:
    """Return what is written beside each atom; two hydrogens of a CH2 stand with a stroke between them."""
    shifts: dict[int, list[str]] = {}
    for n in nuclei:
        if n.nucleus == nucleus:
            shifts.setdefault(n.atom, []).append(f"{n.shift_ppm:.1f}" if nucleus == "13C" else f"{n.shift_ppm:.2f}")
    return {atom: "/".join(dict.fromkeys(texts)) for atom, texts in shifts.items()}


def _collect_marks(document: dict) -> dict[str, dict[int, str]]:
    marks: dict[str, dict[int, str]] = {"13C": {}, "1H": {}}
    for entry in document["missing"]:
        for atom in entry["equivalent_atoms"]:
            marks[entry["nucleus"]][atom] = "missing"
    for entry in document["assignments"]:
        if not entry["within_interval"]:
            for atom in entry["equivalent_atoms"]:
                marks[entry["nucleus"]][atom] = "outside"
    return marks


ANSWERS = {re.sub("^answer_", "", f.__name__): f for f in (
    answer_structure, answer_peaks, answer_predict, answer_compare, answer_report, answer_rank, answer_explain,
)}  # fmt: skip
"""By the last part of the route."""
