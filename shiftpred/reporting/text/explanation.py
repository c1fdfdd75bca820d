"""An explanation as text: one line a contribution, with a bar of characters."""

from __future__ import annotations

from collections.abc import Iterable

from shiftpred.records import Explanation
from shiftpred.reporting.summaries import compute_explanation_dict
from shiftpred.reporting.text.layout import DEFAULT_WIDTH, clean_text, render_columns, render_points, render_section
from shiftpred.reporting.wording import format_interval, format_shift

__all__ = ["format_constants", "render_explanation_text"]

_BAR_CELLS = 18


def render_explanation_text(explanation: Explanation | Iterable[Explanation] | dict, width: int = DEFAULT_WIDTH) -> str:
    """Show why a shift lies where it lies.

    Parameters
    ----------
    explanation : Explanation, iterable of Explanation, or dict
        Records of one structure, or what `compute_explanation_dict` made of them.
    width : int, default 100

    Returns
    -------
    str
        One block a nucleus: every contribution in ppm with the constants that were used, then the sum.
    """
    d = explanation if isinstance(explanation, dict) else compute_explanation_dict(explanation)
    structure = d["structure"]
    lines = [clean_text(f"{structure['name']}   {structure['smiles']}   model {d['model']}")]
    for entry in d["explanations"]:
        lines += _render_block(entry, width)
    lines += render_section("Cautions", render_points([*structure["notes"], *d["cautions"]], width))
    return "\n".join(lines) + "\n"


def _render_block(entry: dict, width: int) -> list[str]:
    nucleus = entry["nucleus"]
    interval = format_interval(entry["lower_ppm"], entry["upper_ppm"], nucleus)
    title = (
        f"{nucleus} of atom {entry['atom']}: {format_shift(entry['shift_ppm'], nucleus)} ppm "
        f"({100 * entry['coverage']:g} % interval {interval})"
    )
    decimals = 2 if nucleus == "13C" else 3
    steps = [c for c in entry["contributions"] if c["kind"] != "base"]
    longest = max((abs(c["contribution_ppm"]) for c in steps), default=0.0)
    rows = [
        (
            c["label"],
            format_ppm(c, decimals),
            "" if c["kind"] == "base" else _render_bar(c["contribution_ppm"], longest),
            ", ".join(map(str, c["atoms"])),
            format_constants(c["constants"]),
            c["flag"],
        )
        for c in entry["contributions"]
    ]
    total = sum(c["contribution_ppm"] for c in entry["contributions"])
    rows.append(("sum", f"{total:.{decimals}f}", "", "", "", ""))
    heading = ("contribution", "ppm", "", "atoms", "constants", "flag")
    return ["", title, *render_columns(heading, rows, "lrllll"), *render_points(entry["notes"], width)]


def format_ppm(contribution: dict, decimals: int) -> str:
    """Return a contribution with its sign, the base without."""
    value = contribution["contribution_ppm"]
    text = f"{abs(value):.{decimals}f}"
    if contribution["kind"] == "base":
        return f"{value:.{decimals}f}".replace("-", "−")
    return ("−" if value < 0 else "+") + text


def _render_bar(value: float, longest: float) -> str:
    """Return a bar on both sides of a middle line: to the left lowers the shift, to the right raises it."""
    half = _BAR_CELLS // 2
    cells = round(half * abs(value) / longest) if longest else 0
    if value < 0:
        return " " * (half - cells) + "▒" * cells + "│" + " " * half
    return " " * half + "│" + "█" * cells + " " * (half - cells)


def format_constants(constants: dict[str, float | None]) -> str:
    """Return name and value of the constants that were used: 'sigma_I 0.38, χ 3.44'."""
    return ", ".join(f"{name} {'–' if value is None else format(value, '.3g')}" for name, value in constants.items())
