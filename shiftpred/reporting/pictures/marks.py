"""Small marks that go with a word: the judgement, and where a line lies in its interval."""

from __future__ import annotations

from shiftpred.reporting.marks import JUDGEMENT_COLOUR
from shiftpred.reporting.pictures.svg_elements import STYLE, render_element

__all__ = ["render_deviation_svg", "render_judgement_svg"]


def render_judgement_svg(judgement: str, size: int = 34) -> str:
    """Return the sign of a judgement: full disc (supported), half disc (open), lozenge with a bar (contradicted).

    It stands beside the word and is hidden from screen readers, which read the word.
    """
    colour, ink = JUDGEMENT_COLOUR[judgement], STYLE["ink"]
    outline = {"fill": "none", "stroke": ink, "stroke_width": 2.5}
    if judgement == "supported":
        body = [render_element("circle", cx=20, cy=20, r=16, fill=colour, stroke=ink, stroke_width=2.5)]
    elif judgement == "open":
        body = [
            render_element("path", d="M20 4 A16 16 0 0 0 20 36 Z", fill=colour),
            render_element("circle", cx=20, cy=20, r=16, **outline),
            render_element("line", x1=20, y1=4, x2=20, y2=36, stroke=ink, stroke_width=2.5),
        ]
    else:
        body = [
            render_element("polygon", points="20,2 38,20 20,38 2,20", fill=colour, stroke=ink, stroke_width=2.5),
            render_element("line", x1=12, y1=20, x2=28, y2=20, stroke="#000000", stroke_width=4),
        ]
    return render_element("svg", *body, viewBox="0 0 40 40", width=size, height=size, class_="sign", aria_hidden="true")


def render_deviation_svg(shift: float, lower: float | None, upper: float | None, deviation: float) -> str:
    """Return a small gauge: the interval as a bar, the predicted shift as a dot, the observed line as a tick.

    The bar always has the same length, so ticks of different rows compare; like on the axis, higher shifts are to the
    left. A line that lies outside is a lozenge, at the edge where it is further away than the bar is long.
    """
    left, right, middle = 30.0, 90.0, 60.0
    above = (upper - shift) if upper is not None else None
    below = (shift - lower) if lower is not None else None
    half = above if deviation >= 0 else below
    if half is None or half <= 0:
        place = middle
    else:
        place = middle - (middle - left) * deviation / half
    outside = not left - 1e-6 <= place <= right + 1e-6
    place = min(max(place, 8.0), 112.0)
    body = [
        render_element("line", x1=0, y1=9, x2=120, y2=9, stroke=STYLE["rule"], stroke_width=1),
        render_element("rect", x=left, y=5, width=right - left, height=8, rx=2, fill=STYLE["predicted"]),
        render_element("circle", cx=middle, cy=9, r=2.2, fill=STYLE["centre"]),
    ]
    if outside:
        corners = f"{place:.1f},2 {place + 7:.1f},9 {place:.1f},16 {place - 7:.1f},9"
        body.append(render_element("polygon", points=corners, fill=STYLE["against"], stroke=STYLE["ink"], stroke_width=1))
    else:
        body.append(render_element("line", x1=place, y1=1, x2=place, y2=17, stroke=STYLE["ink"], stroke_width=2))
    return render_element("svg", *body, viewBox="0 0 120 18", width=120, height=18, class_="gauge", aria_hidden="true")
