"""The tags NMREDATA_ASSIGNMENT (once NMREDATA_SIGNALS) and NMREDATA_J."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from rdkit import Chem

from shiftpred.errors import quote
from shiftpred.peaks.nmredata.contents import UNKNOWN_SHIFT_PPM, Coupling, Signal
from shiftpred.peaks.nmredata.labels import Complaints, read_label, read_number, read_whole_number, split_label_group
from shiftpred.peaks.nmredata.tag_text import Item, split_fields

__all__ = ["AssignmentTable", "DrawnAtoms", "parse_assignment", "parse_couplings"]

_KEYWORD = re.compile(r"(Interchangeable|Equivalent)\s*(?:=|\s)\s*(.*)", re.IGNORECASE | re.DOTALL)
_HYDROGENS = re.compile(r"[Hh]\s?(\d{1,9})")
_NUCLEI = {"C": "13C", "H": "1H"}
_FARTHEST_PPM = 1e5
_EXAMPLE = "label, shift, atoms: 'a, 4.3820, H3' or 'A, 60.91, 3'"
_MOST_BONDS = 9


@dataclass(frozen=True)
class DrawnAtoms:
    """Elements and hydrogens of the structure as drawn, by the user's numbers."""

    elements: dict[int, str]
    hydrogens: dict[int, int]
    """Heavy atom: hydrogens on it, drawn or implied."""
    bearers: dict[int, int]
    """Drawn hydrogen: the heavy atom that bears it."""

    @classmethod
    def build(cls, raw: Chem.Mol, structure) -> DrawnAtoms:
        """Read the table of a molfile as drawn and of the structure made from it."""
        elements = {a.GetIdx() + 1: a.GetSymbol() for a in raw.GetAtoms()}
        bearers = {}
        for atom in raw.GetAtoms():
            near = atom.GetNeighbors()
            if atom.GetAtomicNum() == 1 and len(near) == 1:
                bearers[atom.GetIdx() + 1] = near[0].GetIdx() + 1
        counts = [a.GetTotalNumHs() for a in structure.mol.GetAtoms()]
        return cls(elements, dict(zip(structure.atom_numbers, counts)), bearers)


@dataclass
class AssignmentTable:
    """What the assignment says."""

    signals: dict[str, Signal] = field(default_factory=dict)
    interchangeable: list[tuple[tuple[str, ...], ...]] = field(default_factory=list)
    equivalent: list[tuple[str, ...]] = field(default_factory=list)


def parse_assignment(items: list[Item], tag: str, drawn: DrawnAtoms | None, complaints: Complaints) -> AssignmentTable:
    """Read the assignment; a row that cannot be read is named and left out.

    Parameters
    ----------
    items : list of Item
    tag : str
    drawn : DrawnAtoms or None
        None: the structure cannot be read, and atom numbers are taken as they are.
    complaints : Complaints
        Problems are added to it.
    """
    table = AssignmentTable()
    keywords = []
    for item in items:
        keyword = _KEYWORD.fullmatch(item.text)
        if keyword:
            keywords.append((item, keyword[1].lower(), keyword[2]))
        else:
            _read_row(item, tag, drawn, table, complaints)
    for item, keyword, content in keywords:
        _read_keyword(item, keyword, content, tag, table, complaints)
    return table


def _read_row(item: Item, tag: str, drawn: DrawnAtoms | None, table: AssignmentTable, complaints: Complaints) -> None:
    fields = split_fields(item.text)
    label = read_label(fields[0])

    def complain(came: str, would_do: str = _EXAMPLE, try_next: str = "correct that line") -> None:
        complaints.add(item.line, tag, f"{quote(item.text[:100])}: {came}", would_do, try_next)

    if len(fields) < 2 or not label:
        complain("no shift behind the label" if label else "no label")
        return
    shift = read_number(fields[1])
    if shift is None or abs(shift) > _FARTHEST_PPM:
        ranged = re.fullmatch(r"[-+.\d]+\s*-\s*[-+.\d]+", fields[1])
        came = f"the range {fields[1]} as shift" if ranged else f"{quote(fields[1], 40)} as shift"
        complain(came, "one number in ppm (777.777 where it is not known)", "give the centre; ranges belong to the 1D spectra")
        return
    if label in table.signals:
        complain(
            f"label {quote(label, 40)} was given on line {table.signals[label].line}",
            "each label once, with all its atoms",
            "give one of the two another label",
        )
        return
    shift = None if abs(shift - UNKNOWN_SHIFT_PPM) < 1e-6 else shift
    atoms, named, nuclei = [], [], []
    for text in fields[2:]:
        if not text:
            continue
        found = _read_atom(text, drawn, complain)
        if found is None:
            continue
        atom, hydrogen, nucleus = found
        atoms.append(atom)
        nuclei.append(nucleus)
        if hydrogen:
            named.append(hydrogen)
    kinds = sorted(set(nuclei) - {""})
    if len(kinds) > 1:
        complain(f"atoms of {' and '.join(kinds)} under one label", "atoms of one element", "give each nucleus its own label")
        return
    table.signals[label] = Signal(
        label, shift, kinds[0] if kinds else "", tuple(dict.fromkeys(atoms)), tuple(dict.fromkeys(named)), item.line
    )


