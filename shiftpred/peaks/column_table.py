"""Peaks as a table with a heading: comma, semicolon, tab or space separated."""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Mapping

from shiftpred.peaks.annotations import parse_multiplicity
from shiftpred.peaks.headings import find_section
from shiftpred.peaks.text_cleaning import clean_text
from shiftpred.records import Peak, PeakList

__all__ = ["COLUMNS", "is_column_table", "parse_column_table", "parse_row"]

COLUMNS = {
    "shift_ppm": ("shift_ppm", "shift", "shifts", "ppm", "delta", "δ", "delta_ppm", "δ_ppm", "chemical_shift",
                  "chemical_shift_ppm",
                  "peak", "peak_ppm", "position", "position_ppm", "f1_ppm", "f1"),
    "attached_h": ("attached_h", "hydrogens_attached", "attached_hydrogens"),
    "integral": ("integral", "hydrogens", "nh", "n_h", "integration"),
    "multiplicity": ("multiplicity", "mult", "multiplet", "splitting"),
    "assignment": ("assignment", "atom", "atoms", "assigned_to"),
    "carbons": ("carbons", "nc", "n_c"),
    "j_hz": ("j_hz", "j", "couplings_hz", "coupling_hz", "couplings", "coupling"),
    "pair_ppm": ("pair_ppm", "pair"),
}  # fmt: skip
"""Column → spellings of its heading (case, blanks and units in brackets do not matter). A table with both a `13C` and a `1H`
column holds C-H pairs."""
_LONGEST_HEADING = 2_000
_SPELLING = {s: c for c, spellings in COLUMNS.items() for s in spellings}
_OF_NUCLEUS = {
    "13C": ("13c", "c13", "δc", "13c_ppm", "c_ppm", "13c_shift", "13c_shift_ppm"),
    "1H": ("1h", "h1", "δh", "1h_ppm", "h_ppm", "1h_shift", "1h_shift_ppm"),
}


def is_column_table(text: str) -> bool:
    """Say whether the first line (comments left out) is a heading that names a shift column."""
    lines = _data_lines(text)
    if not lines or len(lines[0][1]) > _LONGEST_HEADING:
        return False
    _, names = _split_heading(lines[0][1])
    if not all(re.fullmatch(r"[^\d.]*(?:13c|1h|c13|h1|f1)?[^\d]*", n) for n in names):
        return False
    if not {"shift_ppm", "pair_ppm"} & {_name_column(n, "13C") for n in names}:
        return False
    # One column: 'δ' above journal text is no table.
    return len(names) > 1 or all(re.fullmatch(r"\s*[-+−]?\d+(?:[.,]\d+)?\s*", line) for _, line in lines[1:])


def _data_lines(text: str) -> list[tuple[int, str]]:
    """Return (1-based line number, line) of every line that is neither blank nor a comment."""
    lines = enumerate(text.lstrip("\ufeff").splitlines(), 1)
    return [(k, line) for k, line in lines if line.strip() and not line.lstrip().startswith("#")]


def _split_heading(line: str) -> tuple[str, list[str]]:
    delimiter = max(",;\t", key=line.count)
    if line.count(delimiter) == 0:
        delimiter = " "
    cells = line.split() if delimiter == " " else next(csv.reader([line], delimiter=delimiter))
    if delimiter == " " and re.search(r"\s[(\[]", line):
        cells = [line]  # one column with its unit: 'shift (ppm)'
    return delimiter, [_plain_name(c) for c in cells]


def _plain_name(cell: str) -> str:
    name = cell.replace("\u00a0", " ").strip().strip('"').lower()
    name = re.sub(r"\s*[/]\s*ppm$|\s*[(\[]\s*ppm\s*[)\]]$", "_ppm", name)
    name = re.sub(r"\s*[/]\s*hz$|\s*[(\[]\s*hz\s*[)\]]$", "_hz", name)
    return re.sub(r"[\s-]+", "_", name).rstrip(".")


