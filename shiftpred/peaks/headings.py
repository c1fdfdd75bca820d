"""Headings of journal text: which nucleus, which solvent, which frequency, and where the peaks begin and end."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from shiftpred.errors import SettingError
from shiftpred.peaks.solvents import normalise_solvent

__all__ = ["CARBON_RATIO", "Section", "find_section"]

CARBON_RATIO = 0.25145
"""13C frequency over 1H frequency in one magnet (IUPAC: Harris et al., Pure Appl. Chem. 2001, 73, 1795: 25.145020 %)."""
_PROTON_MAGNETS = (250.0, 270.0, 300.0)
"""1H frequencies (MHz) below 305 that are too common to be taken for a 13C frequency (common practice, no source)."""
_CARBON_OF_MAGNETS = (75.5, 100.6, 125.8, 150.9, 176.0, 201.2)

_NUCLEI = {"13C": "13C", "C": "13C", "CARBON": "13C", "1H": "1H", "H": "1H", "PROTON": "1H"}
_ISOTOPES = {"C": "13", "H": "1", "F": "19", "P": "31", "B": "11", "N": "15", "SI": "29", "SE": "77", "D": "2"}
_NMR = r"(?:N\.?M\.?R\b\.?|RMN\b)"
_HEAD = re.compile(
    rf"(?P<first>\d{{1,3}}\s?[A-Z][a-z]?)\s?(?:\{{[^{{}}]{{0,12}}\}})?[\s-]*(?:DEPT[\s-]*(?:\d+)?[\s-]*|APT[\s-]*)?{_NMR}"
    rf"|(?P<turned>[A-Z][a-z]?-?\d{{1,3}})\s?(?:\{{[^{{}}]{{0,12}}\}})?[\s-]*{_NMR}"
    rf"|{_NMR}[\s:,-]{{0,3}}\(?(?P<behind>\d{{1,3}}\s?[A-Z][a-z]?(?:\s?\{{[^{{}}]{{0,12}}\}})?)(?=[\s,;:()])"
    rf"|\b(?P<word>carbon|proton)[\s-]*{_NMR}"
    r"|δ\s?\(?(?P<delta>[CHFP])(?![A-Za-z0-9])\)?",
    re.IGNORECASE,
)
_PLAIN_HEAD = re.compile(rf"{_NMR}|δ")
_TAIL = re.compile(
    r"(?:HR-?MS|HR-?ESI-?MS|HR-?EI-?MS|LR-?MS|LC-?MS|GC-?MS|ESI-?MS|EI-?MS|APCI|MALDI|MS|IR|FT-?IR|ATR|UV(?:-?vis)?|"
    r"Anal\.?|Elemental|[Mm]\.?[Pp]\.?|Melting|TLC|HPLC|R_?f|\[α\]|\[a\]_?D|Yield|EA|CHN|HSQC|HMBC|COSY|NOESY)"
    r"(?=[\s:(,=.])"
)
_UNIT_WORDS = re.compile(r"(?:δ|delta\b|ppm\b|chemical shifts?\b|d(?=\s?=)|d(?=\s+\d))", re.IGNORECASE)
_FREQUENCY = re.compile(r"(\d{2,4}(?:\.\d{1,4})?)\s?M\s?Hz", re.IGNORECASE)
_TEMPERATURE = re.compile(r"[+-]?\d{1,3}(?:\.\d{1,2})?\s?(?:K\b|°\s?C|o\s?C\b|ºC|℃)")
_TOKEN = re.compile(r"[\[(]?[A-Za-z0-9][\w\[\]().+'-]*")
_WORD = re.compile(r"[A-Za-z][A-Za-z.'-]*")
_LONGEST_HEADING = 600
_NOT_SOLVENTS = {
    "tms",
    "dss",
    "tsp",
    "h2o",
    "water",
    "ppm",
    "h",
    "c",
    "rt",
    "d",
    "other",
    "neat",
    "mixture",
    "nmr",
    "hz",
    "mhz",
    "in",
    "at",
}


@dataclass
class Section:
    """The part of a text that holds one nucleus' peaks."""

    begin: int
    """Place of the first character behind the heading."""
    end: int
    solvent: str | None = None
    frequency_mhz: float | None = None
    notes: list[str] = field(default_factory=list)
    problems: list[tuple[int, int, str]] = field(default_factory=list)
    """(begin, end, what is wrong)."""
    unread: list[tuple[int, int]] = field(default_factory=list)
    """(begin, end) of what belongs to something else (other nuclei, masses, infrared)."""


