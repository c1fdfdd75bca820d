"""Read a peak list from a file, a text or numbers. What cannot be read is named with its place; nothing is dropped silently."""

from __future__ import annotations

import gzip
import math
import os
import re
import zlib
from collections.abc import Iterable, Mapping
from dataclasses import replace
from pathlib import Path

from shiftpred.errors import quote
from shiftpred.peaks.column_table import is_column_table, parse_column_table, parse_row
from shiftpred.peaks.journal_text import MOST_PEAKS, parse_journal_text
from shiftpred.peaks.plausibility import require_plausible
from shiftpred.peaks.problems import PeakListError
from shiftpred.records import NUCLEI, Peak, PeakList

__all__ = ["LARGEST_TEXT", "MOST_PEAKS", "PeakListError", "parse_peak_text", "parse_peaks"]

LARGEST_TEXT = 200_000
"""Characters; longer texts are refused."""
_ENDINGS = (".txt", ".csv", ".tsv", ".dat", ".peaks", ".md", ".gz")
_EXAMPLES = "peaks such as '166.6, 132.8' or '7.42 (m, 2H)'"
_ADVICE = (
    ("decimal comma", "write 7.26 instead of 7,26, and put a space behind a comma that separates two peaks"),
    ("heading says", "give the list as the other nucleus"),
    ("second", "give the two lists one by one"),
    ("bracket", "close the bracket"),
    ("table without a heading", "put a heading above the columns, 'shift_ppm,integral', or give the shifts alone"),
    ("'/' must", "write '128.4/1' for the number of hydrogens, '60.9/4.38' for a C-H pair"),
    ("", "correct that line; separate peaks by commas"),
)


def parse_peaks(source, nucleus: str, *, where: str | None = None) -> PeakList:
    """Read one nucleus' peaks.

    Parameters
    ----------
    source : str, path, PeakList or iterable
        The path of a file or the text itself: journal text (a whole experimental paragraph will do), plain numbers, a table
        with named columns, `shift/hydrogens` or `13C/1H` pairs. Or an iterable of numbers, texts, `Peak` records, mappings with
        the table's column names, or (shift, attached hydrogens) pairs.
    nucleus : {'13C', '1H'}
    where : str, optional
        Name of the argument, for messages; default '--c13' or '--h1'.

    Returns
    -------
    PeakList
        At least one peak; `notes` say what was interpreted, left unread or is unusual.

    Raises
    ------
    PeakError
        If a line cannot be read or the whole cannot be what it is said to be; `.problems` lists every line.

    Examples
    --------
    >>> found = parse_peaks("13C NMR (101 MHz, CDCl3) δ 165.7 (d, J = 254 Hz), 130.9 (d, J = 9 Hz, 2C)", "13C")
    >>> found.solvent, found.frequency_mhz, [(p.shift_ppm, p.couplings_hz, p.carbons) for p in found.peaks]
    ('CDCl3', 101.0, [(165.7, (254.0,), None), (130.9, (9.0,), 2)])
    """
    if nucleus not in NUCLEI:
        raise PeakListError("nucleus", quote(nucleus), "'13C' or '1H'", "nucleus='13C'")
    where = where or ("--c13" if nucleus == "13C" else "--h1")
    if isinstance(source, PeakList):
        if source.nucleus != nucleus:
            raise PeakListError(where, f"a {source.nucleus} peak list", f"a {nucleus} peak list", "exchange the two lists")
        found = source
    elif isinstance(source, str | os.PathLike):
        found, where = _parse_text_or_file(source, nucleus, where)
    elif isinstance(source, Iterable) and not isinstance(source, Mapping | bytes | bytearray):
        found = _parse_items(source, nucleus, where)
    else:
        raise PeakListError(where, f"a {type(source).__name__}", "text, a path, or numbers", f"{where} '166.6, 132.8'")
    if not found.peaks:
        raise PeakListError(where, "an empty list", "at least one peak", "leave it out if the spectrum was not measured")
    if len(found.peaks) > MOST_PEAKS:
        raise PeakListError(
            where,
            f"more than {MOST_PEAKS:,} peaks",
            f"at most {MOST_PEAKS:,}",
            "give picked lines, not the points of a spectrum",
        )
    if any(p.position == 0 for p in found.peaks):
        found = replace(found, peaks=tuple(replace(p, position=k) for k, p in enumerate(found.peaks, 1)))
    found = require_plausible(found, where)
    return replace(found, notes=tuple(dict.fromkeys(found.notes)))


