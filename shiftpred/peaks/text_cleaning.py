"""One spelling for what publishers, word processors and web pages write in many, without losing the place of a character."""

from __future__ import annotations

import html
import re
from dataclasses import dataclass

__all__ = ["CleanText", "clean_text", "describe_place", "read_as_given", "read_place"]

_HYPHENS = "\u2010\u2011\u2212\ufe63\uff0d"  # hyphen, non-breaking hyphen, minus sign, small hyphen, fullwidth hyphen
_DASHES = "\u2012\u2013\u2014\u2015"  # figure dash, en dash, em dash, bar: they mean a range, never a sign
_SPACES = "\t\r\x0b\x0c\u00a0\u1680\u2000\u2001\u2002\u2003\u2004\u2005\u2006\u2007\u2008\u2009\u200a\u202f\u205f\u3000"
_NOTHING = "\u00ad\u200b\u200c\u200d\u200e\u200f\u2060\ufeff"  # soft hyphen, zero-width characters, byte order mark
_TIMES = "\u00d7\u2715\u2a2f\u00b7\u2219\u22c5"
_DELTAS = "\u2202\u1e9f\U0001d6ff\U0001d5ff\U0001d739"  # partial differential and mathematical letters used for a delta
_SUPERSCRIPTS = "⁰¹²³⁴⁵⁶⁷⁸⁹"
_LETTERS = {
    **dict.fromkeys(_HYPHENS, "-"),
    **dict.fromkeys(_DASHES, "–"),
    **dict.fromkeys(_SPACES, " "),
    **dict.fromkeys(_NOTHING, ""),
    **dict.fromkeys(_TIMES, "x"),
    **dict.fromkeys(_DELTAS, "δ"),
    **dict(zip("₀₁₂₃₄₅₆₇₈₉", "0123456789")),
    **dict(zip(_SUPERSCRIPTS, "0123456789")),
    **dict(zip("＝，；（）：．", "=,;():.")),
    **dict.fromkeys("′’‘ʹ", "'"),
    **dict.fromkeys("″”“", '"'),
    **dict.fromkeys("•◦▪‣●", "•"),
    "\u2028": "\n",
    "\u2029": "\n",
}
_MARKUP = re.compile(
    r"<br ?/?>|</?(?:sub|sup|i|b|u|em|strong|span|p|div|font)\b[^<>]{0,80}>|&#?[A-Za-z0-9]{2,8};"
    r"|\\(?:delta|times|text|mathrm|mathit|it|rm)\b ?|\$|[_^]\{([^{}]{1,12})\}|[_^](?=[A-Za-z0-9])",
    re.IGNORECASE,
)


@dataclass(frozen=True)
class CleanText:
    """A text in one spelling."""

    text: str
    origin: tuple[int, ...] | range
    """(len(text) + 1,) for each character its place in the text as given, and the end."""


def clean_text(given: str) -> CleanText:
    """Bring dashes, spaces, sub- and superscripts, web and typesetting markup to one plain spelling.

    Parameters
    ----------
    given : str

    Returns
    -------
    CleanText
        En and em dashes become '–' (a range), hyphens and minus signs '-'; a superscript right behind a number, which is a
        footnote and not a digit, becomes '^'.
    """
    if given.isascii() and not _MARKUP.search(given) and not any(c in given for c in "\t\r\x0b\x0c"):
        return CleanText(given, range(len(given) + 1))
    pieces: list[tuple[str, int]] = []
    at = 0
    for found in _MARKUP.finditer(given):
        pieces += [(letter, at + k) for k, letter in enumerate(given[at : found.start()])]
        pieces += [(letter, found.start()) for letter in _translate_markup(found)]
        at = found.end()
    pieces += [(letter, at + k) for k, letter in enumerate(given[at:])]
    letters: list[str] = []
    origin: list[int] = []
    for letter, place in pieces:
        new = _LETTERS.get(letter, letter)
        if letter in _SUPERSCRIPTS and letters and (letters[-1].isdigit() and _ends_decimal(letters)):
            new = "^"
        for one in new:
            letters.append(one)
            origin.append(place)
    return CleanText("".join(letters), (*origin, len(given)))


def _translate_markup(found: re.Match) -> str:
    token = found.group().lower()
    if token.startswith("<br"):
        return "\n"
    if token.startswith("&"):
        return html.unescape(found.group())
    if token.startswith("\\delta"):
        return "δ"
    if token.startswith("\\times"):
        return "x"
    return found.group(1) or ""


def _ends_decimal(letters: list[str]) -> bool:
    """Say whether the letters so far end in a number with a decimal point: '128.4' but not 'H2' or '13'."""
    return bool(re.search(r"\d\.\d+$", "".join(letters[-12:])))


def describe_place(given: str, index: int) -> str:
    """Name a place for a person: 'character 7', or 'line 2, character 7' in a text of several lines (1-based)."""
    if "\n" not in given.strip():
        return f"character {index + 1}"
    line = given.count("\n", 0, index) + 1
    return f"line {line}, character {index - (given.rfind(chr(10), 0, index) + 1) + 1}"


def read_place(clean: CleanText, given: str, begin: int, end: int) -> tuple[str, str]:
    """Return (place, text as given) of a stretch of the clean text."""
    return describe_place(given, clean.origin[begin]), read_as_given(clean, given, begin, end)


def read_as_given(clean: CleanText, given: str, begin: int, end: int) -> str:
    """Return a stretch of the clean text as it was given."""
    return given[clean.origin[begin] : clean.origin[min(end, len(clean.text))]].strip()