def find_section(text: str, nucleus: str) -> Section:
    """Find one nucleus' peaks in a text, which may be a whole experimental paragraph.

    Parameters
    ----------
    text : str
        In one spelling, see `clean_text`.
    nucleus : {'13C', '1H'}

    Returns
    -------
    Section
        The whole text where it has no heading.
    """
    heads = _find_heads(text)
    if not heads:
        return _find_plain_section(text, nucleus)
    own = [k for k, (_, _, name) in enumerate(heads) if name == nucleus]
    if not own:
        begin, end, name = heads[0]
        section = Section(end, len(text))
        section.problems.append((begin, end, f"the heading says {name}, but the list was given as {nucleus}"))
        return section
    first = own[0]
    stop = next((heads[k][0] for k in range(first + 1, len(heads)) if heads[k][2] != nucleus), len(text))
    section = Section(heads[first][1], stop)
    again = [k for k in own[1:] if heads[k][0] > stop or _holds_peaks(text[heads[k - 1][1] : heads[k][0]])]
    if again:
        begin, end, _ = heads[again[0]]
        section.problems.append((begin, end, f"a second {nucleus} heading; give one list at a time"))
        return section
    merged = [k for k in own if k > first and heads[k][0] < stop]
    for k in [first, *merged]:
        section.begin = max(section.begin, heads[k][1])
    opening = _find_opening(text, heads[first][0])
    conditions = text[opening : section.begin]
    section.begin = _read_conditions_on(text, section, section.begin, words_too=True)
    _store_conditions(conditions + " " + text[heads[first][1] : section.begin], nucleus, section)
    if text[:opening].strip(" \n.,;:-"):
        section.unread.append((0, opening))
    _cut_tail(text, section)
    if stop < len(text):
        section.unread.append((stop, len(text)))
    return section


def _find_heads(text: str) -> list[tuple[int, int, str]]:
    """Return (begin, end, nucleus) of every heading that names a nucleus."""
    found = []
    for match in _HEAD.finditer(text):
        stated = next(g for g in match.groups() if g)
        letters = re.sub(r"[^A-Za-z]", "", stated.split("{")[0]).upper()
        digits = re.sub(r"\D", "", stated.split("{")[0])
        if digits and _ISOTOPES.get(letters) != digits:
            continue
        name = (
            _NUCLEI.get(letters if not digits else digits + letters) or (digits or _ISOTOPES.get(letters, "")) + letters.title()
        )
        found.append((match.start(), match.end(), name))
    return found


def _holds_peaks(text: str) -> bool:
    """Say whether numbers stand between two headings, brackets and conditions left out."""
    bare = _FREQUENCY.sub(" ", re.sub(r"\([^()]*(?:\([^()]*\)[^()]*)*\)|\[[^\[\]]*\]", " ", text))
    return bool(re.search(r"(?<![\w-])\d+\.\d+|(?<![\w-])\d+\s?,\s?\d", bare))


def _find_opening(text: str, at: int) -> int:
    """Include a bracket or 'MHz' that stands before the nucleus: '(400 MHz, CDCl3) 1H NMR'."""
    lead = re.search(
        r"(?:\([^()]{0,60}(?:\([^()]{0,20}\)[^()]{0,40})?\)|\d{2,3}(?:\.\d+)?\s?MHz)[\s,:]*$", text[max(0, at - 140) : at]
    )
    if lead and (_FREQUENCY.search(lead.group()) or _name_solvents(lead.group())):
        return max(0, at - 140) + lead.start()
    return at


def _find_plain_section(text: str, nucleus: str) -> Section:
    section = Section(0, len(text))
    head = _PLAIN_HEAD.search(text[:300])
    if head and not re.search(r"\d\.\d", _FREQUENCY.sub("", text[: head.start()])):
        section.begin = _read_conditions_on(text, section, head.end(), words_too=True)
        lead = re.match(r"\s*(?:\([^()]*(?:\([^()]*\)[^()]*)*\)|[\s:,]|\d+(?:\.\d+)?\s?MHz)*", text[: head.start()]).end()
        if text[lead : head.start()].strip(" \n.,;:-") and not _name_solvents(text[: head.start()]):
            section.unread.append((lead, head.start()))
    else:
        section.begin = _read_conditions_on(text, section, 0, words_too=False)
    _store_conditions(text[: section.begin], nucleus, section)
    _cut_tail(text, section)
    return section


