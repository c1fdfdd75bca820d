"""The summary of a night as an Excel workbook."""

from __future__ import annotations

import contextlib
import csv
import os
import tempfile
from pathlib import Path

from shiftpred.errors import SettingError
from shiftpred.reporting import build_refusal

__all__ = ["require_openpyxl", "save_summary_workbook"]

_NUMBERS = {"probability", "leftover_lines", "missing_nuclei", "c13_offset_ppm", "h1_offset_ppm"}
_WIDTHS = {"sample": 18, "judgement": 14, "sentence": 60, "nearest_rival": 28, "smiles": 32, "report": 34, "note": 50}
_LONGEST_CELL = 32_767
"""Characters that the format allows in one cell."""


def require_openpyxl() -> None:
    """Refuse, with the way out, where openpyxl is not installed.

    Raises
    ------
    SettingError
    """
    try:
        import openpyxl  # noqa: F401
    except ImportError:
        raise SettingError(
            "option --format", "xlsx, and openpyxl is not installed", "the extra 'tables'", "pip install 'shiftpred[tables]'"
        ) from None


def save_summary_workbook(folder: str | Path) -> Path:
    """Write `summary.xlsx` beside `summary.csv`, with the same rows; in one step, like every file.

    Parameters
    ----------
    folder : path
        Of a finished run.

    Returns
    -------
    Path
        Of the workbook. Numbers are numbers; whatever else a cell holds is text, never a formula.

    Raises
    ------
    SettingError
        If openpyxl is missing or the file cannot be written.
    """
    require_openpyxl()
    from openpyxl import Workbook
    from openpyxl.cell.cell import ILLEGAL_CHARACTERS_RE
    from openpyxl.styles import Font
    from openpyxl.utils import get_column_letter

    folder = Path(folder)
    with open(folder / "summary.csv", encoding="utf-8", newline="") as handle:
        header, *rows = list(csv.reader(handle))
    book = Workbook()
    sheet = book.active
    sheet.title = "summary"
    for i, row in enumerate([header, *rows], 1):
        for k, (name, text) in enumerate(zip(header, row), 1):
            cell = sheet.cell(i, k)
            if i > 1 and name in _NUMBERS and text:
                cell.value = float(text)
                continue
            cell.value = ILLEGAL_CHARACTERS_RE.sub("\ufffd", text)[:_LONGEST_CELL]
            cell.data_type = "s"  # a name that begins with '=' is no formula
    for k, name in enumerate(header, 1):
        sheet.cell(1, k).font = Font(bold=True)
        sheet.column_dimensions[get_column_letter(k)].width = _WIDTHS.get(name, 14)
    sheet.freeze_panes = "B2"
    sheet.auto_filter.ref = sheet.dimensions
    target, temporary = folder / "summary.xlsx", None
    try:
        handle, temporary = tempfile.mkstemp(prefix=".summary.", suffix=".part", dir=folder)
        with open(handle, "wb") as stream:
            book.save(stream)
            stream.flush()
            os.fsync(stream.fileno())
        os.chmod(temporary, (folder / "summary.csv").stat().st_mode & 0o777)
        os.replace(temporary, target)
        temporary = None
    except OSError as error:
        refusal = build_refusal(error, str(target), f"free space on {folder}")
        if refusal is None:
            raise
        raise refusal from error
    finally:
        if temporary is not None:
            with contextlib.suppress(OSError):
                os.unlink(temporary)
    return target
