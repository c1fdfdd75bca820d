"""Peaks the way journals print them, plain numbers and 'shift/…' pairs among them.

A scanner walks once through the text: a number or a range, then what belongs to it ('/…', '× 2', brackets, bare words such as
's, 3H'), then a separator. Whatever is none of these is a problem with its place; nothing is skipped.

Pairs: a whole number 0 to 3 behind '/' is the number of attached hydrogens ('128.4/1'); the other nucleus' shift must carry a
decimal point ('60.9/4.38', '60.9/4.0'). Anything else is refused, as it could mean either.
"""

from __future__ import annotations

import re
from dataclasses import replace

from shiftpred.peaks.annotations import Annotation, parse_annotation
from shiftpred.peaks.headings import find_section
from shiftpred.peaks.text_cleaning import CleanText, clean_text, describe_place, read_as_given, read_place
from shiftpred.records import Peak, PeakList

__all__ = ["MOST_PEAKS", "parse_journal_text"]

_VALUE = r"[-+]?(?:\d+(?:\.\d+)?|\.\d+)"
_NUMBER = re.compile(_VALUE)
_RANGE = re.compile(rf"(?P<high>{_VALUE})(?P<between> ?(?:–|-|~|to\b|\.{{2,3}}|…)[ \n]?)(?P<low>{_VALUE})")
_TIMES_BEFORE = re.compile(r"(\d{1,2})\s?x\s?(?=\d)")
_TIMES_BEHIND = re.compile(r"\s?(?:x\s?(\d{1,2})|\(\s?(?:x\s?(\d{1,2})|(\d{1,2})\s?x)\s?\))(?![\d.])")
_PAIR = re.compile(rf"\s?/\s?({_VALUE})(?!\d)")
_UNIT = re.compile(r"\s?ppm\b", re.IGNORECASE)
_FOOTNOTE = re.compile(r"[*†‡§#]{1,3}|\^{1,2}|[abce](?![A-Za-z0-9])")
_JOINING = re.compile(r"(?:and|&)\b|&", re.IGNORECASE)
_IDLE = re.compile(r"(?:ppm|δ|then|in|at)\b\.?|δ", re.IGNORECASE)
_BULLET = re.compile(r"[-–•*]\s+(?=[-.\d])")
_LABEL_BEFORE = re.compile(
    r"(?!\d?J)(?:[CH]-?\d{1,3}[a-z]?'{0,2}(?:[,/]\d{1,3}[a-z]?'{0,2})*|[A-Za-z][\w()'-]{0,15})\s?[:=]\s?(?=[-+]?\.?\d)"
)
_BARE = re.compile(
    r"[\s,]{0,3}(?:(?:(?:br|app|apt|broad)\.?\s?)?(?:singlet|doublet|triplet|quartet|quintet|sextet|septet|multiplet|"
    r"[dtq]{0,3}(?:quint|sept|sext)|[sdtqm]{1,4}|bs|brs)(?![\w=]|\s?=)|\d{1,2}(?:\.\d)?\s?H(?![\w-])|"
    r"J\s?(?:\([^()]{0,12}\)|[A-Z0-9,-]{0,6})?\s?=?\s?\d[\d., ]*?\s?Hz)"
)
_BARE_CARBON = re.compile(
    r"[\s,]{0,3}(?:\d{1,2}\s?x\s?)?(?:\d{1,2}\s?C(?![\w-])|(?:[ONS]|Ar)?CH[23]?(?![\w-])|Cq(?!\w)|C=O|CO(?!\w)|C(?![\w(\-=≡]))"
)
_DECIMAL_COMMA = re.compile(r"(?<![\d.,])(?<![A-Za-z]-)(?<![A-Za-z])\d{1,3},\d{1,3}(?![\d.])(?!,\d)(?!\s?[HCx]\b)")
_ONLY_COUPLINGS = re.compile(r"\s*\d{1,2}\.\d{1,2}(?:\s?[,;/]\s?\d{1,2}\.\d{1,2})*(?:\s?Hz)?\s*")
_WIDEST_RANGE = {"13C": 40.0, "1H": 8.0}
"""ppm; a wider one is a misprint or two shifts joined by a dash (common practice, no source)."""
MOST_PEAKS = 2_000
"""More are refused: they are the points of a spectrum."""
_MOST_PROBLEMS = 1_000
"""After so many the rest is not looked at."""
_ADVICE_COMMA = "decimal comma, or a list without spaces"


