"""Where the shipped models and data sets lie: in a wheel inside the package, in a source tree beside it."""

from __future__ import annotations

from pathlib import Path

import shiftpred

__all__ = ["find_datasets", "find_models"]


def find_models() -> Path:
    """Return the folder that holds one folder for each shipped model."""
    return _find("_models", "models")


def find_datasets() -> Path:
    """Return the folder that holds one folder for each shipped data set."""
    return _find("_datasets", "datasets")


def _find(packed: str, beside: str) -> Path:
    package = Path(shiftpred.__file__).resolve().parent
    inside = package / packed
    return inside if inside.is_dir() else package.parent / beside
