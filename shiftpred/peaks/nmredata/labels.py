"""Labels, numbers and complaints: what all tags have in common."""

from __future__ import annotations

import math
import re

from shiftpred.errors import quote
from shiftpred.peaks.nmredata.contents import NmredataError
from shiftpred.peaks.nmredata.tag_text import split_fields

__all__ = ["Complaints", "read_label", "read_number", "read_whole_number", "split_label_group"]

_NUMBER = re.compile(r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?")
_MOST_PROBLEMS = 200


class Complaints:
    """Collects what is wrong with one record, each with its line; the list is cut at two hundred, and says so."""

    def __init__(self, where: str):
        self.where = where
        self.problems: list[NmredataError] = []
        self._left_out = 0

    @property
    def is_full(self) -> bool:
        """True once no more problems are kept."""
        return len(self.problems) >= _MOST_PROBLEMS

    def add(self, line: int, tag: str, came: str, would_do: str, try_next: str) -> None:
        """Note one problem."""
        if self.is_full:
            self._left_out += 1
            return
        place = f"{self.where}, line {line}" + (f", tag {quote(tag, 60)[1:-1]}" if tag else "")
        self.problems.append(NmredataError(place, came, would_do, try_next, line))

    def close(self) -> tuple[NmredataError, ...]:
        """Return all problems."""
        if self._left_out:
            last = self.problems[-1]
            came = f"{self._left_out + 1:,} more problems"
            more = NmredataError(f"{self.where}, from line {last.line} on", came, last.would_do, last.try_next, last.line)
            self.problems[-1] = more
        return tuple(self.problems)


def read_number(text: str) -> float | None:
    """Return a finite number, None if the text is none."""
    text = text.strip()
    if len(text) > 40 or not _NUMBER.fullmatch(text):
        return None
    value = float(text)
    return value if math.isfinite(value) else None


def read_whole_number(text: str) -> int | None:
    """Return a whole number of at most nine ASCII digits, None if the text is none."""
    text = text.strip()
    return int(text) if text.isascii() and text.isdigit() and len(text) <= 9 else None


def read_label(text: str) -> str:
    r"""Return a label without its protection; '' for none.

    Examples
    --------
    >>> read_label(' <"Ha,Hb"> '), read_label("H-C1"), read_label("<>")
    ('Ha,Hb', 'H-C1', '')
    """
    text = text.strip()
    if text.startswith('<"') and text.endswith('">') and len(text) >= 4:
        return text[2:-2]
    return "" if text == "<>" else text


def split_label_group(text: str) -> tuple[tuple[str, ...], bool]:
    """Return the labels of a field and whether they stood in round brackets.

    Examples
    --------
    >>> split_label_group("(a, CA)"), split_label_group("H-(C3)"), split_label_group("")
    ((('a', 'CA'), True), (('H-(C3)',), False), ((), False))
    """
    text = text.strip()
    grouped = len(text) > 2 and text[0] == "(" and text[-1] == ")"
    fields = split_fields(text[1:-1]) if grouped else [text]
    return tuple(label for label in map(read_label, fields) if label), grouped