def parse_journal_text(text: str, nucleus: str) -> tuple[PeakList, list[tuple[str, str, str]]]:
    """Read journal text, plain numbers, or pairs.

    Parameters
    ----------
    text : str
        A list, a heading with its list, or a whole experimental paragraph with several spectra.
    nucleus : {'13C', '1H'}
        Which of them to read.

    Returns
    -------
    peaks : PeakList
        With solvent and frequency where the heading states them; `notes` say what was left unread and what was interpreted.
    problems : list of (place, text, reason)
        What could not be read; empty if all of it could.
    """
    clean = clean_text(text)
    section = find_section(clean.text, nucleus)
    problems = [(*read_place(clean, text, begin, end), reason) for begin, end, reason in section.problems]
    notes = list(section.notes)
    notes += [f"not read: '{_shorten(read_place(clean, text, begin, end)[1])}'" for begin, end in section.unread]
    if problems:
        return PeakList(nucleus, (), section.solvent, section.frequency_mhz, text, tuple(notes)), problems
    body = clean.text[: section.end]
    problems += _find_decimal_commas(clean, text, section.begin, section.end)
    if not problems:
        numbered = _find_line_numbers(body, section.begin)
        table = None if numbered else _find_table_without_heading(body, section.begin)
        if table is not None:
            place = describe_place(text, clean.origin[table])
            line = body[table : (body + "\n").index("\n", table)].strip()
            reason = "several numbers on each line without separators: a table without a heading"
            problems.append((place, line, reason))
        else:
            scanner = _Scanner(clean, text, section.begin, section.end, nucleus, numbered)
            scanner.run()
            problems, notes = scanner.problems, notes + scanner.notes
            if numbered:
                notes.append("the counting numbers at the beginning of the lines were left out")
            problems += _find_doubtful_pairs(scanner.peaks)
            peaks = _orient_pairs(scanner.peaks, nucleus, notes)
            peaks = _use_multiplicity_letters(peaks, nucleus, notes)
            peaks = [replace(p, position=k) for k, p in enumerate(peaks, 1)]
            return PeakList(nucleus, tuple(peaks), section.solvent, section.frequency_mhz, text, tuple(notes)), problems
    return PeakList(nucleus, (), section.solvent, section.frequency_mhz, text, tuple(notes)), problems


def _shorten(text: str, longest: int = 60) -> str:
    text = " ".join(text.split())
    return text if len(text) <= longest else text[: longest - 1] + "…"


def _find_decimal_commas(clean: CleanText, given: str, begin: int, end: int) -> list[tuple[str, str, str]]:
    """Two numbers joined by a comma without a space, where the other separators are not of this kind, may be one number."""
    body, depth = [], 0
    for letter in clean.text[begin:end]:  # brackets blanked, places kept
        depth += letter in "([{"
        body.append(" " if depth else letter)
        depth -= letter in ")]}" and depth > 0
    outside = "".join(body)
    found = list(_DECIMAL_COMMA.finditer(outside))
    if not found:
        return []
    if re.search(r"\d\.\d", outside) and not re.search(r"\d[ )]?(?:,\s|;|\n)", outside):
        return []
    return [(*read_place(clean, given, begin + m.start(), begin + m.end()), _ADVICE_COMMA) for m in found]


def _find_line_numbers(body: str, begin: int) -> dict[int, int]:
    """Return place → place behind it of counting numbers 1, 2, 3 … that head every line; empty if there are none."""
    found, expected = {}, 1
    at = begin
    for line in body[begin:].split("\n"):
        if line.strip():
            match = re.match(r"\s*[(\[]?(\d{1,4})(?:[.):\]]\s+|\s*[\t:]\s*|\s+)(?=[-+]?\.?\d)", line)
            if match is None or int(match.group(1)) != expected:
                return {}
            found[at + len(line) - len(line.lstrip())] = at + match.end()
            expected += 1
        at += len(line) + 1
    return found if len(found) >= 3 else {}


def _find_table_without_heading(body: str, begin: int) -> int | None:
    """Return the place of the first line if every line holds the same number of bare numbers and they are no running list."""
    lines = [(m.start(), m.group()) for m in re.finditer(r"[^\n]+", body[begin:]) if m.group().strip()]
    if len(lines) < 2:
        return None
    rows = []
    for _, line in lines:
        if not re.fullmatch(rf"\s*{_VALUE}(?:[\s,;]+{_VALUE})+\s*", line):
            return None
        rows.append([float(x) for x in _NUMBER.findall(line)])
    if len({len(row) for row in rows}) != 1:
        return None
    running = [x for row in rows for x in row]
    falling = all(a >= b for a, b in zip(running, running[1:]))
    rising = all(a <= b for a, b in zip(running, running[1:]))
    return None if falling or rising else begin + lines[0][0]