def _name_column(name: str, nucleus: str) -> str | None:
    if name in _SPELLING:
        return _SPELLING[name]
    if any(name in spellings for spellings in _OF_NUCLEUS.values()):
        return "shift_ppm" if name in _OF_NUCLEUS[nucleus] else "pair_ppm"
    return None


def parse_column_table(text: str, nucleus: str) -> tuple[PeakList, list[tuple[str, str, str]]]:
    """Read a table with a heading.

    Parameters
    ----------
    text : str
        First line: names of the columns (`COLUMNS`), in any order. Lines that begin with '#' are comments; solvent and
        frequency are taken from them.
    nucleus : {'13C', '1H'}

    Returns
    -------
    peaks : PeakList
    problems : list of (place, text, reason)
        Rows that could not be read.
    """
    lines = _data_lines(text)
    delimiter, names = _split_heading(lines[0][1])
    columns = [_name_column(n, nucleus) for n in names]
    if "shift_ppm" not in columns and "pair_ppm" in columns:  # only the other nucleus' column
        columns = ["shift_ppm" if c == "pair_ppm" else c for c in columns]
        other = "1H" if nucleus == "13C" else "13C"
        place = f"line {lines[0][0]}"
        return PeakList(nucleus, (), text=text), [
            (place, lines[0][1], f"the heading says {other}, but the list was given as {nucleus}")
        ]
    problems: list[tuple[str, str, str]] = []
    notes: list[str] = []
    repeated = sorted({c for c in columns if c and columns.count(c) > 1})
    if repeated:
        problems.append((f"line {lines[0][0]}", lines[0][1].strip(), f"two columns for {repeated[0]}"))
        return PeakList(nucleus, (), text=text), problems
    unused = [n for n, c in zip(names, columns) if n and c is None]
    unused += [n for n, c in zip(names, columns) if c in (("integral",) if nucleus == "13C" else ("attached_h", "carbons"))]
    if unused:
        notes.append(f"columns not used: {', '.join(unused)}")
    solvent, frequency = _read_comments(text, nucleus, notes)
    peaks: list[Peak] = []
    rows = [(number, line, _split_row(line, delimiter)) for number, line in lines[1:]]
    decimal_commas = delimiter != "," and _has_decimal_commas([row for _, _, row in rows], columns)
    if decimal_commas:
        notes.append("decimal commas read as decimal points")
    for number, line, row in rows:
        if not any(cell.strip() for cell in row):
            continue
        try:
            if len([c for c in row if c.strip()]) > len(columns) or any(c.strip() for c in row[len(columns) :]):
                raise ValueError(
                    "more cells than columns"
                    + (": decimal comma?" if delimiter == "," and len(row) == len(columns) + 1 else "")
                )
            cells = {c: cell.strip() for c, cell in zip(columns, row) if c}
            if decimal_commas:
                cells = {c: _replace_commas(cell) if c in _DECIMALS else cell for c, cell in cells.items()}
            peak, labels = parse_row(cells, nucleus, len(peaks) + 1, line.strip())
        except ValueError as error:
            problems.append((f"line {number}", line.strip(), str(error)))
            continue
        peaks.append(peak)
        if labels:
            notes.append(f"peak {len(peaks)}: assignment '{labels}' is a label, not an atom number; kept as text")
    return PeakList(nucleus, tuple(peaks), solvent, frequency, text, tuple(notes)), problems


def _split_row(line: str, delimiter: str) -> list[str]:
    return line.split() if delimiter == " " else next(csv.reader(io.StringIO(line), delimiter=delimiter))


_DECIMALS = ("shift_ppm", "integral", "j_hz", "pair_ppm")
"""Columns whose cells may hold decimals."""


def _has_decimal_commas(rows: list[list[str]], columns: list[str | None]) -> bool:
    """Say whether the shifts are written with decimal commas throughout, as a German Excel exports them.

    One decimal point among them, and the commas stay what they are: refused, because nobody can tell what they mean.
    """
    shifts = [cell.strip() for row in rows for c, cell in zip(columns, row) if c in ("shift_ppm", "pair_ppm")]
    return any("," in cell for cell in shifts) and not any("." in cell for cell in shifts)


