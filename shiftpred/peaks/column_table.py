"""Peaks as a table with a header: comma, semicolon or tab separated."""

from __future__ import annotations

import csv
import io
import math
import re

from shiftpred.records import Peak, PeakList

__all__ = ["COLUMNS", "is_column_table", "parse_column_table"]

COLUMNS = {
    "shift_ppm": ("shift_ppm", "shift", "ppm", "delta", "δ", "delta_ppm"),
    "attached_h": ("attached_h", "hydrogens_attached"),
    "integral": ("integral", "hydrogens", "nh"),
    "multiplicity": ("multiplicity", "mult"),
    "assignment": ("assignment", "atom", "atoms"),
    "carbons": ("carbons", "nc"),
    "j_hz": ("j_hz", "j", "couplings_hz"),
    "pair_ppm": ("pair_ppm",),
}
"""Column → spellings of its heading (case does not matter)."""
_SPELLING = {s: c for c, all_of_them in COLUMNS.items() for s in all_of_them}


def is_column_table(text: str) -> bool:
    """Say whether the first line is a header that names a shift column."""
    head = _header(text)[1]
    return "shift_ppm" in [_SPELLING.get(h) for h in head] and not re.search(r"\d", ",".join(head).replace("13c", "").replace("1h", ""))


def _header(text: str):
    first = text.lstrip("\ufeff \r\n").split("\n", 1)[0]
    delimiter = max(",;\t", key=first.count)
    return delimiter, [h.strip().strip('"').lower() for h in first.split(delimiter)]


def parse_column_table(text: str, nucleus: str):
    """Read a table.

    Returns
    -------
    peaks : PeakList
    problems : list of (place, text, reason)
    """
    delimiter, head = _header(text)
    peaks, problems, notes = [], [], []
    unknown = [h for h in head if h and h not in _SPELLING]
    if unknown:
        notes.append(f"columns not used: {', '.join(unknown)}")
    rows = csv.reader(io.StringIO(text.lstrip("\ufeff \r\n")), delimiter=delimiter)
    next(rows)
    for number, row in enumerate(rows, 2):
        if not any(cell.strip() for cell in row):
            continue
        cells = {_SPELLING[h]: c.strip() for h, c in zip(head, row) if h in _SPELLING}
        try:
            peaks.append(_parse_row(cells, nucleus, len(peaks) + 1, ",".join(row)))
        except ValueError as error:
            problems.append((f"line {number}", delimiter.join(row), str(error)))
    return PeakList(nucleus, tuple(peaks), text=text, notes=tuple(notes)), problems


def _number(text: str, column: str) -> float:
    if re.fullmatch(r"[-+]?\d+,\d+", text):
        raise ValueError(f"decimal comma in {column}")
    try:
        value = float(text.replace("−", "-"))
    except ValueError:
        raise ValueError(f"{column} is not a number") from None
    if not math.isfinite(value):
        raise ValueError(f"{column} is not finite")
    return value


def _parse_row(cells, nucleus, position, text):
    shift = cells.get("shift_ppm", "")
    between = re.fullmatch(r"(-?\d+(?:\.\d+)?)\s*[-–—]\s*(-?\d+(?:\.\d+)?)", shift)
    ends = sorted(float(x) for x in between.groups()) if between else [_number(shift, "shift_ppm")] * 2
    attached = _number(cells["attached_h"], "attached_h") if cells.get("attached_h") else None
    if attached is not None and attached not in (0, 1, 2, 3):
        raise ValueError("attached_h is not 0, 1, 2 or 3")
    integral = _number(cells["integral"], "integral") if cells.get("integral") else None
    if integral is not None and integral <= 0:
        raise ValueError("integral is not positive")
    carbons = _number(cells["carbons"], "carbons") if cells.get("carbons") else None
    if carbons is not None and (carbons != int(carbons) or carbons < 1):
        raise ValueError("carbons is not a whole number from 1")
    atoms = re.split(r"[;,\s]+", cells["assignment"].strip()) if cells.get("assignment") else []
    if not all(re.fullmatch(r"[A-Za-z]{0,2}-?\d+", a) for a in atoms):
        raise ValueError("assignment is not a list of atom numbers")
    couplings = [_number(x, "j_hz") for x in re.split(r"[;,\s]+", cells["j_hz"].strip())] if cells.get("j_hz") else []
    return Peak(
        nucleus, sum(ends) / 2, ends[0], ends[1], hydrogens=integral if nucleus == "1H" else None,
        attached_h=int(attached) if attached is not None and nucleus == "13C" else None, carbons=int(carbons) if carbons else None,
        multiplicity=cells.get("multiplicity") or None, couplings_hz=tuple(couplings),
        pair_ppm=_number(cells["pair_ppm"], "pair_ppm") if cells.get("pair_ppm") else None,
        assignment=tuple(int(re.sub(r"\D", "", a)) for a in atoms), position=position, text=text,
    )
