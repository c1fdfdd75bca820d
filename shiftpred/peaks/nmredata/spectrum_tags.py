"""The tags NMREDATA_1D_1H, NMREDATA_1D_13C and their like: settings of the spectrum, then one signal a line."""

from __future__ import annotations

import re

from shiftpred.errors import quote
from shiftpred.peaks.annotations import parse_multiplicity
from shiftpred.peaks.nmredata.contents import Signal, Spectrum, SpectrumLine
from shiftpred.peaks.nmredata.labels import Complaints, read_number, split_label_group
from shiftpred.peaks.nmredata.tag_text import Item, split_fields
from shiftpred.peaks.plausibility import ACCEPTED_PPM
from shiftpred.records import Peak

__all__ = ["is_1d_tag", "parse_spectrum"]

_TAG = re.compile(r"NMREDATA_1D_(\d{1,3}[A-Z][a-z]?)(?:_[A-Za-z0-9]+_\d{1,3}[A-Z][a-z]?)?(?:#\d{1,4})?")
_SETTING = re.compile(r"([A-Za-z][\w ]*?)\s*=(.*)", re.DOTALL)
_ATTRIBUTE = re.compile(r"([A-Za-z]\w*)\s*=(.*)", re.DOTALL)
_JOINED = re.compile(r"\s+(?=[A-Z]\w{0,3}=)")  # 'L=a J=9.32(b)', as the standard's own examples print it
_VALUE = r"[-+]?(?:\d+\.?\d*|\.\d+)"
_SHIFT = re.compile(rf"({_VALUE})(?:\s*[-–]\s*({_VALUE}))?")
_COUPLING = re.compile(rf"({_VALUE})\s*(?:Hz)?\s*(?:\((.*)\))?", re.DOTALL)
_NUMERIC = ("E", "I", "W", "T1", "T2", "Diff")
_HIGHEST_MHZ, _LARGEST_HZ = 2000.0, 5000.0
_EXAMPLE = "a shift or range and attributes: '4.3820, S=q, N=2, L=a, J=7.10'"
_MOST_ATTACHED = 3
_MOST_HYDROGENS = 1000


def is_1d_tag(name: str) -> bool:
    """Say whether a tag describes a 1D spectrum."""
    return _TAG.fullmatch(name) is not None


def parse_spectrum(
    items: list[Item], tag: str, line: int, known: dict[str, Signal], level: int | None, complaints: Complaints
) -> Spectrum:
    """Read one 1D spectrum; a signal that cannot be read is named and left out, a bad attribute costs only itself.

    Parameters
    ----------
    items : list of Item
    tag : str
        A name for which `is_1d_tag` is true.
    line : int
        Line of the tag's header.
    known : dict of str to Signal
        Signals of the assignment by their labels.
    level : int or None
        The record's level.
    complaints : Complaints
        Problems are added to it.
    """
    nucleus = _TAG.fullmatch(tag)[1]
    settings: list[tuple[str, str]] = []
    frequency, lines = None, []
    for item in items:
        setting = _SETTING.fullmatch(item.text)
        if setting and not item.text[0].isdigit():
            key, value = setting[1].strip(), setting[2].strip()
            settings.append((key, value))
            if key.lower() == "larmor":
                frequency = _read_frequency(item, tag, value, complaints)
            continue
        found = _read_signal(item, tag, nucleus, known, level, len(lines) + 1, complaints)
        if found is not None:
            lines.append(found)
    return Spectrum(tag, nucleus, frequency, tuple(lines), tuple(settings), line)


def _read_frequency(item: Item, tag: str, text: str, complaints: Complaints) -> float | None:
    value = read_number(re.sub(r"\s*MHz$", "", text))
    if value is None or not 0 < value <= _HIGHEST_MHZ:
        complaints.add(item.line, tag, f"{quote(text, 40)} as Larmor frequency", "MHz of this nucleus", "Larmor=400.13")
        return None
    return value


def _read_signal(item, tag, nucleus, known, level, position, complaints: Complaints) -> SpectrumLine | None:
    fields = [piece for f in split_fields(item.text) for piece in _split_joined(f)]

    def complain(came: str, would_do: str = _EXAMPLE, try_next: str = "correct that line") -> None:
        complaints.add(item.line, tag, f"{quote(item.text[:100])}: {came}", would_do, try_next)

    shift = _SHIFT.fullmatch(fields[0]) if len(fields[0]) <= 60 else None
    if not shift:
        complain(f"{quote(fields[0], 40)} is no shift")
        return None
    ends = sorted(float(e) for e in shift.groups() if e)
    low, high = ACCEPTED_PPM.get(nucleus, (-1e5, 1e5))
    if ends[0] < low or ends[-1] > high:
        complain("outside any range", f"{nucleus} shifts from {low:g} to {high:g} ppm", "check decimal points; ppm, not Hz")
        return None
    attributes = _collect_attributes(fields[1:], complain)
    values: dict[str, list[str]] = dict(attributes)
    labels, ambiguous = _read_labels(values.get("L", []), known, level, complain)
    couplings, partners = _read_couplings(values.get("J", []), known, complain)
    hydrogens, attached = _read_count(values, nucleus, complain)
    multiplicity = _read_multiplicity(values.get("S", []), nucleus, complain)
    for key in _NUMERIC:
        for text in values.get(key, []):
            if read_number(text) is None:
                complain(f"{key}={quote(text, 30)[1:-1]} is no number", f"a number behind {key}=", "correct or leave it out")
    atoms = tuple(dict.fromkeys(a for label in labels for a in (known[label].atoms if label in known else ())))
    peak = Peak(
        nucleus,
        sum(ends) / len(ends),
        ends[0],
        ends[-1],
        hydrogens=hydrogens,
        attached_h=attached,
        multiplicity=multiplicity,
        couplings_hz=couplings,
        assignment=atoms,
        position=position,
        text=item.text,
    )
    written = tuple((key, ", ".join(texts)) for key, texts in attributes)
    return SpectrumLine(peak, labels, ambiguous, partners, written, item.line)


