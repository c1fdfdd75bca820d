"""Read structures from text, files and molecules, one record at a time; a bad record never costs the others."""

from __future__ import annotations

import codecs
import csv
import gzip
import io
import os
import sys
from collections.abc import Iterable, Iterator
from dataclasses import replace
from itertools import chain, islice
from pathlib import Path

from rdkit import Chem

from shiftpred.errors import InputError, StructureError, quote
from shiftpred.records import RecordFailure, Structure
from shiftpred.structures.building import LARGEST_STRUCTURE, build_structure
from shiftpred.structures.molfile_blocks import is_counts_line, parse_blocks
from shiftpred.structures.smiles_text import attempt, parse_line

__all__ = ["LARGEST_STRUCTURE", "parse_listed_structures", "parse_structure", "parse_structures"]

_LINE_SUFFIXES = (".smi", ".smiles", ".ism", ".can", ".txt", ".inchi")
_TABLE_SUFFIXES = (".csv", ".tsv")
_BLOCK_SUFFIXES = (".mol", ".sdf", ".sd", ".mdl")
_SUFFIXES = _LINE_SUFFIXES + _TABLE_SUFFIXES + _BLOCK_SUFFIXES
_NAME_COLUMNS = ("name", "molecule", "sample", "title", "id", "compound")
_LINES_LOOKED_AT = 12
_WIDEST_CELL = 131_072
_LONGEST_LINE_KEPT = 500_000
"""Characters; the rest of a longer line is passed over, so that a small archive that unpacks to one endless line fits too."""

# One stray byte of another encoding (an umlaut in a name) costs neither the line nor the file.
codecs.register_error("shiftpred-latin-1", lambda error: (error.object[error.start : error.end].decode("latin-1"), error.end))


def parse_structure(source, name: str | None = None) -> Structure:
    """Read exactly one structure.

    Parameters
    ----------
    source : str, path, rdkit Mol or Structure
        A SMILES, an InChI, the text of a molfile, the path of a file with one record, a molecule.
    name : str, optional
        Instead of the name that the record carries.

    Returns
    -------
    Structure

    Raises
    ------
    StructureError
        If it cannot be read, or if the file holds several records.
    InputError
        If the file as a whole cannot be read.

    Examples
    --------
    >>> parse_structure("CCO ethanol").name, parse_structure("[H]OCC").atom_numbers
    ('ethanol', (2, 3, 4))
    """
    if isinstance(source, Structure):
        return source
    found = None
    for record in parse_structures(source, name=name):
        if isinstance(record, RecordFailure):
            raise record.error
        if found is not None:
            raise StructureError(
                quote(str(source)),
                "several records",
                "exactly one structure here",
                "give a file with one record, or use `predict` or `rank`",
            )
        found = record
    if found is None:
        raise StructureError(quote(str(source)), "no structure", "one structure", "check that the file is the right one")
    return found


def parse_structures(source, name: str | None = None) -> Iterator[Structure | RecordFailure]:
    """Read structures one after the other, with flat memory.

    Parameters
    ----------
    source : str, path, rdkit Mol, Structure, RecordFailure or iterable of these
        A SMILES ('CCO' or 'CCO ethanol'), an InChI, the path of a .smi, .csv, .tsv, .mol or .sdf file (V2000 or V3000, also
        gzipped), the text of a molfile, or '-' for SMILES lines, a table or an SDF on standard input. A file that exists is
        read as a file, whatever else its name could mean. Inside an iterable a text is the structure itself and never the
        name of a file; a file there is given as a `pathlib.Path`.
    name : str, optional
        Name of a single record, instead of the one that it carries.

    Yields
    ------
    Structure or RecordFailure
        In the order of the input; those that were read before are handed on. A record's name is the one it carries, or its
        1-based number.

    Raises
    ------
    InputError
        If the source as a whole cannot be read (no such file, an empty file, no `smiles` column).
    """
    if isinstance(source, (str, os.PathLike, Structure, Chem.Mol, RecordFailure)):
        yield from _parse_one(source, name, "structure")
        return
    if isinstance(source, (bytes, bytearray)) or not isinstance(source, Iterable):
        raise StructureError(
            "structure", type(source).__name__, "a SMILES, a path, an rdkit Mol or an iterable of these", "pass 'CCO'"
        )
    if hasattr(source, "columns"):
        source = _pick_column(source)
    number = 0
    for number, one in enumerate(source, 1):
        where = f"structure {number}"
        try:
            if isinstance(one, str):
                yield from _parse_item_text(one, where, str(number))
            elif isinstance(one, (os.PathLike, Structure, Chem.Mol, RecordFailure)):
                yield from _parse_one(one, None, where, str(number))
            else:
                raise StructureError(where, _describe(one), "a SMILES, a pathlib.Path or an rdkit Mol", "pass 'CCO'")
        except InputError as error:
            yield RecordFailure(str(number), error)