class _Scanner:
    """One walk through the text from `begin` to `end`."""

    def __init__(self, clean: CleanText, given: str, begin: int, end: int, nucleus: str, numbered: dict[int, int]):
        self.clean, self.given, self.nucleus, self.numbered = clean, given, nucleus, numbered
        self.text, self.at, self.end = clean.text[:end], begin, end
        self.peaks: list[Peak] = []
        self.annotated: list[bool] = []
        """For each peak, whether anything stood beside it."""
        self.problems: list[tuple[str, str, str]] = []
        self.notes: list[str] = []
        self.closing = _match_brackets(self.text)
        self.line_begins = True
        """True while nothing but blanks was read on the line."""
        self.label_at: int | None = None
        """Where a label before the next peak begins ('C-1: 166.6')."""

    def run(self) -> None:
        while self.at < self.end and len(self.problems) < _MOST_PROBLEMS and len(self.peaks) <= MOST_PEAKS:
            if not self._skip_separators():
                self._read_peak()

    def _skip_separators(self) -> bool:
        """Step over one separator; False where a peak must begin."""
        text, at = self.text, self.at
        if at in self.numbered:
            self.at = self.numbered[at]
            return True
        if self.line_begins and (bullet := _BULLET.match(text, at)):
            self.at, self.line_begins = bullet.end(), False
            return True
        if text[at] in " \n,;|•" or (text[at] == "." and not re.match(r"\.\d", text[at : at + 2])):
            self.line_begins = text[at] == "\n" or (self.line_begins and text[at] == " ")
            self.at += 1
            return True
        self.line_begins = False
        for pattern in (_JOINING, _IDLE, _LABEL_BEFORE):
            found = pattern.match(text, at, self.end)
            if found:
                self.label_at = at if pattern is _LABEL_BEFORE else self.label_at
                self.at = found.end()
                return True
        return False

    def _read_peak(self) -> None:
        text, begin = self.text, self.at
        times = _TIMES_BEFORE.match(text, begin)
        start = times.end() if times else begin
        between, single = _RANGE.match(text, start), _NUMBER.match(text, start)
        if single is None:
            self._refuse(begin, self._next_separator(begin), "not a number")
            return
        trouble = ""
        if between:
            between, trouble = self._judge_range(between)
        if between:
            ends = sorted((float(between.group("high")), float(between.group("low"))))
            self.at = between.end()
        else:
            ends = [float(single.group())] * 2
            self.at = single.end()
        peak = Peak(self.nucleus, (ends[0] + ends[1]) / 2 if between else ends[0], ends[0], ends[1])
        peak, found, more = self._read_attachments(peak)
        trouble = trouble or more
        if not trouble and self.at < self.end:
            letter = self.text[self.at]
            if letter == "." and re.match(r"\.\d", text[self.at : self.at + 2]):
                trouble = "two decimal points in one number"
            elif letter in "-–" and re.match(r".\s?\d", text[self.at : self.at + 3]):
                trouble = "a range with more than two ends"
            elif letter.isalnum() or letter in "+-–*/=<>^$#%\"'~:()[]{}":
                trouble = "something after the number that is not understood"
            if trouble:
                self.at = self._next_separator(self.at)
        if trouble:
            self._refuse(begin, self.at, trouble)
            return
        if times and self.nucleus == "13C":
            found.carbons = found.carbons or int(times.group(1))
        elif times:
            self._refuse(begin, self.at, "a count before a 1H shift; write the hydrogens in a bracket, '2.35 (6H)'")
            return
        self._store(peak, found, begin)

    def _judge_range(self, between: re.Match) -> tuple[re.Match | None, str]:
        """Tell '7.54–7.42' from '0.12 -0.05' (two shifts, the second negative)."""
        sign = between.group("between")
        first, second = float(between.group("high")), float(between.group("low"))
        if sign.startswith(" ") and sign.endswith("-"):  # a space before the hyphen and none behind it
            if second < 0.5 or abs(first - second) > (1.0 if self.nucleus == "1H" else 5.0):
                return None, ""
            return between, "a range or a negative shift? write '7.54-7.42' without the space, or put a comma"
        if "." in between.group("high") and "." not in between.group("low") and second > first:
            return between, "an abbreviated range; write both ends in full, '7.54-7.42'"
        if abs(first - second) > _WIDEST_RANGE[self.nucleus]:
            return between, f"a range wider than {_WIDEST_RANGE[self.nucleus]:g} ppm; separate single shifts"
        return between, ""

    def _read_attachments(self, peak: Peak) -> tuple[Peak, Annotation, str]:
        """Read what belongs to a number: a footnote mark, '/1', '/4.38', 'x 2', 'ppm', brackets, bare words."""
        text, found = self.text, Annotation()
        mark = _FOOTNOTE.match(text, self.at, self.end)
        if mark:
            self.at = mark.end()
        while pair := _PAIR.match(text, self.at, self.end):
            value = pair.group(1)
            self.at = pair.end()
            if "." in value and peak.pair_ppm is None:
                peak = replace(peak, pair_ppm=float(value))
            elif self.nucleus == "13C" and value in ("0", "1", "2", "3") and found.attached_h is None:
                found.attached_h = int(value)
            else:
                other = "1H" if self.nucleus == "13C" else "13C"
                kinds = "the number of hydrogens (0 to 3) or by " if self.nucleus == "13C" else ""
                return peak, found, f"'/' must be followed by {kinds}the {other} shift with a decimal point"
        times = _TIMES_BEHIND.match(text, self.at, self.end)
        if times:
            self.at = times.end()
            if self.nucleus == "1H":
                return peak, found, "a count behind a 1H shift; write the hydrogens in a bracket, '2.35 (6H)'"
            found.carbons = int(next(g for g in times.groups() if g))
        unit = _UNIT.match(text, self.at, self.end)
        self.at = unit.end() if unit else self.at
        bare_multiplicity = False
        bare = _BARE if self.nucleus == "1H" else re.compile(f"(?:{_BARE_CARBON.pattern})|(?:{_BARE.pattern})")
        while self.at < self.end:
            bracket = re.compile(r"\s*[(\[]").match(text, self.at, self.end)
            if bracket:
                opening = bracket.end() - 1
                closing = self.closing.get(opening)
                if closing is None:
                    self.at = min(self.end, max(self._next_line(self.at), self.at + 1))
                    return peak, found, "a bracket that is not closed"
                inside = text[opening + 1 : closing]
                if bare_multiplicity and _ONLY_COUPLINGS.fullmatch(inside):
                    found.couplings_hz += [float(x) for x in _NUMBER.findall(inside)]  # '7.26 d (8.0)'
                else:
                    found.merge(parse_annotation(inside, self.nucleus))
                self.at = closing + 1
                continue
            word = bare.match(text, self.at, self.end)
            if word is None:
                break
            found.merge(parse_annotation(word.group().strip(" ,\n"), self.nucleus))
            bare_multiplicity = found.multiplicity not in (None, "s", "m", "br s")
            self.at = word.end()
        return peak, found, found.problem

    def _store(self, peak: Peak, found: Annotation, begin: int) -> None:
        start = begin if self.label_at is None else self.label_at
        self.label_at = None
        written = read_as_given(self.clean, self.given, start, self.at)
        bare = found == Annotation()
        peak = replace(
            peak,
            hydrogens=found.hydrogens if self.nucleus == "1H" else None,
            attached_h=found.attached_h,
            carbons=found.carbons,
            multiplicity=found.multiplicity,
            couplings_hz=tuple(found.couplings_hz),
            text=written.rstrip(" ,;"),
        )
        self.peaks.append(peak)
        self.annotated.append(not bare)
        number = len(self.peaks)
        unclear = [x for x in found.labels if re.search(r"\bHz\b|(?<![A-Za-z])J\b", x)]
        if unclear:
            self.notes.append(f"peak {number}: '{unclear[0]}' was not understood and is kept as text only")
        if self.nucleus == "1H" and (found.each or found.shared_by > 1):
            self._share(number - 1, found)

    def _share(self, last: int, found: Annotation) -> None:
        """Give one bracket to all the shifts it stands for: '2.30, 2.28 (2 s, 6H)', '2.30 and 2.28 (s, each 3H)'."""
        group = [last]
        while group[0] > 0 and not self.annotated[group[0] - 1] and (found.each or len(group) < found.shared_by):
            if found.shared_by > 1 and len(group) == found.shared_by:
                break
            group.insert(0, group[0] - 1)
            if found.each and found.shared_by == 1 and not self._joined(group[0]):
                group.pop(0)
                break
        if len(group) == 1:
            return
        hydrogens = found.hydrogens if found.each or found.hydrogens is None else found.hydrogens / len(group)
        for k in group:
            self.peaks[k] = replace(
                self.peaks[k], hydrogens=hydrogens, multiplicity=found.multiplicity, couplings_hz=tuple(found.couplings_hz)
            )
            self.annotated[k] = True
        self.notes.append(f"peaks {group[0] + 1} to {last + 1} share one bracket: '{_shorten(self.peaks[last].text)}'")

    def _joined(self, k: int) -> bool:
        """Say whether peak `k` and the next stand beside each other with 'and', '&', ',' or '/' alone between them."""
        return not self.annotated[k]

    def _refuse(self, begin: int, end: int, reason: str) -> None:
        self.at = max(end, begin + 1)
        self.problems.append((*read_place(self.clean, self.given, begin, self.at), reason))

    def _next_separator(self, at: int) -> int:
        stop = re.compile(r"[,;\n]").search(self.text, at + 1, min(self.end, at + 200))
        return stop.start() if stop else min(self.end, at + 200)

    def _next_line(self, at: int) -> int:
        stop = self.text.find("\n", at, self.end)
        return stop if stop >= 0 else self.end


