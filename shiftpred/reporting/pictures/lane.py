"""Draw the lane of one nucleus: predicted intervals as bars, observed lines as ticks through them.

From top to bottom: the observed shifts in figures, a rail with one tick a line, a thin thread from each tick down to the
bar that takes it, the bars in as many rows as they need, the axis. Higher shifts lie to the left.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from shiftpred.reporting.pictures.axis import compute_axis_ticks, compute_rows, spread_labels
from shiftpred.reporting.pictures.svg_elements import (
    STYLE,
    compute_text_width,
    render_element,
    render_label,
    render_picture,
)
from shiftpred.reporting.wording import format_atoms, format_observed

__all__ = ["build_lane_entries", "build_lane_key", "render_lane_svg"]

_BAR, _PITCH, _LABEL_SIZE = 12.0, 24.0, 11.0


@dataclass
class Bar:
    """One set of equivalent nuclei."""

    label: str
    shift: float
    lower: float | None
    upper: float | None
    ticks: list[tuple[float, float, float, bool]] = field(default_factory=list)
    """Lines that it takes: observed as given, corrected, half the width of a range, within the interval."""
    excused: bool = False
    """Without a line, but there is a reason."""


@dataclass
class Line:
    """One observed line on the rail."""

    ppm: float
    lower: float
    upper: float
    kind: str
    """'assigned', 'known' (a leftover with a likely name) or 'unknown'."""
    likely: str = ""


def build_lane_entries(d: dict, nucleus: str) -> tuple[list[Bar], list[Line]]:
    """Collect what a lane shows from a comparison's dictionary, highest shift first."""
    bars: dict[tuple, Bar] = {}
    lines: dict[int, Line] = {}
    given = {p["position"]: p for p in d["peaks"].get(nucleus, {"lines": []})["lines"]}
    for a in d["assignments"]:
        if a["nucleus"] != nucleus:
            continue
        key = (tuple(a["equivalent_atoms"]), a["hydrogen"])
        label = format_atoms(a["equivalent_atoms"], a["hydrogen"])
        bar = bars.setdefault(key, Bar(label, a["shift_ppm"], a["lower_ppm"], a["upper_ppm"]))
        peak = given.get(a["position"], {"lower_ppm": a["observed_ppm"], "upper_ppm": a["observed_ppm"]})
        half = (peak["upper_ppm"] - peak["lower_ppm"]) / 2
        bar.ticks.append((a["observed_ppm"], a["shift_ppm"] + a["deviation_ppm"], half, a["within_interval"]))
        lines[a["position"]] = Line(a["observed_ppm"], peak["lower_ppm"], peak["upper_ppm"], "assigned")
    for m in d["missing"]:
        if m["nucleus"] == nucleus:
            key = (tuple(m["equivalent_atoms"]), m["hydrogen"])
            label = format_atoms(m["equivalent_atoms"], m["hydrogen"])
            bars.setdefault(key, Bar(label, m["shift_ppm"], m["lower_ppm"], m["upper_ppm"], excused=bool(m["note"])))
    rail = list(lines.values())
    for u in d["unexplained"]:
        if u["nucleus"] == nucleus:
            kind = "known" if u["likely"] else "unknown"
            rail.append(Line(u["observed_ppm"], u["observed_ppm"], u["observed_ppm"], kind, u["likely"] or ""))
    return sorted(bars.values(), key=lambda b: -b.shift), sorted(rail, key=lambda line: -line.ppm)