def parse_listed_structures(sources: Iterable) -> list[Structure]:
    """Read structures of which each one is needed; texts are structures, never the names of files.

    Parameters
    ----------
    sources : iterable of str, path, rdkit Mol or Structure

    Raises
    ------
    InputError
        The first that cannot be read.

    Examples
    --------
    >>> [s.smiles for s in parse_listed_structures(["OCC", "C"])]
    ['CCO', 'C']
    """
    found = []
    for record in parse_structures(list(sources)):
        if isinstance(record, RecordFailure):
            raise record.error
        found.append(record)
    return found


def _describe(value) -> str:
    return "nothing" if value is None or value != value else f"{type(value).__name__} {quote(value, 40)}"


def _pick_column(table):
    """Return the SMILES of a pandas table."""
    for column in table.columns:
        if str(column).strip().lower() == "smiles":
            return table[column]
    raise InputError(
        "table",
        f"columns {', '.join(map(str, table.columns)) or 'none'}",
        "a column `smiles`",
        "rename the column with the structures",
    )


def _parse_one(source, name, where, number="1") -> Iterator[Structure | RecordFailure]:
    if isinstance(source, (Structure, RecordFailure)):
        yield source  # read before
    elif isinstance(source, Chem.Mol):
        label = name or (source.GetProp("_Name").strip() if source.HasProp("_Name") else "") or number
        yield attempt(label, where, lambda: build_structure(source, label, where))
    elif isinstance(source, str):
        for record in _parse_text(source, where, number):
            yield _rename(record, name) if name else record
    else:
        for record in _parse_file(Path(source)):
            yield _rename(record, name) if name else record


def _rename(record, name):
    if isinstance(record, RecordFailure):
        return RecordFailure(name, record.error)
    return replace(record, name=name)


def _parse_text(text: str, where: str, number: str) -> Iterator[Structure | RecordFailure]:
    stripped = text.strip().lstrip("\ufeff")
    if stripped == "-":
        yield from _parse_standard_input()
    elif "\n" in stripped:
        lines = io.StringIO(text.lstrip("\ufeff"), newline=None)
        yield from _parse_lines_of_any_kind(lines, f"{where} text")
    elif _is_file(stripped):
        yield from _parse_file(Path(stripped))
    elif _looks_like_path(stripped):
        if os.path.isdir(stripped):
            raise InputError(quote(stripped), "a folder", "a SMILES, or the path of a file", "name one file in it")
        raise StructureError(
            quote(stripped),
            "a file name, but there is no such file",
            "a SMILES, or the path of an existing file",
            f"check the path; the current folder is {quote(os.getcwd())}",
        )
    else:
        record = parse_line(stripped, number, where)
        if isinstance(record, RecordFailure) and os.path.isdir(stripped):
            raise InputError(quote(stripped), "a folder", "a SMILES, or the path of a file", "name one file in it")
        yield record


