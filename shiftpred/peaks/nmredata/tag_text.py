r"""From the lines of an SDF record to the data lines of its tags.

Version 1.0 has one item a line. Later versions part items by backslashes and pass over the ends of lines, so that an item may
run over several lines. In both, what follows `;` is a comment, and `<"...">` protects the characters of a label.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass

__all__ = ["Item", "Tag", "split_fields", "split_items", "split_tags"]

_HEADER = re.compile(r"^>[^<]*<\s*([^<>]*?)\s*>")
_PARTS = re.compile(r'<".{0,200}?">|[^<]+|<', re.DOTALL)  # bounded, so that hostile text costs no more than its length
_LONGEST_ITEM = 20_000


@dataclass(frozen=True)
class Tag:
    """One data item of an SDF record."""

    name: str
    line: int
    """1-based line of the header."""
    rows: tuple[tuple[int, str], ...]
    """Lines of the content with their numbers."""


@dataclass(frozen=True)
class Item:
    """One logical line of a tag."""

    line: int
    text: str
    is_cut: bool = False
    """True: too long to be kept whole."""


def split_tags(rows: Iterable[tuple[int, str]]) -> tuple[list[tuple[int, str]], list[Tag], list[tuple[int, str]]]:
    """Part a record into structure, tags, and lines that belong to no tag.

    Parameters
    ----------
    rows : iterable of (int, str)
        Numbered lines without their ends.

    Returns
    -------
    structure : list of (int, str)
    tags : list of Tag
    stray : list of (int, str)
        Lines with text between a tag's closing blank line and the next header.
    """
    structure: list[tuple[int, str]] = []
    tags: list[tuple[str, int, list[tuple[int, str]]]] = []
    stray: list[tuple[int, str]] = []
    is_open = in_table = False
    for number, text in rows:
        # A title line may begin with '>', too; only what follows the connection table is a header.
        header = _HEADER.match(text) if tags or in_table else None
        if header:
            tags.append((header[1], number, []))
            is_open = True
        elif not tags:
            structure.append((number, text))
            in_table = in_table or text.startswith("M  END")
        elif not text.strip():
            is_open = False
        elif is_open:
            tags[-1][2].append((number, text))
        else:
            stray.append((number, text))
    return structure, [Tag(name, line, tuple(content)) for name, line, content in tags], stray


def split_items(tag: Tag, by_backslash: bool) -> list[Item]:
    r"""Return the logical lines of a tag without comments and blanks.

    Examples
    --------
    >>> tag = Tag("NMREDATA_ASSIGNMENT", 1, ((2, "A, 48.3, 1 ;CH2\\"), (3, "B, 20."), (4, "322, 2\\")))
    >>> [(item.line, item.text) for item in split_items(tag, True)]
    [(2, 'A, 48.3, 1'), (3, 'B, 20.322, 2')]
    """
    if by_backslash and any("\\" in text for _, text in tag.rows):
        pieces = _split_at_backslashes(tag.rows)
    else:
        pieces = [(number, text.rstrip().removesuffix("\\")) for number, text in tag.rows]
    items = [Item(number, _drop_comment(text[:_LONGEST_ITEM]).strip(), len(text) > _LONGEST_ITEM) for number, text in pieces]
    return [item for item in items if item.text]


def _split_at_backslashes(rows) -> list[tuple[int, str]]:
    pieces: list[tuple[int, str]] = []
    start, parts = 0, []
    for number, row in rows:
        *closed, rest = _split_outside_quotes(row, "\\")
        for piece in closed:
            pieces.append((start or number, "".join([*parts, piece])))
            start, parts = 0, []
        if rest.strip():
            start = start or number
            parts.append(rest)
    if parts:
        pieces.append((start, "".join(parts)))
    return pieces


def _drop_comment(text: str) -> str:
    return _split_outside_quotes(text, ";")[0]


def _split_outside_quotes(text: str, mark: str) -> list[str]:
    if mark not in text or '<"' not in text:
        return text.split(mark)
    out = [""]
    for part in _PARTS.findall(text):
        if part.startswith('<"') and len(part) > 2:
            out[-1] += part
        else:
            first, *more = part.split(mark)
            out[-1] += first
            out += more
    return out


def split_fields(text: str) -> list[str]:
    """Part an item at its commas; those in round brackets and in protected labels do not count.

    Examples
    --------
    >>> split_fields('7.2, L=(a,b), J=9.3(c), 1.2'), split_fields('<"Ha,Hb">, 4.8,H3')
    (['7.2', 'L=(a,b)', 'J=9.3(c)', '1.2'], ['<"Ha,Hb">', '4.8', 'H3'])
    """
    out, depth = [""], 0
    for part in _PARTS.findall(text):
        if part.startswith('<"') and len(part) > 2:
            out[-1] += part
            continue
        start = 0
        for k, letter in enumerate(part):
            if letter in "()":
                depth = max(0, depth + (1 if letter == "(" else -1))
            elif letter == "," and not depth:
                out[-1] += part[start:k]
                out.append("")
                start = k + 1
        out[-1] += part[start:]
    if depth and "," in text:  # a bracket that is never closed protects nothing
        return [field.strip() for field in _split_outside_quotes(text, ",")]
    return [field.strip() for field in out]
