"""Peaks the way journals print them, plain numbers among them.

A scanner walks once through the text: a number or a range, then what belongs to it (a bracket, '/…', '× 2'), then a separator.
Whatever is none of these is a problem with its place; nothing is skipped.
"""

from __future__ import annotations

import re
from dataclasses import replace

from shiftpred.errors import SettingError
from shiftpred.peaks.solvents import normalise_solvent
from shiftpred.records import Peak, PeakList

__all__ = ["parse_journal_text"]

_PLAIN = str.maketrans(
    {**dict.fromkeys("‐‑‒–—―−﹣－", "-"), **dict.fromkeys("×✕⨯·∙", "x"), **dict.fromkeys("\u00a0\u2009\u202f\u2002\u2003\u2007\u200a\t\r", " "),
     **dict.fromkeys("\u200b\ufeff\u2060", ""), "＝": "=", "′": "'", "″": '"', "，": ",", "；": ";", "（": "(", "）": ")",
     **dict(zip("₀₁₂₃₄₅₆₇₈₉", "0123456789")), **dict(zip("⁰¹²³⁴⁵⁶⁷⁸⁹", "0123456789"))}
)
_NUMBER = re.compile(r"[-+]?\d{1,5}(?:\.\d{1,6})?|[-+]?\.\d{1,6}")
_RANGE = re.compile(r"(-?\d{1,5}(?:\.\d{1,6})?) ?(?:-|to\b|\.\.\.?) ?(-?\d{1,5}(?:\.\d{1,6})?)")
_MULTIPLICITY = re.compile(
    r"(?:(?:br\.?|broad|app\.?|apparent|partially resolved|overlapping|unresolved)[ .]{0,2})?"
    r"(?:singlet|doublet|triplet|quartet|quintet|sextet|septet|heptet|octet|nonet|multiplet|sept|hept|quint|quin|pent|sext|sex|oct|non|hex|"
    r"[sdtqmp]{1,5}|bs|bd|bt|bm|bq|AB ?q|ABX?|br|broad|dquint|dsept|qd)(?: of (?:doublets?|triplets?|quartets?)){0,3}"
    r"(?:[ ,]{0,2}(?:br\.?|broad))?",
    re.IGNORECASE,
)
_J_LIST = re.compile(
    r"(?<![A-Za-z])[0-9n]?\s?J\s?(?:\([^()]{0,20}\)|[A-Za-z]{0,3}[A-Za-z0-9',_/-]{0,12})?\s?[=:≈~]\s?~?"
    r"(\d{1,4}(?:\.\d{1,3})?(?:\s?(?:,|and|&|/|;)\s?\d{1,4}(?:\.\d{1,3})?(?!\s?[HC]\b)(?!\d))*)\s?(?:Hz)?",
)
_LONE_J = re.compile(r"^(?:\dJ)?\s?(?:J\s)?(\d{1,4}(?:\.\d{1,3})?(?:\s?,\s?\d{1,4}(?:\.\d{1,3})?)*)\s?Hz$")
_COUNT_H = re.compile(r"^(?:(\d{1,2})\s?x\s?)?(\d{1,3}(?:\.\d{1,2})?)\s?H(?:'s)?(?:\s?each)?$")
_COUNT_C = re.compile(r"^(\d{1,2})\s?x?\s?C$|^x?\s?(\d{1,2})$|^(\d{1,2})\s?x$|^C\s?x\s?(\d{1,2})$")
_TIMES = re.compile(r"^(\d{1,2})\s?x\s?(C(?:H[1-3]?)?|Ar-?C(?:H)?|[CO]?CH3|NCH3|OCH3|Ar-?H|CH)\b.*$|^(.*?)\s?x\s?(\d{1,2})$")
_KIND = {"C": 0, "CH": 1, "CH2": 2, "CH3": 3, "Cq": 0, "q C": 0, "quat": 0, "quat.": 0, "quaternary": 0}
_HEADING_END = re.compile(r"δ|\bdelta\b|\bd\s?=|ppm\)?\s?[:=]|:\s|=\s")


def parse_journal_text(text: str, nucleus: str):
    """Read journal text or plain numbers.

    Parameters
    ----------
    text : str
    nucleus : {'13C', '1H'}

    Returns
    -------
    peaks : PeakList
        With solvent and frequency where the heading states them.
    problems : list of (place, text, reason)
        What could not be read; empty if all of it could.
    """
    clean = text.translate(_PLAIN).replace("δC", "δ").replace("δH", "δ").replace("δ_C", "δ").replace("δ_H", "δ")
    clean = re.sub(r" {2,}", " ", clean)
    start, solvent, frequency, notes, problems = _parse_heading(clean, nucleus)
    if not problems and _has_decimal_comma(clean[start:]):
        found = re.search(r"\d+,\d+", clean[start:])
        return PeakList(nucleus, (), text=text), [(f"character {start + found.start() + 1}", found.group(), "decimal comma, or a list without spaces")]
    peaks, more = _scan(clean, start, nucleus)
    peaks = [replace(p, position=k) for k, p in enumerate(peaks, 1)]
    return PeakList(nucleus, tuple(peaks), solvent, frequency, text, tuple(notes)), problems + more


