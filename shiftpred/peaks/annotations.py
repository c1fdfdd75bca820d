"""What stands beside a shift: multiplicity, couplings, numbers of hydrogens and carbons, kind of carbon."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

__all__ = ["KINDS", "Annotation", "parse_annotation", "parse_multiplicity"]

KINDS = {
    0: "C Cq qC C(q) quat quaternary C=O CO C≡N CN CF3 CO2H COOH ipso C-ipso Cipso i-C",
    1: "CH ArCH CHAr CHarom CHar CHO OCH NCH SCH CHN =CH CH=",
    2: "CH2 OCH2 NCH2 SCH2 CH2O CH2N CH2S =CH2 CH2= ArCH2 PhCH2 CH2Ph CH2Ar",
    3: "CH3 OCH3 NCH3 SCH3 CH3O CH3N CH3S ArCH3 CH3Ar OMe NMe SMe MeO MeN MeS Me",
}
"""Attached hydrogens → labels of a 13C line that state them beyond doubt; any other label is text only."""
_ATTACHED = {label: count for count, labels in KINDS.items() for label in labels.split()}

_WORDS = {
    "singlet": "s", "singlets": "s", "doublet": "d", "doublets": "d", "triplet": "t", "triplets": "t", "quartet": "q",
    "quartets": "q", "quintet": "quint", "quintuplet": "quint", "quin": "quint", "quint": "quint", "pentet": "quint",
    "pent": "quint", "p": "quint", "sextet": "sext", "sextuplet": "sext", "sext": "sext", "sex": "sext", "hex": "sext",
    "septet": "sept", "septuplet": "sept", "sept": "sept", "sep": "sept", "heptet": "sept", "hept": "sept", "octet": "oct",
    "oct": "oct", "nonet": "non", "non": "non", "multiplet": "m", "multiplets": "m", "mult": "m", "mc": "m",
}  # fmt: skip
_LAST = "quint|quin|sext|sept|hept|oct|non|pent|p|[sdtqm]"
_SHORT = re.compile(rf"(?:[dtq]{{0,4}}|[dtq]?quint|[dtq]?sept)(?:{_LAST})")
_QUALIFIERS = {
    "br": "br", "broad": "br", "b": "br", "app": "app", "apparent": "app", "apt": "app", "pseudo": "app", "ps": "app",
    "virt": "app",
    "overlapping": "", "overlapped": "", "unresolved": "", "partially": "", "resolved": "", "complex": "", "like": "app",
    "sharp": "", "distorted": "", "poorly": "", "fine": "", "narrow": "", "very": "v", "v": "v",
}  # fmt: skip
_SPECIAL = re.compile(r"ABq?|AB q|ABX|AA'(?:BB'|XX'|MM')|ABd|AX")

_NUMBER = r"\d{1,4}(?:\.\d{1,4})?"
_J_HEAD = re.compile(r"(?<![A-Za-z])(?:[1-9n]\s?)?J(?![a-z])")
_J_EQUALS = re.compile(
    r"\s?(?:\([^()]{0,20}\)|\{[^{}]{0,20}\}|[A-Za-z0-9',/α-ω_→>\s-]{0,18}?)\s?(?:=|:|≈|~|≃|≅)\s?(?:ca\.?|~|≈|<|>)?\s?"
)
_J_BARE = re.compile(
    r"\s?(?:\([^()]{0,20}\)|\{[^{}]{0,20}\}|[A-Z][A-Z0-9,'-]{0,6}|\d{1,2}[a-z]?,\d{1,2}[a-z]?(?=\s))?\s?(?=\d)"
)
_J_VALUE = re.compile(
    rf"(?:(\d)\s?x\s?)?({_NUMBER})(?:\s?[–-]\s?({_NUMBER}))?(?=\s?Hz|\s?[,;/&+)]|\s?and\b|\s+\d|\s?$|\s+[A-Za-z])\s?(?:Hz)?"
)
_J_NEXT = re.compile(
    rf"\s?(?:,|;|/|&|\+|and\b)?\s?(?=(?:\d\s?x\s?)?{_NUMBER}(?:\s?Hz|\s?[,;/&+)]|\s?and\b|\s?$))(?!\d{{1,3}}\s?[HC]\b)"
)
_J_COMMA = re.compile(r"(?<![\d.,])\d{1,3},\d{1,2}(?![\d.,])(?!\s?[HC]\b)")
_LONE_HZ = re.compile(rf"({_NUMBER}(?:\s?(?:,|and|/|&)\s?{_NUMBER})*)\s?Hz")
_BARE_J = re.compile(r"\d{1,3}\.\d{1,2}|[1-9]\d\d")

_HYDROGENS = re.compile(
    r"(?:each|ca\.?|~|≈|about)?\s?(?:(\d{1,2})\s?x\s?)?(\d{1,3}(?:\.\d{1,2})?)\s?H(?:'?s)?"
    r"(?:\s(each|total|in total))?(?:[\s:].*)?",
)
_CARBONS = re.compile(r"(\d{1,2})\s?x?\s?C(?:'?s)?|C\s?x\s?(\d{1,2})|x\s?(\d{1,2})|(\d{1,2})\s?x", re.IGNORECASE)
_TIMES_LABEL = re.compile(r"(\d{1,2})\s?x\s?(\S.*)|(\d{1,2})\s?((?:Ar|[ONS])?CH[23]?)|(\S.*?)\s?x\s?(\d{1,2})")


@dataclass
class Annotation:
    """What a bracket says about one shift; blank where it says nothing."""

    hydrogens: float | None = None
    carbons: int | None = None
    attached_h: int | None = None
    multiplicity: str | None = None
    couplings_hz: list[float] = field(default_factory=list)
    each: bool = False
    """True where the bracket speaks of each of several shifts."""
    shared_by: int = 1
    """Number of shifts that the bracket belongs to ('2 s')."""
    labels: list[str] = field(default_factory=list)
    """What is a label: kept as text."""
    problem: str = ""

    def merge(self, other: Annotation) -> None:
        """Take over what `other` says and this one does not."""
        for name in ("hydrogens", "carbons", "attached_h", "multiplicity"):
            if getattr(self, name) is None:
                setattr(self, name, getattr(other, name))
        self.couplings_hz += other.couplings_hz
        self.labels += other.labels
        self.each = self.each or other.each
        self.shared_by = max(self.shared_by, other.shared_by)
        self.problem = self.problem or other.problem


def parse_annotation(text: str, nucleus: str) -> Annotation:
    """Read the inside of a bracket.

    Parameters
    ----------
    text : str
        In one spelling, see `clean_text`.
    nucleus : {'13C', '1H'}

    Returns
    -------
    Annotation

    Examples
    --------
    >>> found = parse_annotation("dd, J = 8.1, 1.2 Hz, 2H, H-5", "1H")
    >>> found.multiplicity, found.couplings_hz, found.hydrogens, found.labels
    ('dd', [8.1, 1.2], 2.0, ['H-5'])
    """
    out = Annotation()
    rest = _take_couplings(" ".join(text.split()), out)
    after_multiplicity = False
    for item in _split(rest):
        if _LONE_HZ.fullmatch(item):
            out.couplings_hz += [float(x) for x in re.findall(_NUMBER, item)]
            continue
        if after_multiplicity and _BARE_J.fullmatch(item):
            out.couplings_hz.append(float(item))  # '(t, 7.1, 2H)': the coupling without its letter
            continue
        before = out.multiplicity
        if not _read_item(item, nucleus, out) and not _read_words(item, nucleus, out):
            out.labels.append(item)
        after_multiplicity = (
            out.multiplicity is not None and out.multiplicity != before and out.multiplicity not in ("s", "m", "br s")
        )
    return out


def _read_words(item: str, nucleus: str, out: Annotation) -> bool:
    """Read an item of several words without commas ('s 3H') if every word means something."""
    words = item.split()
    if not 1 < len(words) <= 4:
        return False
    trial = Annotation()
    if not all(_read_item(word, nucleus, trial) for word in words):
        return False
    out.merge(trial)
    return True


def _read_item(item: str, nucleus: str, out: Annotation) -> bool:
    item = item.strip(" .")
    if item.lower() in ("each", "both"):
        out.each = True
        return True
    multiplicity, count = parse_multiplicity(item)
    is_kind = nucleus == "13C" and item in _ATTACHED
    if multiplicity and not is_kind:
        if multiplicity == "br" and out.multiplicity and not out.multiplicity.startswith("br"):
            out.multiplicity = f"br {out.multiplicity}"  # '(s, br, 1H)'
        elif out.multiplicity == "br" and multiplicity != "br":
            out.multiplicity = f"br {multiplicity}"
        out.multiplicity = out.multiplicity or multiplicity
        out.each = out.each or item.lower().startswith("each ")
        out.shared_by = max(out.shared_by, count)
        return True
    return _read_hydrogens(item, out) if nucleus == "1H" else _read_carbons(item, out)


def _read_hydrogens(item: str, out: Annotation) -> bool:
    found = _HYDROGENS.fullmatch(item)
    if found:
        hydrogens = float(found.group(2)) * int(found.group(1) or 1)
        if hydrogens == 0:
            return False  # '0H', as some programs print for the solvent, counts nothing
        out.hydrogens = hydrogens
        out.each = out.each or found.group(3) == "each" or item.lower().startswith("each")
        return True
    methyls = re.fullmatch(r"(\d)\s?x\s?(?:[ONS]|Ar)?-?CH3", item)
    if methyls:  # '2 × CH3': six hydrogens, unless the bracket counts them itself
        out.hydrogens = out.hydrogens or 3.0 * int(methyls.group(1))
        out.labels.append(item)
        return True
    return False


def _read_carbons(item: str, out: Annotation) -> bool:
    plain = _CARBONS.fullmatch(item)
    if plain:
        count, label = int(next(g for g in plain.groups() if g)), ""
    else:
        times = _TIMES_LABEL.fullmatch(item)
        if times:
            groups = times.groups()
            count, label = int(groups[0] or groups[2] or groups[5]), (groups[1] or groups[3] or groups[4]).strip()
        else:
            count, label = None, item
    if count is not None:
        if not 1 <= count <= 60:
            return False
        out.carbons = out.carbons or count
        if not label:
            return True
    attached = _ATTACHED.get(label, _ATTACHED.get(label.replace("-", "").replace(" ", "")))
    if attached is not None:
        out.attached_h = attached if out.attached_h is None else out.attached_h
        return True
    if count is not None:
        out.labels.append(item)
        return True
    return False


def parse_multiplicity(text: str) -> tuple[str | None, int]:
    """Return (multiplicity in its short form, number of multiplets), (None, 1) where the text is none.

    Examples
    --------
    >>> parse_multiplicity("br. s."), parse_multiplicity("doublet of triplets"), parse_multiplicity("2 × s".replace("×", "x"))
    (('br s', 1), ('dt', 1), ('s', 2))
    """
    if _SPECIAL.fullmatch(text):
        return text, 1
    words = text.lower().replace(".", " ").replace("-", " ").replace(",", " ").split()
    if words and words[0] == "each":
        words = words[1:]
    count = 1
    if words and (found := re.fullmatch(r"([2-4])x?", words[0])) and len(words) > 1:
        count, words = int(found.group(1)), words[1:]
        words = words[1:] if words[0] == "x" else words
    elif words and (found := re.fullmatch(r"([2-4])x?([sdtqm]{1,3})", words[0])):
        count, words[0] = int(found.group(1)), found.group(2)
    if not words or len(words) > 7:
        return None, 1
    prefix, core = "", ""
    for word in words:
        if word in ("of", "a"):
            continue
        if word in _QUALIFIERS:
            prefix = f"{prefix} {_QUALIFIERS[word]}".strip()
        elif word in _WORDS:
            core += _WORDS[word]
        elif (found := re.fullmatch(rf"(?:(br|b)({_SHORT.pattern}))|(?:({_SHORT.pattern})(br))", word)) and word not in ("bp",):
            prefix, core = f"{prefix} br".strip(), core + (found.group(2) or found.group(3))
        elif _SHORT.fullmatch(word) and not (core and word in "sm"):
            core += re.sub(r"(?:quin|pent|p)$", "quint", re.sub(r"hept$", "sept", word)) if not word.endswith("quint") else word
        else:
            return None, 1
    if not core and "br" in prefix.split():
        return "br", count
    return (f"{prefix} {core}".strip(), count) if core else (None, 1)


def _take_couplings(text: str, out: Annotation) -> str:
    """Take every 'J = …' out of the text; what remains is returned."""
    kept, at = "", 0
    while found := _J_HEAD.search(text, at):
        head = _J_EQUALS.match(text, found.end()) or _J_BARE.match(text, found.end())
        value = _J_VALUE.match(text, head.end()) if head else None
        if value is None:
            kept += text[at : found.end()]
            at = found.end()
            continue
        kept += text[at : found.start()]
        begin = head.end()
        while value:
            numbers = [float(x) for x in value.groups()[1:] if x]
            out.couplings_hz += [sum(numbers) / len(numbers)] * int(value.group(1) or 1)
            at = value.end()
            following = _J_NEXT.match(text, at)
            value = _J_VALUE.match(text, following.end()) if following else None
        comma = _J_COMMA.search(text[begin:at])
        if comma:
            out.problem = f"'J = {comma.group()}' may be a decimal comma or two couplings without a space"
        kept += " "
    return kept + text[at:]


def _split(text: str) -> list[str]:
    """Split at commas and semicolons outside inner brackets."""
    parts, depth, current = [], 0, ""
    for letter in text:
        depth += (letter in "([{") - (letter in ")]}")
        if letter in ",;" and depth <= 0:
            parts.append(current)
            current = ""
        else:
            current += letter
    return [p.strip() for p in [*parts, current] if p.strip(" .")]