def _parse_item_text(text: str, where: str, number: str) -> Iterator[Structure | RecordFailure]:
    """Read a text that stands in a list: a line or the text of a molfile, never opened."""
    stripped = text.strip().lstrip("\ufeff")
    if "\n" in stripped:
        yield from _parse_lines_of_any_kind(io.StringIO(text.lstrip("\ufeff"), newline=None), f"{where} text")
    elif stripped == "-" or _looks_like_path(stripped):
        raise StructureError(
            where,
            f"{quote(stripped)}, the name of a file",
            "a SMILES; a text in a list is never opened as a file",
            "give the file alone, or as pathlib.Path(...)",
        )
    else:
        yield parse_line(stripped, number, where)


def _is_file(text: str) -> bool:
    try:
        return 0 < len(text) < 1000 and os.path.isfile(text)
    except ValueError:  # a null character
        return False


def _looks_like_path(text: str) -> bool:
    first, last = text.split("/")[0], text.replace("\\", "/").rsplit("/", 1)[-1]
    if last.lower().removesuffix(".gz").endswith(_SUFFIXES):
        return True
    # /home/…, ./…, ../…, ~/…, C:\…: no SMILES begins like that.
    return text.startswith(("/", "./", "../", "~")) or first in (".", "..") or text[1:3] == ":\\"


def _parse_standard_input() -> Iterator[Structure | RecordFailure]:
    raw = getattr(sys.stdin, "buffer", None)
    where = "standard input"
    if raw is None:  # a stand-in that holds text already
        yield from _parse_lines_of_any_kind(sys.stdin, where)
        return
    yield from _parse_bytes(raw, where, "")


