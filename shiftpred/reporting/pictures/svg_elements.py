"""Write SVG elements: escaped, no ids, nothing from outside."""

from __future__ import annotations

from html import escape

from shiftpred.reporting.marks import OKABE_ITO

STYLE = {
    "ink": "var(--ink, #1a1a1a)",
    "quiet": "var(--quiet, #595959)",
    "rule": "var(--rule, #c9c9c9)",
    "paper": "var(--paper, #ffffff)",
    "predicted": f"var(--predicted, {OKABE_ITO['sky blue']})",
    "centre": f"var(--centre, {OKABE_ITO['blue']})",
    "number": "var(--number, #00568a)",
    "against": f"var(--against, {OKABE_ITO['reddish purple']})",
}
"""Colour by role. On a page the variables follow light, dark and print; in a file of its own the second value holds."""

FONT = "system-ui, 'Segoe UI', 'Liberation Sans', 'DejaVu Sans', sans-serif"


def render_element(tag: str, *children: str, **attributes: object) -> str:
    """Return one element; `_` in an attribute's name stands for `-`, and children are SVG already.

    Examples
    --------
    >>> render_element("line", x1=1, x2=2.50001, stroke_width=2)
    '<line x1="1" x2="2.5" stroke-width="2"/>'
    """
    parts = [tag]
    for name, value in attributes.items():
        if value is None:
            continue
        text = f"{value:.2f}".rstrip("0").rstrip(".") if isinstance(value, float) else str(value)
        parts.append(f'{name.rstrip("_").replace("_", "-")}="{escape(text)}"')
    opening = " ".join(parts)
    return f"<{opening}>{''.join(children)}</{tag}>" if children else f"<{opening}/>"


def render_label(text: str, x: float, y: float, size: float = 11, colour: str = "ink", **attributes: object) -> str:
    """Return a piece of text at a place."""
    return render_element("text", escape(text), x=float(x), y=float(y), font_size=float(size), fill=STYLE[colour], **attributes)


def render_picture(width: float, height: float, title: str, body: list[str], **attributes: object) -> str:
    """Return a whole picture with a title that a screen reader speaks.

    The size stands in `viewBox`, `width` and `height`; a page may make it narrower, never distort it.
    """
    return render_element(
        "svg",
        render_element("title", escape(title)),
        *body,
        xmlns="http://www.w3.org/2000/svg",
        viewBox=f"0 0 {width:.0f} {height:.0f}",
        width=f"{width:.0f}",
        height=f"{height:.0f}",
        role="img",
        font_family=FONT,
        **attributes,
    )


def compute_text_width(text: str, size: float = 11) -> float:
    """Return about how wide a text is, in the picture's units; on the safe side for digits and Latin letters."""
    return 0.6 * size * len(text)
