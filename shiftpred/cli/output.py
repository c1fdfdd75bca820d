"""Where a command's result goes, and in which format."""

from __future__ import annotations

import contextlib
import sys
from collections.abc import Iterable, Iterator
from pathlib import PurePath
from typing import TextIO

__all__ = ["choose_format", "is_progress_wanted", "open_output", "track_progress", "write_result"]

_FORMAT_BY_ENDING = {
    ".html": "html",
    ".htm": "html",
    ".json": "json",
    ".csv": "csv",
    ".txt": "text",
    ".sdf": "sdf",
}


def choose_format(asked: str | None, output: str | None, known: tuple[str, ...]) -> str:
    """Return the format: what was asked for, else what the file's ending says, else the first known.

    Examples
    --------
    >>> choose_format(None, "report.html", ("text", "json", "html"))
    'html'
    """
    if asked:
        return asked
    by_ending = _FORMAT_BY_ENDING.get(PurePath(output).suffix.lower()) if output else None
    by_ending = "nmredata" if by_ending == "sdf" and "nmredata" in known else by_ending
    return by_ending if by_ending in known else known[0]


@contextlib.contextmanager
def open_output(output: str | None) -> Iterator[TextIO]:
    """Yield standard output, or a stream that becomes the file in one step at the end."""
    if output in (None, "-"):
        yield sys.stdout
        return
    from shiftpred.reporting import open_for_saving

    with open_for_saving(output) as stream:
        yield stream


def write_result(output: str | None, text: str) -> None:
    """Write one finished text."""
    with open_output(output) as stream:
        stream.write(text)


def is_progress_wanted(output: str | None) -> bool:
    """Say whether a progress bar would be seen and would not run into the result."""
    return sys.stderr.isatty() and (output not in (None, "-") or not sys.stdout.isatty())


def track_progress(items: Iterable, output: str | None, unit: str) -> Iterable:
    """Return the items, with a bar on standard error where somebody watches."""
    if not is_progress_wanted(output):
        return items
    from tqdm import tqdm

    return tqdm(items, unit=f" {unit}", file=sys.stderr, dynamic_ncols=True)
