"""Dictionaries → one self-contained HTML file each: no script, nothing from outside, everything escaped."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator
from functools import cache

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from shiftpred.records import Comparison, Explanation, MoleculePrediction, Ranking, RecordFailure
from shiftpred.reporting.pictures import (
    render_deviation_svg,
    render_judgement_svg,
    render_lane_svg,
    render_structure_svg,
    render_waterfall_svg,
)
from shiftpred.reporting.pictures.lane import build_lane_key
from shiftpred.reporting.summaries import (
    build_failure_entry,
    build_prediction_entry,
    compute_comparison_dict,
    compute_explanation_dict,
    compute_prediction_dict,
    compute_ranking_dict,
)
from shiftpred.reporting.text.comparison import format_offset, sort_by_observed
from shiftpred.reporting.text.explanation import format_constants, format_ppm
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

__all__ = [
    "iterate_prediction_html",
    "render_comparison_html",
    "render_explanation_html",
    "render_prediction_html",
    "render_ranking_html",
]

WIDE, NARROW, PAPER = 1040, 340, 720
"""Widths of the drawings of one lane: desk, telephone, paper; the page shows the one that fits."""
_MOST_BESIDE = 4
"""Candidates that are set side by side line by line."""


@cache
def _environment() -> Environment:
    environment = Environment(
        loader=PackageLoader("shiftpred.reporting", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.globals.update(
        atoms=format_atoms,
        constants=format_constants,
        count=format_count,
        gauge=lambda *values: _embed(render_deviation_svg(*values)),
        interval=format_interval,
        judgement_sign=lambda judgement: _embed(render_judgement_svg(judgement)),
        observed=format_observed,
        ppm=format_ppm,
        probability=format_probability,
        setting_lines=build_setting_lines,
        shift=format_shift,
        signed=format_signed,
        site=format_site,
    )
    return environment


def _embed(svg: str) -> Markup:
    """Mark a picture of ours as safe; inside a page it needs no namespace."""
    return Markup(svg.replace(' xmlns="http://www.w3.org/2000/svg"', "", 1))


def _is_large(svg: str) -> bool:
    """Say whether a drawing needs the whole width of the page (and is scrolled on a telephone)."""
    return float(re.search(r' width="([\d.]+)"', svg)[1]) > 520


def render_comparison_html(comparison: Comparison | dict, sample: str = "", date: str = "", reviewer: str = "") -> str:
    """Return the report of a comparison as one HTML file.

    Parameters
    ----------
    comparison : Comparison or dict
        The record, or what `compute_comparison_dict` made of it (then `sample`, `date` and `reviewer` are in it already).
    sample, date, reviewer : str, default ''
        As for `compute_comparison_dict`.

    Returns
    -------
    str
        HTML that loads nothing, runs nothing, and reads on paper, on a telephone and in a dark room.
    """
    d = comparison if isinstance(comparison, dict) else compute_comparison_dict(comparison, sample, date, reviewer)
    marks = {m["atom"]: "missing" for m in d["missing"] if m["nucleus"] == "13C" or not m["note"]}
    for m in d["missing"]:
        if m["atom"] in marks:
            marks |= dict.fromkeys(m["equivalent_atoms"], "missing")
    for a in d["assignments"]:
        if not a["within_interval"]:
            marks |= dict.fromkeys(a["equivalent_atoms"], "outside")
    drawing = render_structure_svg(d["structure"], marks)
    return (
        _environment()
        .get_template("comparison.html")
        .render(
            d=d,
            sentence=JUDGEMENT_SENTENCE[d["judgement"]],
            reason_sentence=REASON_CODE_SENTENCE.get(d["reason_code"], d["reason_code"]),
            ratio=format_likelihood_ratio(d["likelihood_ratio"]),
            structure_picture=_embed(drawing),
            large=_is_large(drawing),
            marks_outside="outside" in marks.values(),
            marks_missing="missing" in marks.values(),
            own_picture=_embed(render_structure_svg(d["structure"], numbers=False, scale=22)),
            offsets=[(n, format_offset(v, n)) for n, v in d["reference_offset_ppm"].items() if v is not None],
            lanes=[lane for nucleus in ("13C", "1H") if (lane := _build_lane(d, nucleus))],
            leftovers=[u for nucleus in ("13C", "1H") for u in sort_by_observed(d["unexplained"], nucleus)],
            rivals=[(r, _embed(render_structure_svg(_build_plain_structure(r), numbers=False, scale=22))) for r in d["rivals"]],
        )
    )


def _build_lane(d: dict, nucleus: str) -> dict | None:
    wide = render_lane_svg(d, nucleus, WIDE)
    if not wide:
        return None
    assigned = sort_by_observed(d["assignments"], nucleus)
    return {
        "nucleus": nucleus,
        "wide": _embed(wide),
        "narrow": _embed(render_lane_svg(d, nucleus, NARROW)),
        "paper": _embed(render_lane_svg(d, nucleus, PAPER)),
        "key": [(_embed(picture), words) for picture, words in build_lane_key(d, nucleus)],
        "assigned": assigned,
        "noted": any(a["note"] or not a["within_interval"] for a in assigned),
    }


def _build_plain_structure(rival: dict) -> dict:
    from rdkit import Chem

    mol = Chem.MolFromSmiles(rival["smiles"])
    numbers = list(range(1, mol.GetNumAtoms() + 1)) if mol is not None else []
    return {"smiles": rival["smiles"], "smiles_atoms": numbers, "coordinates": None, "name": rival["how"]}


def render_prediction_html(
    predictions: Iterable[MoleculePrediction | RecordFailure],
    nucleus: str = "both",
    solvent: str | None = None,
    coverage: float = 0.9,
    date: str = "",
) -> str:
    """Return predictions as one HTML file (see `iterate_prediction_html` for very many).

    Parameters
    ----------
    predictions : iterable of MoleculePrediction or RecordFailure
    nucleus, solvent, coverage, date
        As for `compute_prediction_dict`.
    """
    predictions = list(predictions)
    heading = compute_prediction_dict(predictions, nucleus, solvent, coverage, date)
    return "".join(iterate_prediction_html(heading, predictions))


def iterate_prediction_html(heading: dict, predictions: Iterable[MoleculePrediction | RecordFailure]) -> Iterator[str]:
    """Return the page of predictions piece by piece, so that memory stays flat.

    Parameters
    ----------
    heading : dict
        From `compute_prediction_heading`.
    predictions : iterable of MoleculePrediction or RecordFailure

    Yields
    ------
    str
        Pieces of one HTML file.
    """
    environment = _environment()
    yield environment.get_template("prediction_head.html").render(d=heading) + "\n"
    molecule = environment.get_template("prediction_molecule.html")
    for prediction in predictions:
        failed = isinstance(prediction, RecordFailure)
        m = build_failure_entry(prediction) if failed else build_prediction_entry(prediction)
        picture = "" if failed else render_structure_svg(m["structure"])
        large = bool(picture) and _is_large(picture)
        yield molecule.render(m=m, picture=_embed(picture), large=large, groups=_group_nuclei(m["nuclei"])) + "\n"
    yield environment.get_template("prediction_tail.html").render(d=heading) + "\n"


def _group_nuclei(nuclei: list[dict]) -> list[tuple[str, list[dict]]]:
    """Return the rows by nucleus, one of each set of equivalent nuclei."""
    groups: dict[str, dict[tuple, dict]] = {}
    for n in nuclei:
        groups.setdefault(n["nucleus"], {}).setdefault((tuple(n["equivalent_atoms"]), n["hydrogen"]), n)
    return [(nucleus, list(rows.values())) for nucleus, rows in groups.items()]


def render_explanation_html(explanation: Explanation | Iterable[Explanation] | dict, date: str = "") -> str:
    """Return explanations of one structure as one HTML file with a waterfall for each.

    Parameters
    ----------
    explanation : Explanation, iterable of Explanation, or dict
        Records, or what `compute_explanation_dict` made of them.
    date : str, default ''
    """
    d = explanation if isinstance(explanation, dict) else compute_explanation_dict(explanation, date)
    entries = [(e, *(_embed(render_waterfall_svg(e, width)) for width in (WIDE, NARROW, PAPER))) for e in d["explanations"]]
    drawing = render_structure_svg(d["structure"])
    page = _environment().get_template("explanation.html")
    return page.render(d=d, entries=entries, structure_picture=_embed(drawing), large=_is_large(drawing))


def render_ranking_html(ranking: Ranking | dict, sample: str = "", date: str = "", reviewer: str = "") -> str:
    """Return a ranking as one HTML file, the candidates side by side.

    Parameters
    ----------
    ranking : Ranking or dict
        The record, or what `compute_ranking_dict` made of it.
    sample, date, reviewer : str, default ''
    """
    d = ranking if isinstance(ranking, dict) else compute_ranking_dict(ranking, sample, date, reviewer)
    return (
        _environment()
        .get_template("ranking.html")
        .render(
            d=d,
            best=min((c["misfit"] for c in d["candidates"] if c["misfit"] is not None), default=0.0),
            candidates=[(c, _embed(render_structure_svg(c["structure"], scale=24))) for c in d["candidates"]],
            beside=[table for nucleus in ("13C", "1H") if (table := _build_beside(d, nucleus))],
        )
    )


def _build_beside(d: dict, nucleus: str) -> tuple | None:
    """Return what each of the best candidates makes of each line of a nucleus."""
    lines = d["peaks"].get(nucleus, {"lines": []})["lines"]
    chosen = d["candidates"][:_MOST_BESIDE]
    if not lines or not any(c["assignments"] for c in chosen):
        return None
    rows = []
    for line in sorted(lines, key=lambda p: -p["shift_ppm"]):
        cells = []
        for c in chosen:
            taken = [a for a in c["assignments"] if a["nucleus"] == nucleus and a["position"] == line["position"]]
            text = "; ".join(
                f"{format_atoms(a['equivalent_atoms'], a['hydrogen'])} ({format_shift(a['shift_ppm'], nucleus)})" for a in taken
            )
            left = next(
                (
                    u["likely"] or ""
                    for u in c["unexplained"]
                    if u["nucleus"] == nucleus and abs(u["observed_ppm"] - line["shift_ppm"]) < 1e-6
                ),
                "",
            )
            flag = any(not a["within_interval"] for a in taken) or (not taken and not left)
            cells.append({"text": text or left or "nothing takes it", "flag": flag})
        rows.append((format_observed(line["shift_ppm"], nucleus), cells))
    return nucleus, [f"{i}. {c['structure']['name']}" for i, c in enumerate(chosen, start=1)], rows
