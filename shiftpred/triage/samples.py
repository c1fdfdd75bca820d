"""Read the samples of a night: a table, or a folder of files."""

from __future__ import annotations

import csv
import gzip
import io
import zipfile
import zlib
from collections.abc import Iterator
from dataclasses import asdict, dataclass
from pathlib import Path

from shiftpred.errors import InputError, quote

__all__ = ["Sample", "parse_samples"]

_COLUMNS = {
    "sample": ("sample", "name", "id", "molecule"),
    "smiles": ("smiles", "structure"),
    "c13": ("c13", "13c", "c13_peaks", "13c nmr"),
    "h1": ("h1", "1h", "h1_peaks", "1h nmr"),
    "solvent": ("solvent",),
    "frequency": ("frequency", "frequency_mhz"),
}
"""Column → spellings of its heading (case does not matter)."""
_STRUCTURE_SUFFIXES = (".smi", ".smiles", ".mol", ".sdf")
_PEAK_ENDINGS = {"c13": ("_13c", "-13c", ".13c", "_c13"), "h1": ("_1h", "-1h", ".1h", "_h1")}
_PEAK_SUFFIXES = (".txt", ".csv", ".tsv")
_LARGEST_TABLE = 256 * 1024 * 1024
_MOST_ROWS, _MOST_COLUMNS = 200_000, 256
"""Of a workbook; formatting alone can make a sheet a million rows long."""


@dataclass(frozen=True)
class Sample:
    """One sample as given; nothing is checked yet."""

    number: int
    """1-based place in the table or folder."""
    name: str
    structure: str
    """A SMILES or the path of a structure file; '' where none was given."""
    c13: str
    """13C peaks as text or the path of a file; '' : not measured."""
    h1: str
    solvent: str
    frequency: str

    def to_dict(self) -> dict:
        return asdict(self)


def parse_samples(source: str | Path) -> Iterator[Sample]:
    """Read samples one after the other.

    Parameters
    ----------
    source : path
        A CSV or TSV (also .gz) with columns `sample, smiles, c13, h1, solvent` (any order; `frequency` too), an .xlsx with the
        same columns, or a folder with `NAME.smi` (or .mol, .sdf) and `NAME_13C.txt`, `NAME_1H.txt` for each sample.

    Yields
    ------
    Sample

    Raises
    ------
    InputError
        If the source as a whole cannot be read.
    """
    path = Path(source)
    if path.is_dir():
        yield from _parse_folder(path)
    elif path.suffix.lower() == ".xlsx":
        yield from _parse_rows(_read_workbook(path), str(path))
    elif path.is_file():
        yield from _parse_rows(_read_table(path), str(path))
    else:
        raise InputError(quote(str(source)), "no such file or folder", "a table of samples or a folder", "check the path")


def _read_table(path: Path) -> Iterator[list[str]]:
    try:
        _require_size(path)
        content = path.read_bytes()
        if content[:2] == b"\x1f\x8b":
            content = gzip.GzipFile(fileobj=io.BytesIO(content)).read(_LARGEST_TABLE + 1)
    except (OSError, EOFError, zlib.error) as error:
        if isinstance(error, InputError):
            raise
        raise InputError(str(path), f"a file that cannot be read ({error})", "a readable table", "check permissions") from None
    if len(content) > _LARGEST_TABLE:
        raise _build_size_error(path, f"more than {_LARGEST_TABLE:,} bytes once unpacked")
    if content[:2] == b"PK":
        raise InputError(str(path), "a zip archive or workbook", "a CSV or TSV", "name a workbook .xlsx, or save it as CSV")
    text = _decode(content)
    first = text.lstrip().split("\n", 1)[0]
    delimiter = max(",;\t", key=first.count)
    csv.field_size_limit(1_000_000)
    rows = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)
    try:
        yield from rows
    except csv.Error as error:
        raise InputError(
            f"{path}, line {rows.line_num}",
            f"a row that cannot be read ({error})",
            "a CSV with quotation marks in pairs",
            "check the quotation marks from here on",
        ) from None


def _require_size(path: Path) -> None:
    size = path.stat().st_size
    if size > _LARGEST_TABLE:
        raise _build_size_error(path, f"{size:,} bytes")


