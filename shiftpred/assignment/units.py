"""From predicted rows to units: one unit for each set of equivalent nuclei, which gives one line (or is missing)."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from rdkit import Chem

from shiftpred.assignment.couplings import ExpectedCoupling, compute_expected_couplings
from shiftpred.assignment.fast_exchange import find_exchanging_atoms
from shiftpred.assignment.missing_chances import compute_carbon_chance, compute_hydrogen_chance
from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.records import MoleculePrediction, NucleusPrediction

__all__ = ["Units", "build_units"]

_DEUTERIUM_SHIFT_PPM = -0.3
"""Isotope shift of a carbon for each deuterium on it (from memory)."""
_GEMINAL_TOGETHER = 0.5
_DIASTEREOTOPIC_TOGETHER = 0.45
_EXCHANGING_TOGETHER = 0.85
"""Chance that two groups which need not give one line do so all the same (common practice, no source)."""

_DIASTEREOTOPIC_GAP_PPM = {"13C": 0.6, "1H": 0.05}
_ROTAMER_GAP_PPM = {"13C": 2.5, "1H": 0.06}
"""Half the usual distance of the lines of two groups that are alike but for stereo, or of the two groups on an amide's nitrogen:
a prediction gives both their mean (from memory: N,N-dimethylformamide 36.5 and 31.4, N-formylpiperidine 46.6 and 40.4,
N,N-dimethylacetamide 38.0 and 35.0)."""


@dataclass(frozen=True)
class Units:
    """The nuclei of one kind in one structure, by sets of equivalent ones; n units."""

    nucleus: str
    mol: Chem.Mol
    rows: tuple[NucleusPrediction, ...]
    """(n,) the predicted row that stands for the unit."""
    atoms: tuple[tuple[int, ...], ...]
    """(n,) 0-based atom indices of the unit."""
    count: np.ndarray
    """(n,) number of carbons or hydrogens."""
    attached_h: np.ndarray
    """(n,) hydrogens on each carbon; for 1H on the bearing atom."""
    shift: np.ndarray
    """(n,) predicted, ppm."""
    scale: np.ndarray
    """(n,) scale of the Student t error distribution, ppm."""
    degrees: np.ndarray
    """(n,) its degrees of freedom."""
    labile: np.ndarray
    """(n,) bool."""
    missing: np.ndarray
    """(n,) chance that the line is not in the list."""
    missing_note: tuple[str, ...]
    """(n,) why; '' for no special reason."""
    together: np.ndarray
    """(n,) chance that the unit shares its partner's line for reasons of symmetry (0: no partner)."""
    partner: np.ndarray
    """(n,) index of that partner, -1: none."""
    couplings: tuple[tuple[ExpectedCoupling, ...], ...]
    """(n,) splitting by F and P; 13C only."""
    neighbours: np.ndarray
    """(n,) 1H: hydrogens on the neighbouring carbons (first-order multiplicity less one); -1: not predictable."""

    def __len__(self) -> int:
        return len(self.rows)


