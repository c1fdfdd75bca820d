"""A report as Jupyter shows it: the whole page in a frame of its own, so that neither style touches the other."""

from __future__ import annotations

from html import escape

__all__ = ["render_notebook_frame"]


def render_notebook_frame(page: str, height: int = 640, title: str = "shiftpred report") -> str:
    """Return an HTML fragment that shows a self-contained page.

    Parameters
    ----------
    page : str
        A whole HTML document.
    height : int, default 640
        Of the frame, in px; longer pages are scrolled, and the frame can be pulled longer.
    title : str
        What a screen reader calls the frame.

    Returns
    -------
    str
        A sandboxed frame with the page inside: no script runs and nothing is loaded.

    Examples
    --------
    >>> render_notebook_frame('<p title="a">', 100).count("&lt;p title=&quot;a&quot;&gt;")
    1
    """
    style = f"width:100%;height:{height}px;border:1px solid #bbb;resize:vertical;background:#fff"
    return f'<iframe sandbox="" title="{escape(title)}" style="{style}" srcdoc="{escape(page)}"></iframe>'