def _match_brackets(text: str) -> dict[int, int]:
    """Return opening → closing place of every bracket that is closed, of any kind."""
    pairs, stack = {"(": ")", "[": "]", "{": "}"}, []
    out = {}
    for at, letter in enumerate(text):
        if letter in pairs:
            stack.append((letter, at))
        elif letter in ")]}":
            if stack and pairs[stack[-1][0]] == letter:
                out[stack.pop()[1]] = at
            elif letter == ")":  # a stray inner bracket must not swallow the rest of the list
                while stack and stack[-1][0] != "(":
                    stack.pop()
                if stack:
                    out[stack.pop()[1]] = at
    return out


def _find_doubtful_pairs(peaks: list[Peak]) -> list[tuple[str, str, str]]:
    """A carbon and its hydrogen do not have nearly the same shift: '1.47/1.40' are two shifts of one nucleus."""
    return [
        (f"peak {k}", p.text, "two shifts of one nucleus, or a C-H pair? put a comma between two shifts")
        for k, p in enumerate(peaks, 1)
        if p.pair_ppm is not None and abs(p.shift_ppm - p.pair_ppm) < 1.0 and max(p.shift_ppm, p.pair_ppm) > 1.0
    ]


def _orient_pairs(peaks: list[Peak], nucleus: str, notes: list[str]) -> list[Peak]:
    """Turn pairs written the other way round, if all of them make sense only so."""
    pairs = [p for p in peaks if p.pair_ppm is not None and not p.is_range]
    if not pairs:
        return peaks
    own = [p.shift_ppm for p in pairs]
    other = [p.pair_ppm for p in pairs]
    hydrogens, carbons = (other, own) if nucleus == "13C" else (own, other)
    if max(hydrogens) > 25 and max(carbons) <= 25:
        notes.append(f"the pairs were read as {'1H/13C' if nucleus == '13C' else '13C/1H'}: only so do they make sense")
        peaks = [
            p
            if p.pair_ppm is None
            else replace(p, shift_ppm=p.pair_ppm, lower_ppm=p.pair_ppm, upper_ppm=p.pair_ppm, pair_ppm=p.shift_ppm)
            for p in peaks
        ]
    return peaks


def _use_multiplicity_letters(peaks: list[Peak], nucleus: str, notes: list[str]) -> list[Peak]:
    """Take s, d, t, q of an off-resonance 13C list as hydrogen counts, if every line has one and no coupling is stated."""
    if nucleus != "13C" or not peaks:
        return peaks
    letters = [p.multiplicity for p in peaks]
    if any(x not in ("s", "d", "t", "q") for x in letters) or any(p.couplings_hz or p.attached_h is not None for p in peaks):
        return peaks
    if len(set(letters)) >= 3:
        notes.append("every line has one of the letters s, d, t, q and none a coupling: read as C, CH, CH2, CH3")
        return [replace(p, attached_h="sdtq".index(p.multiplicity)) for p in peaks]
    if set(letters) != {"s"}:
        notes.append("letters s, d, t, q without couplings were not taken as hydrogen counts; write '128.4/1' if they are")
    return peaks