def _has_decimal_comma(body: str) -> bool:
    outside = re.sub(r"\([^()]*\)", " ", body)
    if re.search(r"\d\.\d", outside):
        return False
    return bool(re.search(r"(?<![\d.])\d{1,3},\d{1,2}(?!\d)", outside))


def _parse_heading(text: str, nucleus: str):
    """Find where the peaks begin, and what the words before them state."""
    notes: list[str] = []
    at = re.search(r"\bNMR\b", text[:300], re.IGNORECASE)
    delta = text.find("δ", 0, 400)
    if at is None and delta < 0:
        lead = re.match(r"\s*(?:\((?P<inside>[^()]{0,80}(?:\([^()]{0,20}\)[^()]{0,40})?)\)|ppm)?\s*[:=]?\s*", text)
        return (lead.end() if lead.group("inside") or "ppm" in lead.group() else 0), *_read_conditions(lead.group("inside") or ""), notes, []
    if delta >= 0 and (at is None or delta < 400):
        end = delta + 1
    else:
        end = at.end()
        bracket = re.match(r"[^0-9(]{0,20}\(", text[end:])
        if bracket:
            end = _close(text, end + bracket.end() - 1)
        stop = re.match(r"[^0-9]{0,30}?(?:[:=]|ppm\)?[:,]?)", text[end:])
        end += stop.end() if stop else 0
    heading = text[:end]
    rest = re.match(r"\s*(?:\(\s*(?:ppm|δ)[^()]{0,12}\)|/\s*ppm|\bppm\b|in ppm)?\s*(?:[:=]|\bppm\b)?\s*", text[end:])
    end += rest.end()
    follow = re.match(r"\(([^()]{0,60}(?:\([^()]{0,20}\)[^()]{0,40})?)\)\s*[:=]?\s*", text[end:])
    if follow and not re.match(r"\s*\d+(?:\.\d+)?\s*[,)]?$", follow.group(1)) and re.search(r"MHz|CD|DMSO|D2O|MeOD|C6D6|acetone|chloroform", follow.group(1)):
        heading += follow.group(1)
        end += follow.end()
    stated = re.search(r"\b(13C|1H|C-?13|H-?1)\b|\b(13|1)\s?\{?C|13C", heading)
    if stated:
        said = "13C" if "13" in stated.group() else "1H"
        if said != nucleus:
            return end, None, None, notes, [("heading", heading.strip()[:60], f"the heading says {said}, but the list was given as {nucleus}")]
    return end, *_read_conditions(heading), notes, []


def _read_conditions(heading: str):
    solvent = frequency = None
    found = re.search(r"(\d{2,4}(?:\.\d{1,3})?)\s?M(?:Hz|HZ|hz)", heading)
    if found:
        frequency = float(found.group(1))
    for part in re.split(r"[,;:\s]\s*|(?<=\w)\)\s|(?<!\w)\((?!CD3)", heading):
        part = part.strip(" ()δ.")
        if not part or part.lower() in ("nmr", "d", "h2o", "water", "ppm"):
            continue
        for candidate in (part, "(" + part if part.startswith("CD3)") else part):
            try:
                solvent = solvent or normalise_solvent(candidate)
            except SettingError:
                continue
    return solvent, frequency


def _close(text: str, at: int) -> int:
    """Return the place behind the bracket that closes the one at `at`."""
    depth = 0
    for k in range(at, min(len(text), at + 400)):
        depth += text[k] in "([{"
        depth -= text[k] in ")]}"
        if depth == 0:
            return k + 1
    return -1


def _scan(text: str, at: int, nucleus: str):
    peaks: list[Peak] = []
    problems: list[tuple[str, str, str]] = []
    n = len(text)
    while at < n:
        if text[at] in " ,;.\n&|" and not re.match(r"\.\d", text[at:at + 2]):
            at += 1
            continue
        word = re.match(r"(?:and|ppm|δ|then|or)\b\.?", text[at:at + 8])
        if word and text[at:at + 2] != "or" or word and word.group().startswith("δ"):
            at += word.end()
            continue
        times = re.match(r"(\d{1,2})\s?x\s(?=\d)", text[at:at + 8])
        count = None
        if times:
            count, at = int(times.group(1)), at + times.end()
        between = _RANGE.match(text, at)
        single = None if between else _NUMBER.match(text, at)
        if between is None and single is None:
            stop = re.search(r"[,;\n]", text[at:at + 200])
            end = at + (stop.start() if stop else min(200, n - at))
            end = max(end, at + 1)
            problems.append((f"character {at + 1}", text[at:end].strip(), "not a number"))
            at = end
            continue
        begin = at
        ends = sorted(float(x) for x in between.groups()) if between else [float(single.group())] * 2
        at = (between or single).end()
        peak = Peak(nucleus, sum(ends) / 2, ends[0], ends[1], carbons=count if nucleus == "13C" else None)
        at, peak, trouble = _read_attachments(text, at, peak)
        if trouble:
            problems.append((f"character {begin + 1}", text[begin:at].strip(), trouble))
        elif at < n and (text[at].isalnum() or text[at] in "+-*/=<>^$#%\"'"):
            stop = re.search(r"[,;\n]", text[at:at + 200])
            end = at + (stop.start() if stop else min(200, n - at))
            problems.append((f"character {begin + 1}", text[begin:end].strip(), "something after the number that is not understood"))
            at = max(end, at + 1)
        peaks.append(replace(peak, text=text[begin:at].strip()))
    return peaks, problems


