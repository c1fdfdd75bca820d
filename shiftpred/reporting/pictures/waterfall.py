"""Draw an explanation: each contribution starts where the one before it ended."""

from __future__ import annotations

from shiftpred.reporting.pictures.axis import compute_axis_ticks
from shiftpred.reporting.pictures.svg_elements import (
    STYLE,
    compute_text_width,
    render_element,
    render_label,
    render_picture,
)
from shiftpred.reporting.text.explanation import format_ppm
from shiftpred.reporting.wording import format_shift

__all__ = ["render_waterfall_svg"]


def render_waterfall_svg(explanation: dict, width: int = 900) -> str:
    """Draw one explanation as a waterfall.

    Parameters
    ----------
    explanation : dict
        One entry of `explanations` (see `schemas/explanation-1.json`).
    width : int, default 900
        Below 600 each label stands above its bar instead of beside it.

    Returns
    -------
    str
        One `svg` element. Higher shifts lie to the left, as on the axis of a spectrum. Bars that raise the shift are
        full, bars that lower it are hollow; the remainder of the environment model is dashed.
    """
    nucleus, entries = explanation["nucleus"], explanation["contributions"]
    decimals = 2 if nucleus == "13C" else 3
    narrow = width < 600
    label_room = 0.0 if narrow else 300.0
    value_room = 70.0
    pitch = 44.0 if narrow else 26.0
    edges = [0.0]
    for entry in entries:
        edges.append(edges[-1] + entry["contribution_ppm"])
    corners = edges[1:] + [explanation["shift_ppm"]]
    bounds = [b for b in (explanation["lower_ppm"], explanation["upper_ppm"]) if b is not None]
    low, high = min(corners + bounds), max(corners + bounds)
    room = max(0.08 * (high - low), 0.5 if nucleus == "13C" else 0.05)
    low, high = low - room, high + room
    begin, end = label_room + 8, width - value_room

    def place(ppm: float) -> float:
        return begin + (high - min(max(ppm, low), high)) / (high - low) * (end - begin)

    height = pitch * (len(entries) + 1) + 44
    body = []
    for tick in compute_axis_ticks(low, high, 4 if narrow else 8):
        x = place(tick)
        body.append(render_element("line", x1=x, y1=0, x2=x, y2=height - 38, stroke=STYLE["rule"], stroke_width=1))
        body.append(render_label(f"{tick:g}", x, height - 24, 11, "quiet", text_anchor="middle"))
    body.append(render_label(f"{nucleus} shift, ppm", (begin + end) / 2, height - 6, 11, "quiet", text_anchor="middle"))
    for row, entry in enumerate(entries):
        top = row * pitch + (18 if narrow else 4)
        start, stop = (edges[row + 1], edges[row + 1]) if entry["kind"] == "base" else (edges[row], edges[row + 1])
        body += _render_step(entry, place(start), place(stop), top)
        label = entry["label"]
        longest = int(((width - value_room) if narrow else label_room) / compute_text_width("x", 12))
        if len(label) > longest:
            label = label[: longest - 1] + "…"
        body.append(render_label(label, 0, row * pitch + (12 if narrow else 17), 12))
        body.append(render_label(format_ppm(entry, decimals), width, top + 12, 12, text_anchor="end"))
        x = place(stop)
        body.append(
            render_element(
                "line", x1=x, y1=top + 16, x2=x, y2=top + pitch, stroke=STYLE["quiet"], stroke_width=1, stroke_dasharray="2 2"
            )
        )
    body += _render_total(explanation, place, len(entries) * pitch + (18 if narrow else 4), width, narrow, bounds)
    title = (
        f"Contributions to the {nucleus} shift of atom {explanation['atom']}, which add up to "
        f"{format_shift(explanation['shift_ppm'], nucleus)} ppm"
    )
    return render_picture(width, height, title, body, class_="waterfall")


def _render_step(entry: dict, start: float, stop: float, top: float) -> list[str]:
    if entry["kind"] == "base":
        return [render_element("path", d=f"M{stop:.1f} {top + 1:.1f} l6 7 l-6 7 l-6 -7 z", fill=STYLE["centre"])]
    x, length = min(start, stop), max(abs(start - stop), 1.5)
    style = {"x": x, "y": top, "width": length, "height": 15.0, "rx": 2}
    if entry["kind"] == "remainder":
        return [
            render_element(
                "rect", **style, fill=STYLE["paper"], stroke=STYLE["quiet"], stroke_width=1.5, stroke_dasharray="4 2"
            )
        ]
    if entry["contribution_ppm"] >= 0:
        return [render_element("rect", **style, fill=STYLE["predicted"], stroke=STYLE["centre"], stroke_width=1)]
    return [render_element("rect", **style, fill=STYLE["paper"], stroke=STYLE["centre"], stroke_width=2)]


def _render_total(explanation: dict, place, top: float, width: float, narrow: bool, bounds: list[float]) -> list[str]:
    x = place(explanation["shift_ppm"])
    text = f"{explanation['shift_ppm']:.{2 if explanation['nucleus'] == '13C' else 3}f}"
    body = []
    if len(bounds) == 2:
        left, right = place(bounds[1]), place(bounds[0])
        body.append(
            render_element(
                "rect", x=left, y=top + 4, width=right - left, height=7.0, rx=2, fill=STYLE["predicted"], fill_opacity=0.6
            )
        )
    body.append(render_element("line", x1=x, y1=top - 1, x2=x, y2=top + 16, stroke=STYLE["ink"], stroke_width=2.5))
    label = "predicted shift, with its interval"
    body.append(render_label(label, 0, top - 6 if narrow else top + 13, 12, font_weight="bold"))
    body.append(render_label(text, width, top + 12, 12, text_anchor="end", font_weight="bold"))
    return body
