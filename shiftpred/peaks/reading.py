"""Read a peak list from a file, a text or numbers. What cannot be read is named with its place; nothing is dropped silently."""

from __future__ import annotations

import gzip
import math
import os
from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path

from shiftpred.errors import PeakError, quote
from shiftpred.peaks.column_table import is_column_table, parse_column_table
from shiftpred.peaks.journal_text import parse_journal_text
from shiftpred.records import NUCLEI, Peak, PeakList

__all__ = ["LARGEST_TEXT", "MOST_PEAKS", "PeakListError", "parse_peaks"]

LARGEST_TEXT = 200_000
"""Characters; longer texts are refused."""
MOST_PEAKS = 2_000
_RANGE = {"13C": (-40.0, 300.0), "1H": (-20.0, 25.0)}


class PeakListError(PeakError):
    """Several things in one list that cannot be read; `problems` lists them all as (position, text, what is wrong)."""

    def __init__(self, where, came, would_do, try_next, problems=()):
        self.problems = tuple(problems)
        super().__init__(where, came, would_do, try_next)

    def __reduce__(self):
        return type(self), (self.where, self.came, self.would_do, self.try_next, self.problems)


def parse_peaks(source, nucleus: str, *, where: str | None = None) -> PeakList:
    """Read one nucleus' peaks.

    Parameters
    ----------
    source : str, path, PeakList or iterable
        The path of a file or the text itself (journal text, plain numbers, a table with columns, `shift/hydrogens` or `13C/1H`
        pairs); or numbers, `Peak` records, or (shift, attached hydrogens) pairs.
    nucleus : {'13C', '1H'}
    where : str, optional
        Name of the argument, for messages.

    Returns
    -------
    PeakList

    Raises
    ------
    PeakError
        If a line cannot be read or the whole cannot be what it is said to be; `.problems` lists every line.
    """
    if nucleus not in NUCLEI:
        raise PeakError("nucleus", quote(nucleus), "'13C' or '1H'", "nucleus='13C'")
    where = where or ("--c13" if nucleus == "13C" else "--h1")
    if isinstance(source, PeakList):
        found = source
        if found.nucleus != nucleus:
            raise PeakError(where, f"a {found.nucleus} peak list", f"a {nucleus} peak list", "exchange the two lists")
    elif isinstance(source, (str, Path)):
        found = _parse_text_or_file(source, nucleus, where)
    elif isinstance(source, Iterable):
        found = _parse_numbers(source, nucleus, where)
    else:
        raise PeakError(where, type(source).__name__, "text, a path, or numbers", f"{where} '166.6, 132.8'")
    _require_plausible(found, where)
    return _note_duplicates(found)


def _parse_text_or_file(source, nucleus, where):
    text = str(source)
    if isinstance(source, Path) or (len(text) < 1000 and "\n" not in text and os.path.isfile(text)):
        text = _read_file(Path(text), where)
        where = f"{where}, {source}"
    elif "/" not in text and text.strip().lower().endswith((".txt", ".csv", ".tsv", ".peaks")):
        raise PeakError(where, f"{quote(text)}, but there is no such file", "an existing file or the peaks themselves", "check the path")
    if len(text) > LARGEST_TEXT:
        raise PeakError(where, f"{len(text):,} characters", f"at most {LARGEST_TEXT:,}", "give the peaks of one spectrum")
    if not text.strip():
        raise PeakError(where, "an empty list", "at least one peak", "leave the option out if the spectrum was not measured")
    parse = parse_column_table if is_column_table(text) else parse_journal_text
    found, problems = parse(text, nucleus)
    if problems:
        position, snippet, reason = problems[0]
        more = f" (and {len(problems) - 1} more)" if len(problems) > 1 else ""
        raise PeakListError(
            f"{where}, {position}", f"{quote(snippet)}: {reason}{more}", "peaks such as '166.6, 132.8' or '7.42 (m, 2H)'",
            _advise(reason), problems,
        )
    if not found.peaks:
        raise PeakError(where, quote(text.strip()), "at least one peak", "give the shifts in ppm, separated by commas")
    if len(found.peaks) > MOST_PEAKS:
        raise PeakError(where, f"{len(found.peaks):,} peaks", f"at most {MOST_PEAKS:,}", "give picked lines, not the points of a spectrum")
    return found


