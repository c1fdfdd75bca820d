"""Read NMReDATA files record by record; what is malformed is named with its line and costs nothing else."""

from __future__ import annotations

import gzip
import io
import os
import re
from collections.abc import Iterable, Iterator
from dataclasses import replace
from pathlib import Path

from rdkit import Chem, rdBase

from shiftpred.errors import SettingError, quote
from shiftpred.peaks.nmredata.assignment_tags import AssignmentTable, DrawnAtoms, parse_assignment, parse_couplings
from shiftpred.peaks.nmredata.contents import NmredataError, NmredataRecord
from shiftpred.peaks.nmredata.labels import Complaints, read_whole_number
from shiftpred.peaks.nmredata.spectrum_tags import is_1d_tag, parse_spectrum
from shiftpred.peaks.nmredata.tag_text import Item, Tag, split_items, split_tags
from shiftpred.peaks.solvents import normalise_solvent
from shiftpred.records import RecordFailure, Structure
from shiftpred.structures.molfile_blocks import parse_blocks

__all__ = ["find_nmredata", "parse_nmredata"]

_PREFIX = "NMREDATA_"
_MARK = f"<{_PREFIX}"
_LONGEST_RECORD = 50_000  # lines
_LONGEST_LINE = 20_000
_LARGEST_FILE = 64_000_000  # characters
_HIGHEST_LEVEL = 3
_PLAIN_TEXT = ("ID", "FORMULA", "SMILES", "INCHI", "ALATIS", "PH", "CONCENTRATION", "TEMPERATURE")


def parse_nmredata(source) -> Iterator[NmredataRecord]:
    """Read the records of an NMReDATA file.

    Parameters
    ----------
    source : path or str
        A file (also gzipped), or the text itself where it has several lines. Any line ends; UTF-8, UTF-16 or Latin-1.

    Yields
    ------
    NmredataRecord
        Each with its `problems`, which name file, line and tag.

    Raises
    ------
    NmredataError
        If the file cannot be read, or holds no record with NMReDATA tags.

    References
    ----------
    Pupier et al., Magn. Reson. Chem. 2018, 56, 703, doi:10.1002/mrc.4737.
    """
    where, stream = _open(source)
    found = number = 0
    with stream:
        try:
            for number, rows in enumerate(_iterate_records(stream), 1):
                record = _parse_record(rows, number, where)
                if record is not None:
                    found += 1
                    yield record
        except (OSError, EOFError, UnicodeError) as error:
            raise NmredataError(where, f"a damaged file ({error})", "a complete file", "copy it again") from None
    if not found:
        came = f"{number} records without NMReDATA tags" if number else "an empty file"
        raise NmredataError(where, came, "an SDF with tags such as NMREDATA_ASSIGNMENT", "check that the file is the right one")


def find_nmredata(source) -> NmredataRecord | None:
    """Return the one record of a source that carries NMReDATA tags; None for any other structure, text or file.

    Parameters
    ----------
    source : object
        What `compare` takes as its structure; a record that is read already is handed back.

    Raises
    ------
    NmredataError
        If there are several records, or the structure cannot be read.
    """
    if isinstance(source, NmredataRecord):
        record = source
    else:
        if not isinstance(source, (str, os.PathLike)) or not _has_tags(source):
            return None
        records = parse_nmredata(source)
        record = next(records)
        if next(records, None) is not None:
            where = "structure text" if isinstance(source, str) and "\n" in source else str(source)
            raise NmredataError(where, "several records", "exactly one structure here", "give a file with one record")
    if record.structure is None:
        raise record.problems[0]
    return record


def _has_tags(source) -> bool:
    text = os.fspath(source)
    if not isinstance(text, str):
        return False
    if "\n" in text or "\r" in text:
        return _MARK in text
    try:
        if not 0 < len(text) < 1000 or not os.path.isfile(text):
            return False
        _, stream = _open(Path(text))
        with stream:
            read = 0
            while read < _LARGEST_FILE and (line := stream.readline(_LONGEST_LINE)):
                read += len(line)
                if line.startswith(">") and _MARK in line:
                    return True
    except (OSError, EOFError, ValueError):
        pass  # whoever reads it as a structure says what is wrong
    return False


