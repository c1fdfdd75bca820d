"""Progress bars of the training commands."""

from __future__ import annotations

import sys

from tqdm import tqdm

__all__ = ["show_progress"]


def show_progress(items, what: str, total: int | None = None, wanted: bool = True):
    """Wrap an iterable in a progress bar where somebody is looking."""
    return tqdm(items, desc=what, total=total, leave=False, disable=not (wanted and sys.stderr.isatty()))