def _replace_commas(cell: str) -> str:
    return re.sub(r"(?<=\d),(?=\d)", ".", cell)


def _read_comments(text: str, nucleus: str, notes: list[str]) -> tuple[str | None, float | None]:
    comments = [line.lstrip(" #") for line in text.splitlines() if line.lstrip().startswith("#")]
    if not comments:
        return None, None
    section = find_section(clean_text(f"NMR ({'; '.join(comments)}) δ ").text, nucleus)
    notes.append("comment lines: " + "; ".join(" ".join(c.split()) for c in comments)[:120])
    return section.solvent, section.frequency_mhz


def _number(text: str, column: str) -> float:
    text = text.strip().strip('"')
    if re.fullmatch(r"[-+−]?\d+,\d+", text):
        raise ValueError(f"decimal comma in {column}")
    try:
        value = float(text.replace("−", "-"))
    except ValueError:
        raise ValueError(f"{column} '{text[:20]}' is not a number" if text else f"{column} is blank") from None
    if not math.isfinite(value):
        raise ValueError(f"{column} is not finite")
    return value


def _whole(text: str, column: str, low: int, high: int) -> int:
    value = _number(text, column)
    if value != int(value) or not low <= value <= high:
        raise ValueError(f"{column} is not a whole number from {low} to {high}")
    return int(value)


def parse_row(cells: Mapping, nucleus: str, position: int, text: str) -> tuple[Peak, str]:
    """Read one row.

    Parameters
    ----------
    cells : mapping of str to str
        By column name; columns may be missing or blank.
    nucleus : {'13C', '1H'}
    position : int
        1-based.
    text : str
        The row as written.

    Returns
    -------
    peak : Peak
    label : str
        What the assignment cell says if it is no list of atom numbers; '' otherwise.

    Raises
    ------
    ValueError
        Which cell cannot be read, and why.
    """
    get = {k: "" if v is None else str(v).strip() for k, v in cells.items()}.get
    shift = clean_text(get("shift_ppm", "")).text.strip()
    between = re.fullmatch(r"([-+]?\d+(?:\.\d+)?) ?(?:–|-|to) ?([-+]?\d+(?:\.\d+)?)", shift)
    ends = sorted(float(x) for x in between.groups()) if between else [_number(shift, "shift_ppm")] * 2
    hydrogens = None
    if get("integral") and nucleus == "1H":
        hydrogens = _number(re.sub(r"\s?H$", "", get("integral")), "integral")
        if hydrogens <= 0:
            raise ValueError("integral is not positive")
    attached = _whole(get("attached_h"), "attached_h", 0, 3) if get("attached_h") and nucleus == "13C" else None
    carbons = _whole(get("carbons"), "carbons", 1, 60) if get("carbons") and nucleus == "13C" else None
    couplings = [_number(x, "j_hz") for x in re.split(r"[;,\s]+", get("j_hz")) if x] if get("j_hz") else []
    if any(j < 0 for j in couplings):
        couplings = [abs(j) for j in couplings]
    atoms = [a for a in re.split(r"[;,\s]+", get("assignment", "")) if a]
    numeric = bool(atoms) and all(re.fullmatch(r"\d{1,4}", a) and int(a) > 0 for a in atoms)
    multiplicity = get("multiplicity") or None
    peak = Peak(
        nucleus,
        sum(ends) / 2,
        ends[0],
        ends[1],
        hydrogens=hydrogens,
        attached_h=attached,
        carbons=carbons,
        multiplicity=(parse_multiplicity(multiplicity)[0] or multiplicity) if multiplicity else None,
        couplings_hz=tuple(couplings),
        pair_ppm=_number(get("pair_ppm"), "pair_ppm") if get("pair_ppm") else None,
        assignment=tuple(int(a) for a in atoms) if numeric else (),
        position=position,
        text=text,
    )
    return peak, "" if numeric else get("assignment", "")