def _open(source) -> tuple[str, io.TextIOBase]:
    text = os.fspath(source)
    if isinstance(source, str) and ("\n" in source or "\r" in source):
        return "text", io.StringIO(source.lstrip("\ufeff"), newline=None)
    if not isinstance(text, str):
        raise NmredataError("file", quote(text), "a path as text", "decode the path first")
    try:
        raw = open(text, "rb")  # noqa: SIM115 - closed by the text stream around it
        if raw.peek(2)[:2] == b"\x1f\x8b":
            raw = io.BufferedReader(gzip.GzipFile(fileobj=raw))
        head = raw.peek(4096)[:4096]
    except (OSError, EOFError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        came = f"a file that cannot be read ({reason})"
        raise NmredataError(text, came, "a readable file", "check path, permissions and compression") from None
    encoding = "utf-16" if head[:2] in (b"\xff\xfe", b"\xfe\xff") else "utf-8-sig"
    if encoding == "utf-8-sig" and b"\x00" in head:
        raw.close()
        raise NmredataError(text, "a binary file", "an SDF", "unpack an NMR record first and give its .nmredata.sdf")
    return text, io.TextIOWrapper(raw, encoding=encoding, errors="shiftpred-latin-1", newline=None)


def _iterate_records(stream) -> Iterator[list[tuple[int, str]]]:
    """Yield the numbered lines of each record; of endless ones only the beginning is kept."""
    rows: list[tuple[int, str]] = []
    number = read = 0
    while line := stream.readline(_LONGEST_LINE):
        read += len(line)
        if read > _LARGEST_FILE:
            raise OSError(f"more than {_LARGEST_FILE:,} characters")
        while len(line) == _LONGEST_LINE and not line.endswith("\n"):
            more = stream.readline(_LONGEST_LINE)
            read += len(more)
            if len(more) < _LONGEST_LINE or read > _LARGEST_FILE:
                break
        number += 1
        line = line.rstrip("\r\n")
        if line.rstrip() == "$$$$":
            yield rows
            rows = []
        elif len(rows) < _LONGEST_RECORD:
            rows.append((number, line))
    if any(text.strip() for _, text in rows):
        yield rows


def _parse_record(rows: list[tuple[int, str]], number: int, where: str) -> NmredataRecord | None:
    table, all_tags, stray = split_tags(rows)
    tags = [t for t in all_tags if t.name.upper().startswith(_PREFIX)]
    if not tags:
        return None
    complaints = Complaints(where)
    structure, drawn = _read_structure(table, number, where, complaints)
    name = structure.name if structure else (table[0][1].strip() if table else "") or str(number)
    if len(rows) >= _LONGEST_RECORD:
        came = f"a record of {_LONGEST_RECORD:,} lines or more"
        complaints.add(rows[-1][0], "", came, "shorter records", "look for a missing $$$$; what follows was not read")
    for line, text in stray:
        complaints.add(line, "", f"{quote(text)} behind a blank line", "lines inside a tag", "remove the blank line before it")
    by_name: dict[str, list[Tag]] = {}
    for tag in tags:
        by_name.setdefault(tag.name.upper().removeprefix(_PREFIX), []).append(tag)
    version, by_backslash = _read_version(by_name, tags, complaints)
    level = _read_level(by_name, by_backslash, complaints)
    assignment = _read_assignment(by_name, by_backslash, drawn, level, complaints)
    couplings = [
        coupling
        for tag in by_name.get("J", [])
        for coupling in parse_couplings(_read_items(tag, by_backslash, complaints), tag.name, assignment.signals, complaints)
    ]
    spectra = [
        parse_spectrum(_read_items(tag, by_backslash, complaints), tag.name, tag.line, assignment.signals, level, complaints)
        for tag in tags
        if is_1d_tag(tag.name)
    ]
    other, notes = _read_other(by_name, by_backslash, complaints)
    return NmredataRecord(
        name,
        structure,
        version,
        level,
        _read_solvent(by_name, by_backslash, complaints),
        tuple(assignment.signals.values()),
        tuple(assignment.interchangeable),
        tuple(assignment.equivalent),
        tuple(couplings),
        tuple(spectra),
        other,
        complaints.close(),
        (*notes, *_note_gaps(spectra)),
    )


def _read_structure(table, number: int, where: str, complaints: Complaints) -> tuple[Structure | None, DrawnAtoms | None]:
    first = table[0][0] if table else 1
    lines = [text for _, text in table]
    found = next(parse_blocks(lines, where)) if any(text.strip() for text in lines) else None
    if found is None or isinstance(found, RecordFailure):
        error = getattr(found, "error", None)
        came = getattr(error, "came", None) or "no structure"
        would_do = getattr(error, "would_do", None) or "a molfile before the tags"
        complaints.add(first, "", came, would_do, getattr(error, "try_next", None) or "export the file again")
        return None, None
    with rdBase.BlockLogs():
        raw = Chem.MolFromMolBlock("\n".join(_mend_header(lines)) + "\n", sanitize=False, removeHs=False, strictParsing=False)
    title = lines[0].strip()
    structure = replace(found, name=title if found.name == title and title else str(number), text=f"{where}, record {number}")
    return structure, None if raw is None else DrawnAtoms.build(raw, structure)


def _mend_header(lines: list[str]) -> list[str]:
    """Return the lines with a header of three, where the counts line says its version."""
    counts = next((k for k, line in enumerate(lines[:12]) if re.search(r"V[23]000\s*$", line)), 3)
    return [*(lines[:counts] + [""] * 3)[:3], *lines[counts:]]


def _read_items(tag: Tag, by_backslash: bool, complaints: Complaints) -> list[Item]:
    items = split_items(tag, by_backslash)
    for item in items:
        if item.is_cut:
            came = f"an item of more than {len(item.text):,} characters"
            complaints.add(item.line, tag.name, came, "shorter items", "end each item with a backslash")
    return [item for item in items if not item.is_cut]


def _read_single(by_name, key: str, by_backslash: bool, complaints: Complaints) -> tuple[int, str, str] | None:
    """Return (line, tag, first item) of a tag that stands once, None without one."""
    tags = by_name.get(key, [])
    for tag in tags[1:]:
        complaints.add(tag.line, tag.name, "the same tag again", "each of these tags once", "remove one of the two")
    if not tags:
        return None
    items = _read_items(tags[0], by_backslash, complaints)
    if not items:
        complaints.add(tags[0].line, tags[0].name, "an empty tag", "a line below the tag", "fill it in or remove it")
        return None
    return items[0].line, tags[0].name, items[0].text


def _read_version(by_name, tags, complaints: Complaints) -> tuple[str, bool]:
    """Return the version, and whether backslashes part the items."""
    found = _read_single(by_name, "VERSION", False, complaints)
    if found is None:
        guess = any(text.rstrip().endswith("\\") for tag in tags for _, text in tag.rows)
        if "VERSION" not in by_name:
            came = f"no tag NMREDATA_VERSION; read as {'1.1' if guess else '1.0'}"
            complaints.add(tags[0].line, "", came, "NMREDATA_VERSION 1.0 or 1.1", "add the tag")
        return "", guess
    line, tag, text = found
    if text not in ("1.0", "1.1"):
        number = re.fullmatch(r"(\d{1,3})(?:\.(\d{1,3}))?", text)
        later = number is None or (int(number[1]), int(number[2] or 0)) > (1, 0)
        came = f"version {quote(text, 40)}, read as {'1.1' if later else '1.0'}"
        complaints.add(line, tag, came, "1.0 or 1.1", "export the file as 1.1, or check what was read")
        return text, later
    return text, text == "1.1"


def _read_level(by_name, by_backslash: bool, complaints: Complaints) -> int | None:
    found = _read_single(by_name, "LEVEL", by_backslash, complaints)
    if found is None:
        return None
    line, tag, text = found
    level = read_whole_number(text)
    if level is None or level > _HIGHEST_LEVEL:
        complaints.add(line, tag, f"level {quote(text, 40)}", "0, 1, 2 or 3", "0 where nothing is ambiguous")
        return None
    return level


def _read_solvent(by_name, by_backslash: bool, complaints: Complaints) -> str | None:
    found = _read_single(by_name, "SOLVENT", by_backslash, complaints)
    if found is None:
        return None
    line, tag, text = found
    try:
        return normalise_solvent(text[:200])
    except SettingError as error:
        complaints.add(line, tag, f"solvent {quote(text, 40)}", error.would_do, "CDCl3, say, or a mixture: CDCl3/DMSO 80:20")
        return None


def _read_assignment(by_name, by_backslash: bool, drawn, level, complaints: Complaints) -> AssignmentTable:
    tags = [*by_name.get("ASSIGNMENT", []), *by_name.get("SIGNALS", [])]
    for tag in tags[1:]:
        complaints.add(tag.line, tag.name, "a second assignment", "one assignment a record", "join the two under one tag")
    if not tags:
        return AssignmentTable()
    table = parse_assignment(_read_items(tags[0], by_backslash, complaints), tags[0].name, drawn, complaints)
    if table.interchangeable and level in (0, 2):
        came = f"interchangeable labels at level {level}"
        complaints.add(tags[0].line, tags[0].name, came, "level 1 or 3", f"NMREDATA_LEVEL {level + 1}")
    return table


def _read_other(by_name, by_backslash: bool, complaints: Complaints) -> tuple[tuple[tuple[str, str], ...], list[str]]:
    read = ("VERSION", "LEVEL", "SOLVENT", "ASSIGNMENT", "SIGNALS", "J")
    other, passed_over = [], []
    for key, tags in by_name.items():
        if key in read or is_1d_tag(tags[0].name):
            continue
        if key.startswith("1D"):
            for tag in tags:
                complaints.add(
                    tag.line, tag.name, "a 1D tag of no known form", "NMREDATA_1D_13C, NMREDATA_1D_1H#2, …", "rename it"
                )
        elif key not in _PLAIN_TEXT:
            passed_over.append(tags[0].name)
        for tag in tags:
            other.append((key, "\n".join(item.text for item in _read_items(tag, by_backslash, complaints))))
    notes = [f"not used: {', '.join(quote(n, 40)[1:-1] for n in passed_over[:10])}"] if passed_over else []
    return tuple(other), notes


def _note_gaps(spectra: Iterable) -> list[str]:
    return [f"{s.tag}: no Larmor frequency" for s in spectra if s.frequency_mhz is None]
