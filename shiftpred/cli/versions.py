"""Versions of everything that matters for a report, without importing what need not be imported."""

from __future__ import annotations

import platform
from importlib import metadata

from shiftpred.errors import ShiftpredError

__all__ = ["render_versions"]

_NEEDED = ("rdkit", "numpy", "scipy", "pandas", "click", "jinja2", "tqdm")
_OPTIONAL = ("openpyxl", "nmrglue", "scikit-learn", "torch", "fastapi", "distributed")


def render_versions() -> str:
    """Return one line each for the tool, the model, Python, the system and the libraries."""
    from shiftpred import __version__

    pairs = [("shiftpred", __version__), ("model", _find_edition()), ("python", platform.python_version())]
    pairs += [(name, _find_version(name) or "not installed") for name in _NEEDED]
    pairs += [(name, version) for name in _OPTIONAL if (version := _find_version(name))]
    pairs.append(("system", f"{platform.system()} {platform.machine()}"))
    longest = max(len(name) for name, _ in pairs)
    return "\n".join(f"{name:<{longest}}  {version}" for name, version in pairs)


def _find_version(name: str) -> str | None:
    try:
        return metadata.version(name)
    except metadata.PackageNotFoundError:
        return None


def _find_edition() -> str:
    from shiftpred.bundles import load_default_bundle

    try:
        return load_default_bundle().edition
    except ShiftpredError as error:
        return f"none that can be read ({error})"