def _advise(reason: str) -> str:
    return "write 7.26 instead of 7,26" if "comma" in reason else "correct that line; separate peaks by commas"


def _read_file(path: Path, where: str) -> str:
    try:
        if path.stat().st_size > 4 * LARGEST_TEXT:
            raise PeakError(f"{where}, {path}", f"a file of {path.stat().st_size:,} bytes", f"at most {4 * LARGEST_TEXT:,}", "give the peaks of one spectrum")
        content = gzip.decompress(path.read_bytes()) if path.suffix == ".gz" else path.read_bytes()
    except OSError as error:
        raise PeakError(f"{where}, {path}", f"a file that cannot be read ({error.strerror})", "a readable file", "check path and permissions") from None
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError:
        return content.decode("latin-1")


def _parse_numbers(source, nucleus, where):
    peaks = []
    for position, one in enumerate(source, 1):
        if len(peaks) >= MOST_PEAKS:
            raise PeakError(where, f"more than {MOST_PEAKS:,} peaks", f"at most {MOST_PEAKS:,}", "give picked lines")
        if isinstance(one, Peak):
            peaks.append(replace(one, nucleus=nucleus, position=position))
            continue
        attached, shift = None, one
        if isinstance(one, (tuple, list)) and len(one) == 2:
            shift, attached = one
        try:
            if isinstance(shift, (bool, str)):
                raise TypeError
            value = float(shift)
            count = None if attached is None else int(attached)
        except (TypeError, ValueError):
            raise PeakError(f"{where}, peak {position}", quote(one), "a number, a Peak, or (shift, attached hydrogens)", "[166.6, 132.8]") from None
        if count is not None and (nucleus != "13C" or not 0 <= count <= 3):
            raise PeakError(f"{where}, peak {position}", quote(one), "attached hydrogens 0 to 3, for 13C only", "(128.4, 1)")
        peaks.append(Peak(nucleus, value, value, value, attached_h=count, position=position, text=f"{value:g}"))
    if not peaks:
        raise PeakError(where, "an empty list", "at least one peak", "leave the argument out if the spectrum was not measured")
    return PeakList(nucleus, tuple(peaks), text=", ".join(p.text for p in peaks))


def _require_plausible(found: PeakList, where: str) -> None:
    """Refuse what cannot be a list of this nucleus in ppm."""
    low, high = _RANGE[found.nucleus]
    shifts = [p.shift_ppm for p in found.peaks]
    bad = next((p for p in found.peaks if not all(map(math.isfinite, (p.shift_ppm, p.lower_ppm, p.upper_ppm)))), None)
    if bad:
        raise PeakError(f"{where}, peak {bad.position}", quote(bad.text), "a finite number", "remove or correct that peak")
    ordered = sorted(shifts)
    middle = ordered[len(ordered) // 2]
    if found.nucleus == "1H" and len(shifts) > 1 and middle > 25 and ordered[-1] < 300:
        raise PeakError(where, f"shifts up to {ordered[-1]:g}, which look like a 13C list", "1H shifts in ppm", "give them as --c13")
    if found.nucleus == "13C" and len(shifts) > 2 and ordered[-1] < 13.5:
        raise PeakError(where, f"shifts of {ordered[0]:g} to {ordered[-1]:g}, which look like a 1H list", "13C shifts in ppm", "give them as --h1")
    for peak in found.peaks:
        if not (low <= peak.lower_ppm and peak.upper_ppm <= high):
            hint = "Hz instead of ppm" if max(abs(peak.lower_ppm), abs(peak.upper_ppm)) > 300 else "outside any range"
            raise PeakError(
                f"{where}, peak {peak.position}", f"{quote(peak.text or str(peak.shift_ppm))} ({hint})", f"{found.nucleus} shifts from {low:g} to {high:g} ppm",
                "divide Hz by the spectrometer frequency in MHz" if "Hz" in hint else "check decimal points and the nucleus",
            )


def _note_duplicates(found: PeakList) -> PeakList:
    seen: dict[float, int] = {}
    notes = list(found.notes)
    for peak in found.peaks:
        if not peak.is_range and peak.shift_ppm in seen:
            notes.append(f"{found.nucleus} {peak.shift_ppm:g} is listed twice (peaks {seen[peak.shift_ppm]} and {peak.position})")
        seen.setdefault(peak.shift_ppm, peak.position)
    return replace(found, notes=tuple(notes))
