"""Published additivity increments, and which of their group names a substituent of a molecule answers to."""

from __future__ import annotations

import csv
from functools import lru_cache

from rdkit import Chem

from shiftpred.bundles.locations import find_datasets
from shiftpred.errors import SettingError

__all__ = ["find_group_names", "find_increment", "load_bases", "load_increments"]

_FOLDER = "shift_increments"


@lru_cache(maxsize=1)
def load_increments() -> dict[tuple[str, str, str, str], float]:
    """Return {(nucleus, scheme, substituent, position): increment in ppm} of `datasets/shift_increments`.

    Raises
    ------
    SettingError
        If the table is not where it is shipped.
    """
    return {
        (r["nucleus"], r["scheme"], r["substituent"], r["position"]): float(r["increment_ppm"])
        for r in _read("shift_increments.csv")
    }


@lru_cache(maxsize=1)
def load_bases() -> dict[tuple[str, str], str]:
    """Return {(nucleus, scheme): base as the source prints it} ('0.23'; 'CH3 0.9; CH2 1.2; CH 1.5')."""
    return {(r["nucleus"], r["scheme"]): r["base_ppm"] for r in _read("shift_increments.csv")}


@lru_cache(maxsize=1)
def _load_patterns() -> tuple[tuple[Chem.Mol, tuple[str, ...]], ...]:
    return tuple((Chem.MolFromSmarts(r["smarts"]), tuple(r["names"].split(";"))) for r in _read("group_patterns.csv"))


def _read(name: str) -> list[dict[str, str]]:
    path = find_datasets() / _FOLDER / name
    try:
        with open(path, encoding="utf-8", newline="") as handle:
            return list(csv.DictReader(handle))
    except OSError as error:
        raise SettingError(
            str(path), f"no readable file ({error.strerror})", "the table shipped with shiftpred", "reinstall shiftpred"
        ) from None


def find_group_names(mol: Chem.Mol) -> dict[tuple[int, int], tuple[str, ...]]:
    """Name every substituent of a molecule as the published tables do.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised, hydrogens implicit.

    Returns
    -------
    dict
        {(atom, attached atom): names}: the group that begins at the attached atom as seen from the atom, both 0-based,
        with its names from special to general ('OCH3', 'OR', 'OH/OR'). Only groups on single bonds; one that no table
        knows is absent.
    """
    found: dict[tuple[int, int], list[str]] = {}
    for pattern, names in _load_patterns():
        seen = set()
        for match in mol.GetSubstructMatches(pattern, uniquify=False, maxMatches=10_000):
            seen.add(match[:2])
        for pair in seen:
            known = found.setdefault(pair, [])
            known.extend(name for name in names if name not in known)
    return {pair: tuple(names) for pair, names in found.items()}


def find_increment(nucleus: str, schemes: tuple[str, ...], names: tuple[str, ...], position: str) -> float | None:
    """Return the increment of the most special name that a scheme has, the first scheme before the next; None: not there."""
    table = load_increments()
    for scheme in schemes:
        for name in names:
            value = table.get((nucleus, scheme, name, position))
            if value is not None:
                return value
    return None
