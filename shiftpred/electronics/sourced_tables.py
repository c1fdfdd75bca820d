"""The numbers behind the methods: tables/*.csv, each row with its source and whether it was seen or remembered."""

from __future__ import annotations

import csv
from collections.abc import Iterable
from functools import cache
from importlib.resources import files

from shiftpred.errors import InputError, quote

__all__ = ["load_element_values", "load_gasteiger_marsili", "load_rows", "parse_rows"]

_COLUMNS = {
    "bond_energies": "element_a element_b value unit source verified note",
    "elements": "symbol Z property scale value unit source verified note",
    "gasteiger_marsili": "symbol hybrid oxo a_ev b_ev c_ev source verified note",
    "group_electronegativity": "group smiles scale value unit source verified confidence note",
    "inductive_parameters": "quantity kind value unit source verified",
    "resonance_parameters": "term value unit source verified",
    "substituent_constants": "substituent smiles parameter value source verified note",
}
_VERIFIED = ("transcription", "memory", "computed")


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

    Raises
    ------
    InputError
        See `parse_rows`.
    """
    with files("shiftpred.electronics").joinpath(f"tables/{name}.csv").open(encoding="utf-8", newline="") as file:
        return parse_rows(name, file)


def parse_rows(name: str, lines: Iterable[str]) -> tuple[dict[str, str], ...]:
    """Read one of the tables, and refuse it if a number in it does not say where it comes from.

    Parameters
    ----------
    name : str
        Tells which columns there must be.
    lines : iterable of str
        CSV with a header line.

    Returns
    -------
    tuple of dict
        Column → text.

    Raises
    ------
    InputError
        If a column is unknown or lacking, a source is blank, or `verified` is another word than 'transcription', 'memory'
        or 'computed'.
    """
    reader = csv.DictReader(lines)
    expected = _COLUMNS[name].split()
    if reader.fieldnames != expected:
        raise InputError(
            f"table {name}.csv, header",
            f"the columns {', '.join(reader.fieldnames or ())}",
            f"the columns {', '.join(expected)}",
            "putting back the table of this edition",
        )
    rows = []
    for number, row in enumerate(reader, start=2):
        if None in row or None in row.values():
            raise InputError(
                f"table {name}.csv, line {number}",
                "a row with other cells than the header",
                f"{len(expected)} cells",
                "quotation marks around cells with commas",
            )
        if not row["source"].strip():
            raise InputError(
                f"table {name}.csv, line {number}",
                "a blank source",
                "the publication, or that there is none at hand",
                "filling in the column 'source'",
            )
        if row["verified"] not in _VERIFIED:
            raise InputError(
                f"table {name}.csv, line {number}",
                f"verified = {quote(row['verified'])}",
                "one of " + ", ".join(map(repr, _VERIFIED)),
                "'memory', if it was not seen",
            )
        rows.append(row)
    return tuple(rows)


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
