"""What all dictionaries share: numbers that JSON can hold, the tool, the structure."""

from __future__ import annotations

import math
import platform

import numpy
import rdkit
from rdkit import Chem
from rdkit.Chem import rdMolDescriptors

from shiftpred.records import NucleusPrediction, Structure

SCHEMA_VERSION = 1
"""Number of the JSON form. It rises when a key goes or changes its meaning; a new key does not raise it."""

CAUTION = (
    "A prediction is evidence, not proof of identity; release testing, forensic and clinical use follow local rules "
    "and a qualified person's judgement."
)


def compute_number(value: float | None, decimals: int = 4) -> float | None:
    """Return `value` rounded, or None where it is missing or unbounded (JSON knows no infinity).

    Examples
    --------
    >>> compute_number(1.23456789), compute_number(float("inf")), compute_number(-0.00001)
    (1.2346, None, 0.0)
    """
    if value is None or not math.isfinite(value):
        return None
    return round(float(value), decimals) + 0.0


def compute_significant(value: float | None, digits: int = 6) -> float | None:
    """Return `value` to so many significant digits None where unbounded."""
    if value is None or not math.isfinite(value):
        return None
    return float(f"{float(value):.{digits}g}")


def compute_probability(value: float | None) -> float | None:
    """Return a probability to six digits of its distance to 0 or to 1, whichever is nearer; None where missing.

    Examples
    --------
    >>> compute_probability(0.97314159), compute_probability(0.99999987654321)
    (0.9731416, 0.999999876543)
    """
    if value is None or not math.isfinite(value):
        return None
    if value <= 0.5:
        return compute_significant(value)
    return round(1.0 - compute_significant(1.0 - value), 12)


def compute_tool_dict() -> dict:
    """Return name and version of the tool and of the libraries that decide about its numbers and pictures."""
    from shiftpred import __version__

    libraries = {"python": platform.python_version(), "numpy": numpy.__version__, "rdkit": rdkit.__version__}
    return {"name": "shiftpred", "version": __version__, "libraries": libraries}


def choose_sample_name(sample: str, structure: Structure) -> str:
    """Return what the report is called: the sample's name, the record's, or what was typed in for the structure."""
    if sample:
        return sample
    if structure.name and not structure.name.isdigit():
        return structure.name
    return structure.text if 0 < len(structure.text) <= 120 and "\n" not in structure.text else structure.name


def compute_structure_dict(structure: Structure) -> dict:
    """Describe a structure so that it can be drawn again with the user's own atom numbers.

    Parameters
    ----------
    structure : Structure

    Returns
    -------
    dict
        name, text, smiles, smiles_atoms (the user's number of each atom of `smiles`, in its order), formula,
        coordinates (the user's own drawing, x and y by atom of `smiles`; None where there is none), notes.
    """
    mol = structure.mol
    smiles = Chem.MolToSmiles(mol)
    order = list(mol.GetPropsAsDict(True, True).get("_smilesAtomOutputOrder", ()))
    if len(order) != mol.GetNumAtoms():
        order = list(range(mol.GetNumAtoms()))
    return {
        "name": structure.name,
        "text": structure.text,
        "smiles": smiles,
        "smiles_atoms": [structure.atom_numbers[i] for i in order],
        "formula": rdMolDescriptors.CalcMolFormula(mol),
        "coordinates": _read_drawing(mol, order),
        "notes": list(structure.notes),
    }


def _read_drawing(mol: Chem.Mol, order: list[int]) -> list[list[float]] | None:
    if not mol.GetNumConformers() or mol.GetConformer().Is3D():
        return None
    conformer = mol.GetConformer()
    points = [conformer.GetAtomPosition(i) for i in order]
    if len({(round(p.x, 3), round(p.y, 3)) for p in points}) < len(points):
        return None  # atoms on top of each other: no drawing, only zeros
    return [[compute_number(p.x), compute_number(p.y)] for p in points]


def build_nucleus_entry(nucleus: NucleusPrediction) -> dict:
    """Return one predicted shift under the names of the CSV's columns."""
    return {
        "atom": nucleus.atom,
        "nucleus": nucleus.nucleus,
        "hydrogen": nucleus.hydrogen,
        "attached_h": nucleus.attached_h,
        "equivalent_atoms": list(nucleus.equivalent_atoms),
        "shift_ppm": compute_number(nucleus.shift_ppm),
        "lower_ppm": compute_number(nucleus.lower_ppm),
        "upper_ppm": compute_number(nucleus.upper_ppm),
        "coverage": nucleus.coverage,
        "environment": nucleus.environment,
        "labile": nucleus.labile,
        "note": nucleus.note,
    }
