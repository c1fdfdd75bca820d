"""Substituent constants as they were published, looked up by the group's canonical SMILES."""

from __future__ import annotations

from functools import cache, lru_cache
from statistics import median

from rdkit import Chem, rdBase

from shiftpred.electronics.sourced_tables import load_rows

__all__ = ["find_published_median", "find_published_rows"]


@lru_cache(maxsize=4)
def _load(table: str) -> dict[str, tuple[dict[str, str], ...]]:
    found: dict[str, list[dict[str, str]]] = {}
    for row in load_rows(table):
        found.setdefault(_canonical(row["smiles"]), []).append(row)
    return {smiles: tuple(rows) for smiles, rows in found.items()}


@cache
def _canonical(smiles: str) -> str:
    # Not by parse_group, which would build the whole graph: the first look-up of a process waits for this loop.
    with rdBase.BlockLogs():
        return Chem.MolToSmiles(Chem.MolFromSmiles(smiles))


@lru_cache(maxsize=1)
def _medians() -> dict[tuple[str, str], float]:
    values: dict[tuple[str, str], list[float]] = {}
    for smiles, rows in _load("substituent_constants").items():
        for row in rows:
            values.setdefault((smiles, row["parameter"]), []).append(float(row["value"]))
    return {key: median(found) for key, found in values.items()}


def find_published_rows(smiles: str, table: str = "substituent_constants") -> tuple[dict[str, str], ...]:
    """Return every published row of a group, best verified first.

    Parameters
    ----------
    smiles : str
        Canonical, as in `GroupGraph.smiles`.
    table : {'substituent_constants', 'group_electronegativity'}

    Returns
    -------
    tuple of dict
        Rows of `tables/<table>.csv`; empty where no table has the group.
    """
    return tuple(sorted(_load(table).get(smiles, ()), key=lambda row: row["verified"] != "transcription"))


def find_published_median(smiles: str, parameter: str) -> float | None:
    """Return the median of the published values of one constant; None where no table has the group.

    The published columns differ by some 0.05 in sigma_I from author to author, so the model takes their middle; a person
    who looks the group up is shown each by itself.
    """
    return _medians().get((smiles, parameter))
