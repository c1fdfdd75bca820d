"""Aligned columns, headings and wrapped lines of plain text."""

from __future__ import annotations

import textwrap
import unicodedata
from collections.abc import Iterable, Sequence

DEFAULT_WIDTH = 100


def compute_display_width(text: str) -> int:
    """Return how many terminal cells a text takes: wide East Asian characters take two, combining marks none."""
    cells = 0
    for character in text:
        if unicodedata.combining(character):
            continue
        cells += 2 if unicodedata.east_asian_width(character) in "WF" else 1
    return cells


def clean_text(text: str) -> str:
    """Return a text without control characters, so that a name cannot move the cursor or colour the terminal.

    Examples
    --------
    >>> clean_text("two\\nlines and \\x1b[31mred")
    'two lines and [31mred'
    """
    text = " ".join(text.split()) if any(c in text for c in "\n\r\t\v\f") else text
    return "".join(c for c in text if unicodedata.category(c) not in ("Cc", "Cf", "Cs"))


def render_columns(heading: Sequence[str], rows: Iterable[Sequence[str]], align: str, indent: int = 2) -> list[str]:
    """Return a table as lines.

    Parameters
    ----------
    heading : sequence of str
        Column names.
    rows : iterable of sequence of str
    align : str
        One letter a column: `l` or `r`. The last column is not padded.
    indent : int, default 2

    Returns
    -------
    list of str
        The heading, then one line a row; columns that are empty in every row are left out.
    """
    rows = [[clean_text(str(cell)) for cell in row] for row in rows]
    used = [i for i in range(len(heading)) if any(row[i] for row in rows)]
    table = [[heading[i] for i in used], *([row[i] for i in used] for row in rows)]
    widths = [max(compute_display_width(line[i]) for line in table) for i in range(len(used))]
    lines = []
    for line in table:
        cells = []
        for i, (cell, width) in enumerate(zip(line, widths, strict=True)):
            space = " " * (width - compute_display_width(cell))
            cells.append(space + cell if align[used[i]] == "r" else cell + space)
        lines.append((" " * indent + "  ".join(cells)).rstrip())
    return lines


def render_points(points: Iterable[str], width: int = DEFAULT_WIDTH, numbered: bool = False) -> list[str]:
    """Return a list of sentences, wrapped, each with a dash or a number before it."""
    lines = []
    for number, point in enumerate(points, start=1):
        lead = f"  {number}. " if numbered else "  - "
        lines += textwrap.wrap(
            clean_text(point), width, initial_indent=lead, subsequent_indent=" " * len(lead), break_long_words=False
        ) or [lead.rstrip()]
    return lines


def render_section(title: str, lines: Sequence[str]) -> list[str]:
    """Return a titled block with an empty line before it; nothing where there are no lines."""
    return ["", title, *lines] if lines else []