def build_units(prediction: MoleculePrediction, nucleus: str) -> Units:
    """Gather the predicted rows of one nucleus into units.

    Parameters
    ----------
    prediction : MoleculePrediction
    nucleus : {'13C', '1H'}

    Returns
    -------
    Units
    """
    mol, sites, parameters = prediction.structure.mol, prediction.sites, PARAMETERS[nucleus]
    couplings = compute_expected_couplings(mol) if nucleus == "13C" else {}
    rows, place = [], {}
    for row in prediction.nuclei:
        if row.nucleus == nucleus:
            key = (sites[row.atom_index].equivalent, row.hydrogen)
            if key not in place:
                place[key] = len(rows)
                rows.append(row)
    n = len(rows)
    count, labile = np.ones(n), np.zeros(n, dtype=bool)
    missing, notes = np.zeros(n), []
    together, partner, scale = np.zeros(n), np.full(n, -1), np.zeros(n)
    neighbours, shift = np.full(n, -1), np.array([r.shift_ppm for r in rows], dtype=float)
    for k, row in enumerate(rows):
        site = sites[row.atom_index]
        if nucleus == "13C":
            count[k] = len(site.equivalent)
            missing[k], note = compute_carbon_chance(mol, site)
            shift[k] += _DEUTERIUM_SHIFT_PPM * site.deuterium
        else:
            count[k] = len(site.equivalent) * (1 if row.hydrogen else row.attached_h)
            labile[k] = row.labile
            missing[k], note = compute_hydrogen_chance(mol, site, prediction.solvent)
            neighbours[k] = _count_vicinal(mol, sites, row)
        notes.append(note)
        partner[k], together[k] = _find_partner(rows, place, sites, k)
        gap = _find_gap(mol, site, nucleus, row.hydrogen)
        scale[k] = math.hypot(row.scale_ppm, gap, parameters.common_scale_ppm)
    for atoms in find_exchanging_atoms(mol):
        _average_exchanging(rows, atoms, shift, together, partner, notes)
    return Units(
        nucleus=nucleus,
        mol=mol,
        rows=tuple(rows),
        atoms=tuple(sites[r.atom_index].equivalent for r in rows),
        count=count,
        attached_h=np.array([r.attached_h for r in rows], dtype=int),
        shift=shift,
        scale=scale,
        degrees=np.array([r.degrees_of_freedom for r in rows], dtype=float),
        labile=labile,
        missing=missing,
        missing_note=tuple(notes),
        together=together,
        partner=partner,
        couplings=tuple(couplings.get(r.atom_index, ()) for r in rows),
        neighbours=neighbours,
    )


def _find_partner(rows, place, sites, k):
    """Return (index, chance) of an earlier unit whose line this one may share because both are alike but for stereo."""
    row = rows[k]
    site = sites[row.atom_index]
    if row.hydrogen == "b":
        first = place.get((site.equivalent, "a"), -1)
        if 0 <= first < k:
            return first, _GEMINAL_TOGETHER
    for other in site.diastereotopic:
        first = place.get((sites[other].equivalent, row.hydrogen), -1)
        if 0 <= first < k:
            return first, _DIASTEREOTOPIC_TOGETHER
    return -1, 0.0


def _find_gap(mol, site, nucleus, hydrogen) -> float:
    """Return by how much the lines of a group with a diastereotopic twin spread around the common prediction, ppm."""
    if not site.diastereotopic or hydrogen:
        return 0.0
    for neighbour in mol.GetAtomWithIdx(site.atom_index).GetNeighbors():
        if neighbour.GetAtomicNum() == 7 and any(
            b.GetIsConjugated() and b.GetOtherAtom(neighbour).GetAtomicNum() == 6 for b in neighbour.GetBonds()
        ):
            return _ROTAMER_GAP_PPM[nucleus]
    return _DIASTEREOTOPIC_GAP_PPM[nucleus]


def _average_exchanging(rows, atoms, shift, together, partner, notes):
    """Give units that exchange quickly their common mean and let them share one line."""
    members = [k for k, row in enumerate(rows) if row.atom_index in atoms]
    if len(members) < 2:
        return
    shift[members] = shift[members].mean()
    for k in members[1:]:
        partner[k], together[k] = members[0], _EXCHANGING_TOGETHER
        notes[k] = notes[k] or "fast N-H exchange: one line with its partner"


def _count_vicinal(mol, sites, row):
    """Count the hydrogens that split a line to first order; -1 where that is not predictable (rings, a/b rows, labile)."""
    if row.hydrogen or row.labile:
        return -1
    atom = mol.GetAtomWithIdx(row.atom_index)
    if atom.GetAtomicNum() != 6:
        return -1
    total = 0
    for neighbour in atom.GetNeighbors():
        site = sites[neighbour.GetIdx()]
        if site.labile:
            if neighbour.GetAtomicNum() == 7:
                return -1  # coupling with N-H is seen in some solvents only
            continue
        if site.attached_h and neighbour.GetAtomicNum() in (9, 15):
            return -1
        if neighbour.GetAtomicNum() in (9, 15):
            return -1
        total += site.attached_h
    if atom.IsInRing() and not atom.GetIsAromatic():
        return -1
    return total
