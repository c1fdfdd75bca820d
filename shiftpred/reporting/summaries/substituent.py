"""Substituent constants → dictionary (schemas/substituent-1.json)."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable

from shiftpred.reporting.summaries.common import SCHEMA_VERSION, compute_significant, compute_tool_dict

__all__ = ["compute_substituent_dict"]


def compute_substituent_dict(results: Iterable[tuple[str, object]]) -> dict:
    """Put the constants of groups into one plain dictionary.

    Parameters
    ----------
    results : iterable of (str, SubstituentConstants or Exception)
        The group as it was written, and its constants or why there are none.

    Returns
    -------
    dict
        As in `schemas/substituent-1.json`: each group with `constants`, or with `note` where there are none.
    """
    return {
        "schema_version": SCHEMA_VERSION,
        "kind": "substituent",
        "tool": compute_tool_dict(),
        "groups": [_build_group(text, result) for text, result in results],
    }


def _build_group(text: str, result: object) -> dict:
    if isinstance(result, Exception):
        return {"group": text, "constants": None, "note": " ".join(str(result).split())}
    return {"group": text, "constants": _build_plain(result), "note": ""}


def _build_plain(value: object):
    """Turn records, tuples and numbers into what JSON can hold."""
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {field.name: _build_plain(getattr(value, field.name)) for field in dataclasses.fields(value)}
    if isinstance(value, dict):
        return {str(key): _build_plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple, set, frozenset)):
        return [_build_plain(item) for item in value]
    if value is None or isinstance(value, (str, bool, int)):
        return value
    try:
        return compute_significant(float(value))
    except (TypeError, ValueError):
        return str(value)
