"""One page for a night's samples: counts, filters, sorting, a thumbnail and a sentence for each, links to the reports."""

from __future__ import annotations

from collections import Counter
from importlib import resources

__all__ = ["render_triage_page"]

_KEEP = ("solvent", "coverage", "rivals", "mass_confirmed", "frequency_mhz", "prior", "expected")


def render_triage_page(rows: list[dict], edition: str, settings: dict, date: str) -> str:
    """Return the page as one HTML file without outside references.

    Parameters
    ----------
    rows : list of dict
        As `judge_sample` returns them.
    edition : str
        Of the model.
    settings : dict
    date : str
    """
    from jinja2 import Environment
    from markupsafe import Markup

    from shiftpred.reporting.marks import JUDGEMENT_COLOUR
    from shiftpred.reporting.pictures.marks import render_judgement_svg

    text = resources.files("shiftpred.triage").joinpath("page.html").read_text(encoding="utf-8")
    template = Environment(autoescape=True, trim_blocks=True, lstrip_blocks=True).from_string(text)
    counts = Counter(row["judgement"] or "unjudged" for row in rows)
    marks = {name: Markup(render_judgement_svg(name, 22)) for name in JUDGEMENT_COLOUR}
    shown = [
        dict(row, picture=Markup(row.get("thumbnail") or ""), shown_probability=_render_probability(row["probability"]))
        for row in rows
    ]
    stated = {k.replace("_", " "): settings[k] for k in _KEEP if settings.get(k) not in (None, (), "", False)}
    return template.render(rows=shown, counts=counts, marks=marks, edition=edition, settings=stated, date=date)


def _render_probability(value) -> str:
    """Write a probability without claiming certainty."""
    if value == "":
        return "–"
    return "> 0.99" if value > 0.99 else "< 0.01" if value < 0.01 else f"{value:.2f}"
