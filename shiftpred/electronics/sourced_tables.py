"""The numbers behind the methods: tables/*.csv, each row with its source and whether it was seen or remembered."""

from __future__ import annotations

import csv
from functools import cache
from importlib.resources import files

__all__ = ["load_element_values", "load_gasteiger_marsili", "load_rows"]


@cache
def load_rows(name: str) -> tuple[dict[str, str], ...]:
    """Return the rows of `tables/<name>.csv` as they stand in the file.

    Parameters
    ----------
    name : str
        Without folder and extension.

    Returns
    -------
    tuple of dict
        Column → text.
    """
    with files("shiftpred.electronics").joinpath(f"tables/{name}.csv").open(encoding="utf-8", newline="") as file:
        return tuple(csv.DictReader(file))


@cache
def load_element_values(element_property: str, scale: str) -> dict[str, float]:
    """Return one property of the elements, symbol → value, from `tables/elements.csv`.

    Parameters
    ----------
    element_property, scale : str
        As in the columns `property` and `scale`: ('electronegativity', 'Pauling (Allred 1961)').

    Returns
    -------
    dict of str to float
        In the unit of the table; elements without a value are absent.
    """
    return {
        row["symbol"]: float(row["value"])
        for row in load_rows("elements")
        if row["property"] == element_property and row["scale"] == scale and row["value"]
    }


@cache
def load_gasteiger_marsili() -> dict[tuple[str, str, int], tuple[float, float, float]]:
    """Return (symbol, hybridisation, S=O bonds) → (a, b, c) in eV, eV/e, eV/e²."""
    return {
        (row["symbol"], row["hybrid"], int(row["oxo"])): (float(row["a_ev"]), float(row["b_ev"]), float(row["c_ev"]))
        for row in load_rows("gasteiger_marsili")
    }