def render_lane_svg(d: dict, nucleus: str, width: int = 1040) -> str:
    """Draw the lane of one nucleus.

    Parameters
    ----------
    d : dict
        A comparison's dictionary.
    nucleus : {'13C', '1H'}
    width : int, default 1040

    Returns
    -------
    str
        One `svg` element, or '' where the nucleus has neither bars nor lines.
    """
    bars, rail = build_lane_entries(d, nucleus)
    if not bars and not rail:
        return ""
    low, high = _compute_range(bars, rail, nucleus)
    begin, end = 14.0, width - 14.0

    def place(ppm: float) -> float:
        return begin + (high - min(max(ppm, low), high)) / (high - low) * (end - begin)

    texts = [format_observed(line.ppm, nucleus) for line in rail]
    wishes = [place(line.ppm) for line in rail]
    labels = spread_labels(wishes, _LABEL_SIZE + 2.0, begin, end)
    label_room = max((compute_text_width(t, _LABEL_SIZE) for t in texts), default=0.0) + 4 if labels else 0.0
    rail_y = label_room + (22.0 if labels else 12.0)
    first_row = rail_y + 30.0
    extents = [_compute_extent(bar, place) for bar in bars]
    rows = compute_rows(extents, 6.0)
    axis_y = first_row + _PITCH * (max(rows, default=-1) + 1) + 6.0
    body = _render_axis(low, high, nucleus, place, axis_y, width, first_row - 12.0)
    threads, shapes = [], []
    for bar, row in zip(bars, rows, strict=True):
        top = first_row + _PITCH * row
        for raw, corrected, _, _ in bar.ticks:
            x, there = place(raw), place(corrected)
            points = f"{x:.1f},{rail_y:.1f} {x:.1f},{rail_y + 8:.1f} {there:.1f},{rail_y + 18:.1f} {there:.1f},{top:.1f}"
            threads.append(
                render_element("polyline", points=points, fill="none", stroke=STYLE["quiet"], stroke_width=0.7, opacity=0.65)
            )
        shapes += _render_bar(bar, place, top, (begin, end))
    body += threads
    body.append(render_element("line", x1=begin, y1=rail_y, x2=end, y2=rail_y, stroke=STYLE["quiet"], stroke_width=1))
    for line, x, text, label in zip(rail, wishes, texts, labels or [None] * len(rail), strict=True):
        body += _render_line(line, x, place, rail_y)
        if label is not None:
            body.append(
                render_element(
                    "polyline",
                    points=f"{label:.1f},{label_room + 2:.1f} {x:.1f},{rail_y - 9:.1f}",
                    fill="none",
                    stroke=STYLE["rule"],
                    stroke_width=1,
                )
            )
            body.append(
                render_label(
                    text, 0, 0, _LABEL_SIZE, "ink", transform=f"translate({label + 4:.1f} {label_room:.1f}) rotate(-90)"
                )
            )
    body += shapes
    assigned = sum(line.kind == "assigned" for line in rail)
    title = (
        f"Lane of {nucleus}: {len(bars)} sets of nuclei, {len(rail)} observed lines, {assigned} of them assigned; "
        "the tables below say the same in figures"
    )
    return render_picture(width, axis_y + 40.0, title, body, class_="lane")


def _compute_range(bars: list[Bar], rail: list[Line], nucleus: str) -> tuple[float, float]:
    ends = [v for b in bars for v in (b.shift, b.lower, b.upper, *(t[1] for t in b.ticks)) if v is not None]
    ends += [v for line in rail for v in (line.lower, line.upper)]
    low, high = min(ends), max(ends)
    room = max(0.03 * (high - low), 2.0 if nucleus == "13C" else 0.15)
    return low - room, high + room


def _compute_extent(bar: Bar, place) -> tuple[float, float]:
    """Return the stretch that bar, ticks and label take."""
    begin = place(bar.upper if bar.upper is not None else 1e9)
    end = place(bar.lower if bar.lower is not None else -1e9)
    ticks = [place(corrected) for _, corrected, _, _ in bar.ticks]
    reach = 7.0 if any(not within for *_, within in bar.ticks) else 2.0
    begin, end = min([begin, *(t - reach for t in ticks)]), max([end, *(t + reach for t in ticks)])
    return begin, end + 4 + compute_text_width(bar.label, _LABEL_SIZE)


def _render_axis(low, high, nucleus, place, y, width, top) -> list[str]:
    body = [render_element("line", x1=14, y1=y, x2=width - 14, y2=y, stroke=STYLE["ink"], stroke_width=1)]
    for tick in compute_axis_ticks(low, high, 5 if width < 600 else 12):
        x = place(tick)
        body.append(render_element("line", x1=x, y1=top, x2=x, y2=y, stroke=STYLE["rule"], stroke_width=0.6))
        body.append(render_element("line", x1=x, y1=y, x2=x, y2=y + 5, stroke=STYLE["ink"], stroke_width=1))
        body.append(render_label(f"{tick:g}", x, y + 18, 11, "ink", text_anchor="middle"))
    body.append(render_label(f"{nucleus} shift, ppm", width / 2, y + 34, 11, "quiet", text_anchor="middle"))
    return body