def _build_size_error(path: Path, came: str) -> InputError:
    return InputError(str(path), came, f"at most {_LARGEST_TABLE:,} bytes", "split the table")


def _decode(content: bytes) -> str:
    if content[:2] in (b"\xff\xfe", b"\xfe\xff"):
        return content.decode("utf-16", errors="replace")
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError:
        return content.decode("latin-1")


def _read_workbook(path: Path) -> Iterator[list[str]]:
    try:
        from openpyxl import load_workbook
    except ImportError:
        raise InputError(
            str(path),
            "an .xlsx file, and openpyxl is not installed",
            "a CSV, or the extra `tables`",
            "pip install 'shiftpred[tables]'",
        ) from None
    try:
        with zipfile.ZipFile(path) as archive:  # says how large it is before anything is unpacked
            unpacked = sum(member.file_size for member in archive.infolist())
        if unpacked > _LARGEST_TABLE:
            raise _build_size_error(path, f"{unpacked:,} bytes once unpacked")
        book = load_workbook(path, read_only=True, data_only=True)
        try:
            # One more than allowed, so that there is something to refuse.
            for number, row in enumerate(book.active.iter_rows(values_only=True, max_col=_MOST_COLUMNS), 1):
                if number > _MOST_ROWS:
                    raise InputError(
                        str(path), f"more than {_MOST_ROWS:,} rows", "a sheet of samples", "delete empty rows below"
                    )
                yield ["" if cell is None else str(cell) for cell in row]
        finally:
            book.close()
    except (InputError, GeneratorExit):
        raise
    except Exception as error:  # the library raises whatever the damaged part brings up
        raise InputError(
            str(path), f"a workbook that cannot be read ({error})", "an .xlsx file", "save it again, or as CSV"
        ) from None


def _parse_rows(rows: Iterator[list[str]], where: str) -> Iterator[Sample]:
    header = [cell.strip().lower() for cell in next(rows, [])]
    places = {c: next((header.index(s) for s in spellings if s in header), None) for c, spellings in _COLUMNS.items()}
    if places["smiles"] is None or places["c13"] is None and places["h1"] is None:
        raise InputError(
            where,
            f"columns {', '.join(header) or 'none'}",
            "columns sample, smiles, c13, h1, solvent",
            "name the columns of structure and peaks smiles, c13 and h1",
        )
    number = 0
    for row in rows:
        if not any(cell.strip() for cell in row):
            continue
        number += 1
        cells = {c: row[k].strip() if k is not None and k < len(row) else "" for c, k in places.items()}
        yield Sample(
            number,
            cells["sample"] or str(number),
            cells["smiles"],
            cells["c13"],
            cells["h1"],
            cells["solvent"],
            cells["frequency"],
        )
    if number == 0:
        raise InputError(where, "a table without rows", "at least one sample", "check that the export worked")


def _parse_folder(folder: Path) -> Iterator[Sample]:
    found: dict[str, dict[str, str]] = {}
    for path in sorted(p for p in folder.rglob("*") if p.is_file() and not p.name.startswith(".")):
        stem, suffix = path.stem, path.suffix.lower()
        kind = next((k for k, ends in _PEAK_ENDINGS.items() if stem.lower().endswith(ends)), None)
        if suffix in _PEAK_SUFFIXES and kind:
            ending = next(e for e in _PEAK_ENDINGS[kind] if stem.lower().endswith(e))
            found.setdefault(str(path.parent.relative_to(folder) / stem[: -len(ending)]), {})[kind] = str(path)
        elif suffix in _STRUCTURE_SUFFIXES:
            found.setdefault(str(path.parent.relative_to(folder) / stem), {})["structure"] = str(path)
    if not found:
        raise InputError(
            str(folder),
            "no samples",
            "NAME.smi (or .mol, .sdf) with NAME_13C.txt and NAME_1H.txt",
            "rename the files, or give a table",
        )
    for number, (name, files) in enumerate(sorted(found.items()), 1):
        yield Sample(number, name, files.get("structure", ""), files.get("c13", ""), files.get("h1", ""), "", "")