def _split_joined(text: str) -> list[str]:
    return [text] if '<"' in text else _JOINED.split(text)


def _collect_attributes(fields: list[str], complain) -> list[tuple[str, list[str]]]:
    """Return names and values; a field without '=' goes on with the values of the one before."""
    out: list[tuple[str, list[str]]] = []
    for text in fields:
        found = None if text.startswith("<") else _ATTRIBUTE.fullmatch(text)
        if found:
            if any(found[1] == key for key, _ in out):
                complain(f"attribute {quote(found[1], 20)[1:-1]} twice", "each attribute once", "leave one out")
                continue
            out.append((found[1], [found[2].strip()]))
        elif not text:
            continue
        elif out and out[-1][0] in ("L", "J"):
            out[-1][1].append(text)
        else:
            complain(f"{quote(text, 40)} is no attribute", "attributes such as 'S=t' or 'L=a'", "write name=value")
    return out


def _read_labels(texts: list[str], known, level, complain) -> tuple[tuple[str, ...], bool]:
    labels: list[str] = []
    ambiguous = False
    for text in texts:
        whole = text.strip()
        found, grouped = ((whole,), False) if whole in known else split_label_group(whole)
        labels += found
        ambiguous = ambiguous or (grouped and len(found) > 1)
    unknown = [label for label in labels if label not in known]
    if unknown:
        named = ", ".join(quote(label, 30) for label in unknown[:5])
        complain(f"label {named}, which no row of the assignment explains", "labels of the assignment", "add the label there")
    if ambiguous and level == 0:
        complain("an ambiguous assignment at level 0", "one label, or a level of 2 or 3", "NMREDATA_LEVEL 2")
    return tuple(dict.fromkeys(labels)), ambiguous


def _read_couplings(texts: list[str], known, complain) -> tuple[tuple[float, ...], tuple[str, ...]]:
    values, partners = [], []
    for text in texts:
        if not text:
            continue
        found = _COUPLING.fullmatch(text.strip())
        if not found or abs(float(found[1])) > _LARGEST_HZ:
            complain(f"{quote(text, 30)} is no coupling", "hertz, and the partner's label in brackets", "J=7.10(b)")
            continue
        partner = split_label_group(found[2])[0] if found[2] else ()
        values.append(abs(float(found[1])))
        partners.append(partner[0] if len(partner) == 1 else "")
        if partner and (len(partner) > 1 or partner[0] not in known):
            complain(f"coupling partner {quote(found[2], 30)} is not in the assignment", "a label of it", "add the label")
    return tuple(values), tuple(partners)


def _read_count(values, nucleus: str, complain) -> tuple[float | None, int | None]:
    """Return hydrogens (1H) and hydrogens attached to the carbon (13C) from N and E."""
    if "N" not in values:
        return None, None
    text = values["N"][0]
    count = read_number(text)
    if count is None or not 0 <= count <= _MOST_HYDROGENS:
        complain(f"N={quote(text, 30)[1:-1]} is no number of nuclei", "a whole number behind N=", "N=2")
        return None, None
    if nucleus == "13C":
        if count not in range(_MOST_ATTACHED + 1):
            if count != _MOST_ATTACHED + 1:  # CH4 is as it should be
                complain(f"N={text} hydrogens on a carbon", "0 to 3 behind N= of a carbon", "N=2 for CH2")
            return None, None
        return None, int(count)
    if nucleus != "1H":
        return None, None
    # The standard rounds N and keeps the integral in E; an E that rounds to N is in hydrogens.
    integral = read_number(values["E"][0]) if "E" in values else None
    if integral is not None and integral > 0 and round(integral) == count:
        count = integral
    return (count or None), None


def _read_multiplicity(texts: list[str], nucleus: str, complain) -> str | None:
    text = " ".join(texts).strip()
    if not text or (nucleus != "1H" and text.isdigit()):
        return None  # 13C 'S=2' of older files
    found = parse_multiplicity(text)[0] if len(text) <= 40 else None
    if found is None:
        complain(f"S={quote(text, 30)[1:-1]} is no multiplicity", "s, d, t, q, dd, m, bs, …", "S=m where none of them fits")
    return found
