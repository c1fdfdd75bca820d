"""One molecule → arrays for the environment model: atoms, bonds and stereo relations as rows of plain numbers.

Everything is invariant to the order of the atoms and to mirror reflection (a spectrum in an achiral solvent is), and is
computed from the graph alone; no conformer is made.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import lru_cache
from importlib import resources

import numpy as np
from rdkit import Chem
from rdkit.Chem import rdPartialCharges

from shiftpred.features.stereo_relations import STEREO_RELATIONS, compute_stereo_edges

__all__ = ["ATOM_FEATURES", "BOND_FEATURES", "MoleculeArrays", "build_molecule_arrays", "join_molecule_arrays"]

_ELEMENTS = (6, 7, 8, 9, 14, 15, 16, 17, 35, 53, 5, 34)
_HYBRIDS = {Chem.HybridizationType.SP: 0, Chem.HybridizationType.SP2: 1, Chem.HybridizationType.SP3: 2}
_S_CHARACTER = (0.5, 1 / 3, 0.25, 0.25)
# Slope of carbon's orbital electronegativity in its s character (2.48 for te, 3.29 for di, Pauling units), scaled to other
# elements by their own value. Hinze & Jaffe, J. Am. Chem. Soc. 1962, 84, 540 (the two carbon values from memory).
_HYBRID_SLOPE = (3.29 - 2.48) / (0.5 - 0.25) / 2.55
# Mean distance (in angstrom) of two atoms 1, 2, 3, … bonds apart in organic chains and rings (common practice, no source).
_PATH_DISTANCE = np.array([np.inf, 1.45, 2.48, 3.4, 4.3, 5.1, 6.0, 6.9, 7.8, 8.7, 9.6], dtype=np.float64)

ELECTRONIC_FEATURES = (
    "pauling",
    "hybrid_electronegativity",
    "sanderson",
    "allen",
    "covalent_radius",
    "equalised_1",
    "equalised_2",
    "equalised_3",
    "partial_charge",
    "partial_charge_with_hydrogens",
    "inductive_field",
    "inductive_field_near",
)
ATOM_FEATURES = (
    tuple(f"element_{n}" for n in _ELEMENTS)
    + ("element_other",)
    + tuple(f"hydrogens_{n}" for n in range(5))
    + tuple(f"neighbours_{n}" for n in range(5))
    + ("sp", "sp2", "sp3", "other_hybrid", "positive", "negative", "aromatic", "conjugated", "stereocentre")
    + tuple(f"ring_{n}" for n in (3, 4, 5, 6, 7, 8))
    + ("rings_1", "rings_2", "rings_3")
    + ELECTRONIC_FEATURES
)
"""Names of the columns of `MoleculeArrays.atoms`, in order."""

BOND_FEATURES = (
    "single",
    "double",
    "triple",
    "aromatic",
    "other_order",
    "conjugated",
    "ring_3",
    "ring_4",
    "ring_5",
    "ring_6",
    "ring_7",
    "ring_8",
    "electronegativity_difference",
    "like_centres",
    "unlike_centres",
) + tuple(f"stereo_{name}" for name in STEREO_RELATIONS)
"""Names of the columns of `MoleculeArrays.edges`, in order."""

N_ATOM_FEATURES, N_BOND_FEATURES = len(ATOM_FEATURES), len(BOND_FEATURES)
_OFFSET = {name: i for i, name in enumerate(ATOM_FEATURES)}
_FIRST_ELECTRONIC = _OFFSET["pauling"]
_BOND_OFFSET = {name: i for i, name in enumerate(BOND_FEATURES)}
_BOND_KIND = {
    Chem.BondType.SINGLE: 0,
    Chem.BondType.DOUBLE: 1,
    Chem.BondType.TRIPLE: 2,
    Chem.BondType.AROMATIC: 3,
}


@dataclass(frozen=True)
class MoleculeArrays:
    """What the environment model sees of one molecule, or of several joined."""

    atoms: np.ndarray
    """(n_atoms, n_atom_features) float32."""
    edges: np.ndarray
    """(n_edges, n_bond_features) float32; directed, sorted by `target`."""
    source: np.ndarray
    """(n_edges,) int64: the atom a message comes from."""
    target: np.ndarray
    """(n_edges,) int64: the atom a message goes to, ascending."""


@lru_cache(maxsize=1)
def _load_element_table() -> np.ndarray:
    """Return (119, 4) Pauling, Sanderson, Allen, covalent radius in pm by atomic number; nan where the table has none."""
    table = np.full((119, 4), np.nan)
    columns = {"pauling": 0, "sanderson": 1, "allen": 2, "radius_pm": 3}
    with resources.files("shiftpred.features").joinpath("atom_inputs.csv").open(encoding="utf-8") as handle:
        for row in csv.DictReader(handle):
            table[int(row["atomic_number"]), columns[row["property"]]] = float(row["value"])
    # An element outside the table is rare and organometallic as a rule; it gets the value of a typical metal.
    fallback = np.array([1.9, 2.1, 1.8, 135.0])
    return np.where(np.isnan(table), fallback, table)


def build_molecule_arrays(mol: Chem.Mol, electronic: bool = True, stereo: bool = True) -> MoleculeArrays:
    """Turn one molecule into arrays.

    Parameters
    ----------
    mol : rdkit Mol
        Sanitised, hydrogens implicit, stereo assigned.
    electronic, stereo : bool, default True
        False leaves the electronic columns or the stereo relations at zero (for measuring what they bring).

    Returns
    -------
    MoleculeArrays
        Columns as `ATOM_FEATURES` and `BOND_FEATURES` name them.
    """
    n = mol.GetNumAtoms()
    atoms = np.zeros((n, N_ATOM_FEATURES), dtype=np.float32)
    number = np.empty(n, dtype=np.int64)
    hydrogens = np.empty(n, dtype=np.int64)
    hybrid = np.empty(n, dtype=np.int64)
    o_h, o_n, o_sp = _OFFSET["hydrogens_0"], _OFFSET["neighbours_0"], _OFFSET["sp"]
    o_pos, o_aromatic, o_centre = _OFFSET["positive"], _OFFSET["aromatic"], _OFFSET["stereocentre"]
    any_centre = False
    for i in range(n):  # by index: iterating over GetAtoms() costs several times as much
        atom = mol.GetAtomWithIdx(i)
        z, h = atom.GetAtomicNum(), atom.GetTotalNumHs()
        number[i], hydrogens[i] = z, h
        row = atoms[i]
        row[_ELEMENT_COLUMN.get(z, len(_ELEMENTS))] = 1
        row[o_h + min(h, 4)] = 1
        row[o_n + min(atom.GetDegree(), 4)] = 1
        k = _HYBRIDS.get(atom.GetHybridization(), 3)
        hybrid[i] = k
        row[o_sp + k] = 1
        charge = atom.GetFormalCharge()
        if charge:
            row[o_pos if charge > 0 else o_pos + 1] = abs(charge)
        if atom.GetIsAromatic():
            row[o_aromatic] = 1
        if atom.GetChiralTag():
            row[o_centre] = 1
            any_centre = True
    rings = mol.GetRingInfo().AtomRings()
    ring_column = _OFFSET["ring_3"]
    for ring in rings:
        column = ring_column + min(len(ring), 8) - 3
        for i in ring:
            atoms[i, column] = 1
    if rings:
        count = np.bincount(np.concatenate(rings), minlength=n)
        for k in range(3):
            atoms[:, _OFFSET["rings_1"] + k] = count > k
    source, target, edges = _build_bonds(mol, n, rings)
    conjugated = edges[:, _BOND_OFFSET["conjugated"]] > 0
    atoms[target[conjugated], _OFFSET["conjugated"]] = 1
    if electronic:
        electronegativity = _fill_electronic(mol, atoms, number, hydrogens, hybrid, source, target)
        edges[:, _BOND_OFFSET["electronegativity_difference"]] = electronegativity[source] - electronegativity[target]
    if stereo:
        source, target, edges = _add_stereo(mol, source, target, edges, any_centre, rings)
    order = np.argsort(target, kind="stable")
    return MoleculeArrays(atoms, edges[order], source[order], target[order])


_ELEMENT_COLUMN = {z: i for i, z in enumerate(_ELEMENTS)}


def _build_bonds(mol, n, rings):
    m = mol.GetNumBonds()
    begin, end = np.empty(m, dtype=np.int64), np.empty(m, dtype=np.int64)
    rows = np.zeros((m, N_BOND_FEATURES), dtype=np.float32)
    o_conjugated, o_ring = _BOND_OFFSET["conjugated"], _BOND_OFFSET["ring_3"]
    for k in range(m):
        bond = mol.GetBondWithIdx(k)
        begin[k], end[k] = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        row = rows[k]
        row[_BOND_KIND.get(bond.GetBondType(), 4)] = 1
        if bond.GetIsConjugated():
            row[o_conjugated] = 1
    for bonds in mol.GetRingInfo().BondRings():
        column = o_ring + min(len(bonds), 8) - 3
        for k in bonds:
            rows[k, column] = 1
    return np.concatenate([begin, end]), np.concatenate([end, begin]), np.concatenate([rows, rows])


def _fill_electronic(mol, atoms, number, hydrogens, hybrid, source, target):
    """Fill the electronic columns; return the hybrid electronegativity of every atom, (n_atoms,), Pauling units."""
    table = _load_element_table()[np.minimum(number, 118)]
    n = len(number)
    pauling = table[:, 0]
    s_character = np.array(_S_CHARACTER)[hybrid]
    hybrid_value = pauling * (1 + _HYBRID_SLOPE * (s_character - 0.25))
    columns = np.empty((n, len(ELECTRONIC_FEATURES)), dtype=np.float64)
    columns[:, 0] = pauling - 2.55
    columns[:, 1] = hybrid_value - 2.55
    columns[:, 2] = table[:, 1] - 2.75
    columns[:, 3] = table[:, 2] - 2.54
    columns[:, 4] = (table[:, 3] - 73.0) / 30.0
    # Electronegativity equalisation over one, two and three shells: the harmonic mean of an atom, its hydrogens and its
    # neighbours' present values (Bratsch, J. Chem. Educ. 1985, 62, 101), so that each atom learns what its groups pull.
    reciprocal = 1.0 / hybrid_value
    degree = np.bincount(target, minlength=n)
    current = reciprocal
    for shell in range(3):
        heard = np.bincount(target, weights=current[source], minlength=n)
        current = (reciprocal + heard + hydrogens / 2.20) / (1 + degree + hydrogens)
        columns[:, 5 + shell] = 4.0 * (1.0 / current - 2.45)
    rdPartialCharges.ComputeGasteigerCharges(mol)
    charge = np.empty(n)
    on_hydrogens = np.empty(n)
    for i in range(n):
        atom = mol.GetAtomWithIdx(i)
        charge[i] = atom.GetDoubleProp("_GasteigerCharge")
        on_hydrogens[i] = atom.GetDoubleProp("_GasteigerHCharge")
    # Without parameters (metals) the charges come back as nan; zero then means "not known".
    charge = np.clip(np.nan_to_num(charge, posinf=0, neginf=0), -2, 2)
    on_hydrogens = np.clip(np.nan_to_num(on_hydrogens, posinf=0, neginf=0), -2, 2)
    columns[:, 8] = 4.0 * charge
    columns[:, 9] = 4.0 * (charge + on_hydrogens)
    # Through-space form of the inductive effect: sum of (chi - 2.55) R²/r² over all other atoms, r from the path length
    # (after Cherkasov, Galkin & Cherkasov, Russ. Chem. Rev. 1996, 65, 641, doi 10.1070/RC1996v065n08ABEH000227).
    distance = Chem.GetDistanceMatrix(mol)
    path = np.minimum(distance, len(_PATH_DISTANCE) - 1).astype(np.int64)
    pull = (hybrid_value - 2.55) * (table[:, 3] / 100.0) ** 2
    weight = (1.0 / _PATH_DISTANCE**2)[path]
    weight[distance > 100] = 0.0  # another component
    columns[:, 10] = 4.0 * (weight @ pull)
    columns[:, 11] = 4.0 * ((weight * (path <= 2)) @ pull)
    atoms[:, _FIRST_ELECTRONIC:] = np.clip(columns, -8, 8)
    return hybrid_value


def _add_stereo(mol, source, target, edges, any_centre, rings):
    """Mark bonds between like and unlike stereocentres, and append one edge for each stereo relation."""
    begin, end, kind, like = compute_stereo_edges(mol, any_centre, rings)
    m = len(source) // 2
    for k, sign in like.items():
        column = _BOND_OFFSET["like_centres" if sign > 0 else "unlike_centres"]
        edges[k, column] = edges[k + m, column] = 1
    if not begin:
        return source, target, edges
    extra = np.zeros((2 * len(begin), N_BOND_FEATURES), dtype=np.float32)
    column = _BOND_OFFSET[f"stereo_{STEREO_RELATIONS[0]}"] + np.array(kind + kind)
    extra[np.arange(len(extra)), column] = 1
    return (
        np.concatenate([source, begin, end]),
        np.concatenate([target, end, begin]),
        np.concatenate([edges, extra]),
    )


def join_molecule_arrays(parts: list[MoleculeArrays]) -> tuple[MoleculeArrays, np.ndarray]:
    """Join several molecules into one disconnected graph.

    Returns
    -------
    joined : MoleculeArrays
    offsets : ndarray of shape (n_molecules + 1,)
        First atom of each molecule in the joined arrays.
    """
    offsets = np.concatenate([[0], np.cumsum([len(p.atoms) for p in parts])])
    return (
        MoleculeArrays(
            np.concatenate([p.atoms for p in parts]),
            np.concatenate([p.edges for p in parts]),
            np.concatenate([p.source + o for p, o in zip(parts, offsets)]),
            np.concatenate([p.target + o for p, o in zip(parts, offsets)]),
        ),
        offsets,
    )