def _parse_text_or_file(source, nucleus: str, where: str) -> tuple[PeakList, str]:
    text = os.fspath(source)
    if not isinstance(text, str):
        raise PeakListError(where, quote(text), "a path as text", "decode the path first")
    path = _find_file(text, isinstance(source, os.PathLike), where)
    if path is not None:
        text, where = _read_file(path, where), f"{where}, {path}"
    return _parse_text(text, nucleus, where), where


def parse_peak_text(text: str, nucleus: str, *, where: str | None = None) -> PeakList:
    """Read one nucleus' peaks from a text that is never the name of a file.

    Parameters
    ----------
    text : str
        Journal text, plain numbers or a table, as for `parse_peaks`.
    nucleus : {'13C', '1H'}
    where : str, optional
        Name of the field, for messages; default '13C peaks' or '1H peaks'.

    Raises
    ------
    PeakListError
        With everything that was not understood in `problems`.
    """
    where = where or f"{nucleus} peaks"
    return parse_peaks(_parse_text(text, nucleus, where), nucleus, where=where)


def _parse_text(text: str, nucleus: str, where: str) -> PeakList:
    if len(text) > LARGEST_TEXT:
        raise PeakListError(where, f"{len(text):,} characters", f"at most {LARGEST_TEXT:,}", "give the peaks of one spectrum")
    if not text.strip():
        raise PeakListError(where, "an empty list", "at least one peak", "leave it out if the spectrum was not measured")
    found, problems = (parse_column_table if is_column_table(text) else parse_journal_text)(text, nucleus)
    if problems:
        raise _build_error(problems, where)
    if not found.peaks:
        raise PeakListError(
            where,
            f"{quote(text.strip())}, in which there is no peak",
            "at least one peak",
            "give the shifts in ppm, separated by commas",
        )
    return found


def _build_error(problems, where: str) -> PeakListError:
    place, snippet, reason = problems[0]
    more = f" (and {len(problems) - 1} more)" if len(problems) > 1 else ""
    advice = next(words for key, words in _ADVICE if key in reason)
    return PeakListError(f"{where}, {place}", f"{quote(snippet)}: {reason}{more}", _EXAMPLES, advice, problems)


def _find_file(text: str, surely: bool, where: str) -> Path | None:
    """Return the path if the text names a file; refuse what is meant as one and is not there."""
    if not surely and (len(text) > 1000 or "\n" in text or "\0" in text or not re.search(r"[A-Za-z_~]", text)):
        return None
    try:
        path = Path(text).expanduser()
        kind = "file" if path.is_file() else "folder" if path.is_dir() else ""
    except (OSError, RuntimeError, ValueError):
        kind = ""
    if kind == "file":
        return path
    if kind == "folder" and (surely or re.search(r"[/\\]", text)):
        raise PeakListError(where, f"{quote(text)}, which is a folder", "a file or the peaks themselves", "name the file in it")
    looks_like_one = text.strip().lower().endswith(_ENDINGS) and not re.search(r"[,;\s]\s*\d", text.strip())
    if surely or looks_like_one:
        raise PeakListError(
            where, f"{quote(text)}, but there is no such file", "an existing file or the peaks themselves", "check the path"
        )
    return None