def _read_conditions_on(text: str, section: Section, at: int, words_too: bool) -> int:
    """Walk from `at` over solvent, frequency, temperature, units and (where `words_too`) words, to the first peak."""
    start, words = at, 0
    while at < section.end and at - start < 400:
        if text[at] in " \n\t:;,=./|)" or (text[at] in "-–" and not re.match(r".\s?\.?\d", text[at : at + 3])):
            at += 1
            continue
        unit = _UNIT_WORDS.match(text, at)
        if unit:
            at = unit.end()
            continue
        if text[at] in "([":
            end = _close(text, at)
            inside = text[at + 1 : end - 1] if end > 0 else ""
            token = _TOKEN.match(text, at)
            if end > 0 and _is_condition(inside):
                at = end
                continue
            if token and _name_solvents(token.group()):
                at = token.end()
                continue
            break
        piece = _FREQUENCY.match(text, at) or _TEMPERATURE.match(text, at)
        if piece:
            at = piece.end()
            continue
        token = _TOKEN.match(text, at)
        if token and re.search(r"[A-Za-z]", token.group()) and _name_solvents(token.group().rstrip(".")):
            at = token.end()
            continue
        word = _WORD.match(text, at) if words_too else None
        if word and words < 12 and not re.match(r"(?:[sdtqm]|br)\b", word.group()):
            words, at = words + 1, word.end()
            continue
        ratio = re.match(r"\d{1,3}\s?:\s?\d{1,3}|\d{1,3}(?:\.\d+)?\s?%", text[at : at + 12]) if words_too else None
        if ratio:
            at += ratio.end()
            continue
        break
    if at < section.end and text[at] in "([" and words_too is False:
        return start
    return min(at, section.end)


def _is_condition(inside: str) -> bool:
    if not inside.strip() or _FREQUENCY.search(inside) or _TEMPERATURE.fullmatch(inside.strip()):
        return True
    if re.fullmatch(r"[\s,;:=]*(?:δ|ppm|in ppm|TMS|[CH]|[δ,; ]*ppm)[\s,;:=]*", inside):
        return True
    return bool(_name_solvents(inside))


def _name_solvents(text: str) -> list[str]:
    """Return the short names of the solvents in a stretch of text, in their order, each once."""
    found = []
    text = re.sub(r"\((CD3|CH3)\)\s?2\s?(SO|CO)", r"\1-2-\2", text)
    text = re.sub(r"\[\s?(?:D|d|2H)\s?_?(\d{1,2})\s?\]-?\s?", r"d\1-", text)
    for part in re.split(r"[,;/\s()\[\]]+|(?<=\D)[:+](?=\D)", text):
        part = part.strip(" .δ=:")
        if not part or part.lower() in _NOT_SOLVENTS or part.isdigit():
            continue
        try:
            name = normalise_solvent(part.replace("-2-", "2"))
        except SettingError:
            continue
        if name and name not in found and name not in ("other", "neat", "mixture"):
            found.append(name)
    return found


def _store_conditions(text: str, nucleus: str, section: Section) -> None:
    """Take solvent and frequency from the heading; say what was made of them."""
    text = text[:_LONGEST_HEADING]
    names = _name_solvents(text)
    if len(names) > 1:
        section.solvent = "mixture"
        section.notes.append(f"the heading names {' and '.join(names)}: taken as a mixture")
    elif names:
        section.solvent = names[0]
    else:
        unknown = re.search(r"[\w,()\[\]-]*(?:[A-Za-z)]-?[dD]_?\d{1,2}\b|\bd\d{1,2}-\w+|\[[Dd]\d{1,2}\]-?\w+)[\w-]*", text)
        if unknown:
            section.notes.append(f"the solvent in the heading, '{unknown.group().strip()}', is not one that is known here")
    found = _FREQUENCY.search(text)
    if found is None:
        return
    frequency = float(found.group(1))
    if nucleus == "13C" and (frequency >= 305 or any(abs(frequency - m) <= 0.9 for m in _PROTON_MAGNETS)):
        section.frequency_mhz = round(frequency * CARBON_RATIO, 3)
        section.notes.append(f"{frequency:g} MHz in a 13C heading is the 1H frequency: 13C at {section.frequency_mhz:g} MHz")
    elif nucleus == "1H" and any(abs(frequency - m) <= 0.7 for m in _CARBON_OF_MAGNETS) and frequency not in (75.0, 100.0):
        section.frequency_mhz = round(frequency / CARBON_RATIO, 1)
        section.notes.append(f"{frequency:g} MHz in a 1H heading is the 13C frequency: 1H at {section.frequency_mhz:g} MHz")
    else:
        section.frequency_mhz = frequency


def _cut_tail(text: str, section: Section) -> None:
    """End the section before mass, infrared and other data that follow the peaks."""
    depth = 0
    for at in range(section.begin, section.end):
        letter = text[at]
        if letter in "([{":
            if depth == 0 and at > 0 and text[at - 1] in " \n.;" and _TAIL.match(text, at):
                break
            depth += 1
        elif letter in ")]}":
            depth = max(0, depth - 1)
        elif depth == 0 and letter.isalpha() and not text[at - 1 : at].isalnum() and _TAIL.match(text, at):
            break
    else:
        return
    section.unread.append((at, section.end))
    section.end = at


def _close(text: str, at: int) -> int:
    """Return the place behind the bracket that closes the one at `at`, -1 within 400 characters if none does."""
    depth = 0
    for k in range(at, min(len(text), at + 400)):
        depth += text[k] in "([{"
        depth -= text[k] in ")]}"
        if depth == 0:
            return k + 1
    return -1