def _read_atom(text: str, drawn: DrawnAtoms | None, complain) -> tuple[int, int, str] | None:
    """Return (atom, drawn hydrogen or 0, nucleus); None after a complaint."""
    of_hydrogens = _HYDROGENS.fullmatch(text)
    number = int(of_hydrogens[1]) if of_hydrogens else read_whole_number(text)
    if number is None:
        complain(f"{quote(text, 40)} as atom", "an atom number, or H and the number of the atom that bears hydrogens", "H3")
        return None
    if drawn is None:
        return number, 0, "1H" if of_hydrogens else ""
    if number not in drawn.elements:
        complain(
            f"atom {number}, and the structure has {len(drawn.elements)} atoms",
            f"atom numbers from 1 to {len(drawn.elements)}",
            "count in the order of the molfile, from 1",
        )
        return None
    if of_hydrogens:
        bearer = drawn.bearers.get(number)
        if bearer is not None:
            complain(f"H{number}, but atom {number} is a hydrogen", "the number of the atom that bears it", f"H{bearer}")
            return None
        if not drawn.hydrogens.get(number):
            complain(
                f"H{number}, but atom {number} ({drawn.elements[number]}) bears no hydrogen",
                "an atom with hydrogens",
                f"write {number} if the atom itself is meant",
            )
            return None
        return number, 0, "1H"
    bearer = drawn.bearers.get(number)
    if bearer is not None:
        return bearer, number, "1H"
    symbol = drawn.elements[number]
    return number, 0, _NUCLEI.get(symbol, symbol)


def _read_keyword(item: Item, keyword: str, content: str, tag: str, table: AssignmentTable, complaints: Complaints) -> None:
    groups = [split_label_group(text)[0] for text in split_fields(content)]
    unknown = [label for group in groups for label in group if label not in table.signals]
    if unknown or len(groups) < 2 or not all(groups):
        named = ", ".join(quote(label, 30) for label in unknown[:5])
        came = f"{named}, which no row of the assignment explains" if unknown else "fewer than two labels"
        complaints.add(
            item.line,
            tag,
            f"{quote(item.text[:100])}: {came}",
            "two or more labels of the assignment",
            f"{keyword.capitalize()}=a, b",
        )
        return
    if keyword == "interchangeable":
        if len({len(group) for group in groups}) > 1:
            complaints.add(
                item.line,
                tag,
                f"{quote(item.text[:100])}: groups of different sizes",
                "as many labels in each group",
                "Interchangeable=(a, CA), (b, CB)",
            )
            return
        table.interchangeable.append(tuple(groups))
    else:
        table.equivalent.append(tuple(label for group in groups for label in group))


def parse_couplings(items: list[Item], tag: str, known: dict[str, Signal], complaints: Complaints) -> list[Coupling]:
    """Read the coupling table.

    Parameters
    ----------
    items : list of Item
    tag : str
    known : dict of str to Signal
        Signals of the assignment by their labels.
    complaints : Complaints
        Problems are added to it.
    """
    out = []
    for item in items:
        if _KEYWORD.fullmatch(item.text):
            continue  # which couplings are equal by symmetry: follows from the structure
        fields = split_fields(item.text)
        labels = [read_label(f) for f in fields[:2]]
        hz = read_number(fields[2]) if len(fields) > 2 else None
        example = "two labels and hertz: 'a, b, 7.10'"
        if hz is None or not all(labels):
            complaints.add(item.line, tag, f"{quote(item.text[:100])}, which is no coupling", example, "correct that line")
            continue
        unknown = [label for label in labels if label not in known]
        if unknown:
            named = " and ".join(quote(label, 30) for label in unknown)
            complaints.add(
                item.line,
                tag,
                f"{quote(item.text[:100])}: {named} not in the assignment",
                "labels of the assignment",
                "add the label",
            )
        bonds = None
        for extra in fields[3:]:
            key, _, value = extra.partition("=")
            count = read_whole_number(value)
            if key.strip().lower() == "nb" and count is not None and 1 <= count <= _MOST_BONDS:
                bonds = count
            elif extra:
                complaints.add(item.line, tag, f"{quote(item.text[:100])}: {quote(extra, 30)}", "'nb=' and the bonds", "nb=3")
        out.append(Coupling(labels[0], labels[1], hz, bonds, item.line))
    return out