def _read_attachments(text: str, at: int, peak: Peak):
    """Read what belongs to a number: '/1', '/4.38', 'x 2', 'ppm', one or several brackets."""
    pair = re.match(r"\s?/\s?(-?\d{1,3}(?:\.\d+)?)(?![\d])", text[at:at + 14])
    if pair:
        at += pair.end()
        value = pair.group(1)
        if "." in value:
            peak = replace(peak, pair_ppm=float(value))
        elif peak.nucleus == "13C" and value in ("0", "1", "2", "3"):
            peak = replace(peak, attached_h=int(value))
        else:
            return at, peak, "'/' must be followed by the number of hydrogens (0 to 3) or by the other nucleus' shift with a decimal point"
    times = re.match(r"\s?(?:x\s?(\d{1,2})|\((?:x\s?(\d{1,2})|(\d{1,2})\s?x)\))(?!\.?\d)", text[at:at + 10])
    if times:
        at += times.end()
        count = int(next(g for g in times.groups() if g))
        peak = replace(peak, carbons=count) if peak.nucleus == "13C" else peak
    unit = re.match(r"\s?ppm\b", text[at:at + 5])
    at += unit.end() if unit else 0
    while True:
        bracket = re.match(r"\s?[(\[]", text[at:at + 2])
        if not bracket:
            return at, peak, ""
        begin = at + bracket.end() - 1
        end = _close(text, begin)
        if end < 0:
            stop = re.search(r"\n|$", text[at:at + 200])
            return at + stop.start(), peak, "a bracket that is not closed"
        peak = _read_bracket(text[begin + 1 : end - 1], peak)
        at = end


def _read_bracket(inside: str, peak: Peak) -> Peak:
    """Take multiplicity, couplings, counts and kind of carbon from a bracket; labels are kept in the peak's text only."""
    couplings: list[float] = []

    def take(found):
        couplings.extend(float(x) for x in re.findall(r"\d+(?:\.\d+)?", found.group(1)))
        return " "

    rest = _J_LIST.sub(take, inside)
    for item in _split(rest):
        lone = _LONE_J.match(item)
        if lone:
            couplings.extend(float(x) for x in lone.group(1).split(","))
            continue
        hydrogens, carbons = _COUNT_H.match(item), _COUNT_C.match(item)
        if hydrogens and peak.nucleus == "1H":
            peak = replace(peak, hydrogens=float(hydrogens.group(2)) * int(hydrogens.group(1) or 1))
        elif carbons and peak.nucleus == "13C" and not (carbons.group(2) and not item.startswith("x")):
            peak = replace(peak, carbons=int(next(g for g in carbons.groups() if g)))
        elif item in _KIND and peak.nucleus == "13C":
            peak = replace(peak, attached_h=_KIND[item])
        elif peak.multiplicity is None and _MULTIPLICITY.fullmatch(item.strip(" .")):
            peak = replace(peak, multiplicity=" ".join(item.strip(" .").split()))
        else:
            peak = _read_times(item, peak)
    return replace(peak, couplings_hz=peak.couplings_hz + tuple(couplings)) if couplings else peak


def _read_times(item: str, peak: Peak) -> Peak:
    """'2 × CH3', 'CH × 2', '2 × OCH3': a count and perhaps the kind of carbon; anything else is a label."""
    found = _TIMES.match(item)
    if not found:
        return peak
    count = int(found.group(1) or found.group(4))
    what = (found.group(2) or found.group(3) or "").strip()
    if peak.nucleus == "13C":
        peak = replace(peak, carbons=count)
        kind = re.search(r"C(H[23]?)?$", what)
        if kind and what:
            peak = replace(peak, attached_h=_KIND["C" + (kind.group(1) or "")]) if kind.group(1) else peak
    return peak


def _split(text: str) -> list[str]:
    parts, depth, current = [], 0, ""
    for letter in text:
        depth += (letter in "([") - (letter in ")]")
        if letter in ",;" and depth == 0:
            parts.append(current)
            current = ""
        else:
            current += letter
    return [p.strip() for p in [*parts, current] if p.strip()]