def _parse_file(path: Path) -> Iterator[Structure | RecordFailure]:
    try:
        with open(path, "rb") as raw:
            yield from _parse_bytes(raw, str(path), Path(path.name.lower().removesuffix(".gz")).suffix)
    except IsADirectoryError:
        raise InputError(str(path), "a folder", "a file", "name one file in it") from None
    except (OSError, EOFError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError(
            str(path), f"a file that cannot be read ({reason})", "a readable file", "check path, permissions and compression"
        ) from None


def _parse_bytes(raw, where: str, suffix: str) -> Iterator[Structure | RecordFailure]:
    raw = raw if hasattr(raw, "peek") else io.BufferedReader(raw)
    if raw.peek(2)[:2] == b"\x1f\x8b":
        raw = io.BufferedReader(gzip.GzipFile(fileobj=raw))
    try:
        head = raw.peek(4096)[:4096]
    except OSError as error:
        raise InputError(where, f"a damaged gzip file ({error})", "a complete file", "copy it again") from None
    if not head:
        raise InputError(where, "an empty file", "at least one structure", "check that the export worked")
    encoding = "utf-8-sig"
    if head[:2] in (b"\xff\xfe", b"\xfe\xff"):
        encoding = "utf-16"
    elif b"\x00" in head:
        kind = "a zip archive or workbook" if head[:2] == b"PK" else "a binary file"
        raise InputError(where, kind, "text: SMILES lines, CSV, MOL or SDF", "export the structures in one of these formats")
    elif head.lstrip()[:1] == b"<":
        raise InputError(
            where,
            "a page or drawing in XML",
            "text: SMILES lines, CSV, MOL or SDF",
            "export the structures in one of these formats",
        )
    text = io.TextIOWrapper(raw, encoding=encoding, errors="shiftpred-latin-1")
    try:
        lines = _iterate_lines(text)
        if suffix in _TABLE_SUFFIXES:
            yield from _parse_table(lines, where, "\t" if suffix == ".tsv" else None)
        elif suffix in _BLOCK_SUFFIXES:
            yield from parse_blocks(lines, where)
        else:
            yield from _parse_lines_of_any_kind(lines, where)
    except EOFError:
        raise InputError(where, "a gzip file that ends too soon", "a complete file", "copy it again") from None
    finally:
        text.detach()


def _iterate_lines(text) -> Iterator[str]:
    """Yield lines, each cut to `_LONGEST_LINE_KEPT` characters."""
    while line := text.readline(_LONGEST_LINE_KEPT):
        yield line
        while len(line) == _LONGEST_LINE_KEPT and line[-1] != "\n":
            line = text.readline(_LONGEST_LINE_KEPT)


def _parse_lines_of_any_kind(lines: Iterable[str], where: str) -> Iterator[Structure | RecordFailure]:
    """Tell SMILES lines, a table and molfiles apart by the first lines."""
    lines = iter(lines)
    head = list(islice(lines, _LINES_LOOKED_AT))
    everything = chain(head, lines)
    first = next((line for line in head if line.strip()), "").lower().replace('"', "")
    if any(is_counts_line(line) or line.startswith(("M  END", "$RXN", "$RDFILE")) for line in head):
        yield from parse_blocks(everything, where)
    elif any("smiles" in [cell.strip() for cell in first.split(mark)] for mark in ",;\t") and len(first.split()) == 1:
        yield from _parse_table(everything, where, None)
    elif first.startswith("sep="):
        yield from _parse_table(everything, where, None)
    else:
        yield from _parse_lines(everything, where)


def _parse_lines(lines: Iterable[str], where: str) -> Iterator[Structure | RecordFailure]:
    number = 0
    for line_number, line in enumerate(lines, 1):
        words = line.strip().lstrip("\ufeff").split(None, 3)
        if not words or (words[0][0] == "#" and (len(words) > 1 or words[0] == "#")):
            continue  # blank, or a comment
        if number == 0 and words[0].lower() in ("smiles", "structure", "inchi") and len(words) <= 3:
            continue  # a header
        number += 1
        yield parse_line(line.strip().lstrip("\ufeff"), str(number), f"{where}, line {line_number}")
    if number == 0:
        raise InputError(where, "no structure", "one SMILES on each line", "check that the export worked")


def _parse_table(lines: Iterable[str], where: str, delimiter: str | None) -> Iterator[Structure | RecordFailure]:
    lines = (line for line in lines if line.strip())
    first = next(lines, "")
    if first.lower().startswith("sep="):
        delimiter, first = first.strip()[4:5] or delimiter, next(lines, "")
    delimiter = delimiter or max(",;\t", key=first.count)
    header = [cell.strip().lstrip("\ufeff").lower() for cell in next(csv.reader([first], delimiter=delimiter), [])]
    if "smiles" not in header:
        raise InputError(
            where,
            f"columns {quote(', '.join(header), 120)}",
            "a column `smiles`",
            "rename the column that holds the structures to smiles",
        )
    at = header.index("smiles")
    name_at = next((header.index(column) for column in _NAME_COLUMNS if column in header), None)
    number = 0
    # Strict, because a quotation mark that is never closed would swallow the rows behind it without a word.
    rows = csv.reader(lines, delimiter=delimiter, strict=True)
    while True:
        try:
            row = next(rows, None)
        except csv.Error as error:
            number += 1
            place = f"{where}, row {number} (line {rows.line_num + 1})"
            reason = f"a row that cannot be read ({error})"
            yield RecordFailure(
                str(number), StructureError(place, reason, "quotation marks in pairs", "check the quotation marks from here on")
            )
            continue
        if row is None:
            break
        if not any(cell.strip() for cell in row):
            continue
        number += 1
        name = (row[name_at].strip() if name_at is not None and name_at < len(row) else "") or str(number)
        cell = row[at].strip() if at < len(row) else ""
        # Extended SMILES and words behind the SMILES are no name here: the table has a column for that.
        yield parse_line(cell.split(None, 1)[0] if cell else "", name, f"{where}, row {number}")
    if number == 0:
        raise InputError(where, "a table without rows", "at least one row below the header", "check that the export worked")