def _read_file(path: Path, where: str) -> str:
    where = f"{where}, {path}"
    try:
        size = path.stat().st_size
        if size > 4 * LARGEST_TEXT:
            raise PeakListError(
                where, f"a file of {size:,} bytes", f"at most {4 * LARGEST_TEXT:,}", "give the peaks of one spectrum"
            )
        content = path.read_bytes()
        if path.suffix == ".gz":
            content = zlib.decompressobj(wbits=31).decompress(content, 4 * LARGEST_TEXT + 1)
    except (OSError, EOFError, zlib.error, gzip.BadGzipFile) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise PeakListError(
            where, f"a file that cannot be read ({reason})", "a readable file", "check path and permissions"
        ) from None
    if content[:2] in (b"\xff\xfe", b"\xfe\xff"):
        return content.decode("utf-16", errors="replace")
    if b"\0" in content[:4096]:
        raise PeakListError(where, "a binary file", "a text file with peaks", "export the peak list as text or CSV")
    text = _decode(content)
    if text.lstrip().startswith("##TITLE"):
        raise PeakListError(where, "a JCAMP-DX file", "picked peaks", "pick the peaks and give their list as text or CSV")
    return text


def _decode(content: bytes) -> str:
    for encoding in ("utf-8-sig", "cp1252"):
        try:
            return content.decode(encoding)
        except UnicodeDecodeError:
            continue
    return content.decode("latin-1")


def _parse_items(source: Iterable, nucleus: str, where: str) -> PeakList:
    peaks: list[Peak] = []
    problems: list[tuple[str, str, str]] = []
    notes: list[str] = []
    for position, item in enumerate(source, 1):
        if position > MOST_PEAKS:
            raise PeakListError(where, f"more than {MOST_PEAKS:,} peaks", f"at most {MOST_PEAKS:,}", "give picked lines")
        try:
            peaks.append(replace(_parse_item(item, nucleus, notes), position=position))
        except ValueError as error:
            problems.append((f"peak {position}", quote(item), str(error)))
    if problems:
        place, snippet, reason = problems[0]
        more = f" (and {len(problems) - 1} more)" if len(problems) > 1 else ""
        raise PeakListError(
            f"{where}, {place}",
            f"{snippet}: {reason}{more}",
            "a number, a text, a Peak, or (shift, attached hydrogens)",
            "[166.6, (132.8, 0)]",
            problems,
        )
    return PeakList(nucleus, tuple(peaks), text=", ".join(p.text or f"{p.shift_ppm:g}" for p in peaks), notes=tuple(notes))


def _parse_item(item, nucleus: str, notes: list[str]) -> Peak:
    if isinstance(item, Peak):
        if item.nucleus != nucleus:
            raise ValueError(f"a {item.nucleus} peak in a {nucleus} list")
        return item
    if isinstance(item, str):
        found, problems = parse_journal_text(item, nucleus)
        if problems:
            raise ValueError(problems[0][2])
        if len(found.peaks) != 1:
            raise ValueError(f"{len(found.peaks)} peaks in one item")
        return found.peaks[0]
    if isinstance(item, Mapping):
        peak, label = parse_row(item, nucleus, 0, str(item.get("text", "")))
        if label:
            notes.append(f"assignment '{label}' is a label, not an atom number")
        return peak
    attached, shift = None, item
    if isinstance(item, tuple | list):
        if len(item) != 2:
            raise ValueError("not a pair (shift, attached hydrogens)")
        shift, attached = item
    value = _read_number(shift, "the shift")
    if attached is not None:
        count = _read_number(attached, "the number of hydrogens")
        if nucleus != "13C" or count not in (0, 1, 2, 3):
            raise ValueError("attached hydrogens are 0, 1, 2 or 3, and for 13C only")
        attached = int(count)
    return Peak(
        nucleus,
        value,
        value,
        value,
        attached_h=attached,
        text=f"{value:.10g}" if attached is None else f"{value:.10g}/{attached}",
    )


def _read_number(value, what: str) -> float:
    if isinstance(value, str | bool | bytes) or value is None:
        raise ValueError(f"{what} is not a number")
    try:
        number = float(value)
    except (TypeError, ValueError, OverflowError):
        raise ValueError(f"{what} is not a number") from None
    if not math.isfinite(number):
        raise ValueError(f"{what} is not a finite number")
    return number