def _render_bar(bar: Bar, place, top: float, ends: tuple[float, float]) -> list[str]:
    x = place(bar.upper) if bar.upper is not None else ends[0]
    right = place(bar.lower) if bar.lower is not None else ends[1]
    style = {"x": x, "y": top, "width": max(right - x, 2.0), "height": _BAR, "rx": 2}
    middle = top + _BAR / 2
    if bar.ticks:
        body = [render_element("rect", **style, fill=STYLE["predicted"])]
    else:
        colour = STYLE["quiet"] if bar.excused else STYLE["against"]
        body = [
            render_element(
                "rect", **style, fill="none", stroke=colour, stroke_width=1.4 if bar.excused else 2.2, stroke_dasharray="4 3"
            )
        ]
    body.append(render_element("circle", cx=place(bar.shift), cy=middle, r=2.4, fill=STYLE["centre"]))
    reach = [right]
    for _, corrected, half, within in bar.ticks:
        at = place(corrected)
        if half > 0:
            left_end, right_end = place(corrected + half), place(corrected - half)
            body.append(
                render_element(
                    "path",
                    d=f"M{left_end:.1f} {top - 3:.1f} v{_BAR + 6:.1f} M{right_end:.1f} {top - 3:.1f} v{_BAR + 6:.1f} "
                    f"M{left_end:.1f} {middle:.1f} H{right_end:.1f}",
                    stroke=STYLE["ink"],
                    stroke_width=1.8,
                    fill="none",
                )
            )
            reach.append(right_end + 2)
        elif within:
            body.append(
                render_element("line", x1=at, y1=top - 4, x2=at, y2=top + _BAR + 4, stroke=STYLE["ink"], stroke_width=2)
            )
            reach.append(at + 2)
        if not within:
            near = x if at < x else right
            body.append(
                render_element(
                    "line", x1=near, y1=middle, x2=at, y2=middle, stroke=STYLE["ink"], stroke_width=1.4, stroke_dasharray="1 2"
                )
            )
            corners = (
                f"{at:.1f},{top - 2:.1f} {at + 8:.1f},{middle:.1f} {at:.1f},{top + _BAR + 2:.1f} {at - 8:.1f},{middle:.1f}"
            )
            body.append(render_element("polygon", points=corners, fill=STYLE["against"], stroke=STYLE["ink"], stroke_width=1.2))
            reach.append(at + 8)
    body.append(render_label(bar.label, max(reach) + 4, top + _BAR - 2, _LABEL_SIZE, "ink"))
    return body


def _render_line(line: Line, x: float, place, y: float) -> list[str]:
    """Return a line's mark on the rail: a tick; leftovers carry a triangle, hollow where they have a likely name."""
    body = [render_element("line", x1=x, y1=y - 8, x2=x, y2=y + 4, stroke=STYLE["ink"], stroke_width=2)]
    if line.upper > line.lower:
        left, right = place(line.upper), place(line.lower)
        body = [
            render_element(
                "path",
                d=f"M{left:.1f} {y - 5:.1f} v9 M{right:.1f} {y - 5:.1f} v9 M{left:.1f} {y:.1f} H{right:.1f}",
                stroke=STYLE["ink"],
                stroke_width=2,
                fill="none",
            )
        ]
    if line.kind != "assigned":
        fill = STYLE["paper"] if line.kind == "known" else STYLE["against"]
        points = f"{x:.1f},{y + 2:.1f} {x + 5.5:.1f},{y + 12:.1f} {x - 5.5:.1f},{y + 12:.1f}"
        body.append(render_element("polygon", points=points, fill=fill, stroke=STYLE["ink"], stroke_width=1.3))
    return body


def build_lane_key(d: dict, nucleus: str) -> list[tuple[str, str]]:
    """Return a small picture and its words for every kind of mark that a lane shows, and for no other."""
    bars, rail = build_lane_entries(d, nucleus)
    kinds = {line.kind for line in rail}
    within = {t[3] for b in bars for t in b.ticks}
    bar = {"x": 1, "y": 5, "width": 26, "height": 10, "rx": 2}
    tick = render_element("line", x1=14, y1=1, x2=14, y2=19, stroke=STYLE["ink"], stroke_width=2)
    lozenge = {"fill": STYLE["against"], "stroke": STYLE["ink"], "stroke_width": 1.2}
    triangle = {"points": "14,3 20,15 8,15", "stroke": STYLE["ink"], "stroke_width": 1.3}
    dashed = {"fill": "none", "stroke_dasharray": "4 3"}
    key = []
    if any(b.ticks for b in bars):
        dot = render_element("circle", cx=8, cy=10, r=2.4, fill=STYLE["centre"])
        shapes = render_element("rect", **bar, fill=STYLE["predicted"]) + dot
        key.append((shapes + (tick if True in within else ""), "predicted interval, shift as a dot; observed line as a tick"))
    if False in within:
        key.append((render_element("polygon", points="14,2 22,10 14,18 6,10", **lozenge), "observed, outside the interval"))
    if any(half > 0 for b in bars for _, _, half, _ in b.ticks):
        bracket = render_element("path", d="M4 4 v12 M24 4 v12 M4 10 H24", stroke=STYLE["ink"], stroke_width=1.8, fill="none")
        key.append((bracket, "observed as a range"))
    if any(not b.ticks and not b.excused for b in bars):
        key.append((render_element("rect", **bar, **dashed, stroke=STYLE["against"], stroke_width=2.2), "expected, no line"))
    if any(not b.ticks and b.excused for b in bars):
        key.append((render_element("rect", **bar, **dashed, stroke=STYLE["quiet"], stroke_width=1.4), "no line, excused"))
    if "known" in kinds:
        key.append((render_element("polygon", **triangle, fill=STYLE["paper"]), "leftover with a likely name"))
    if "unknown" in kinds:
        key.append((render_element("polygon", **triangle, fill=STYLE["against"]), "leftover that nothing known fits"))
    return [
        (render_element("svg", shapes, viewBox="0 0 28 20", width=28, height=20, aria_hidden="true"), words)
        for shapes, words in key
    ]
