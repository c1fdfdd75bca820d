"""One site of a molecule as one named row: what it is, and the summed constants of its substituents by position.

Columns, in order (`FEATURE_NAMES`): the site's own description (`SITE_FEATURES`), then for each position alpha, beta,
gamma, ortho, meta, para the number of substituents, the sum of each constant (`CONSTANTS`) over them, and how many of
them lack a constant. On an aromatic six-ring alpha holds the ipso substituent and the two ring neighbours; ortho, meta
and para hold only substituents of the ring, whose own atoms count as alpha, beta and gamma.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from math import isnan

import numpy as np
from rdkit import Chem

from shiftpred.errors import NotApplicable
from shiftpred.substituents.group_codes import GroupCodes, compute_group_codes
from shiftpred.substituents.model_groups import build_model_group
from shiftpred.substituents.positions import POSITIONS, Place, compute_places

__all__ = [
    "CONSTANTS",
    "CONSTANT_LEVEL",
    "FEATURE_NAMES",
    "REACH",
    "SITE_FEATURES",
    "SiteRow",
    "compute_constants",
    "compute_regressors",
    "compute_site_class",
    "compute_site_row",
    "compute_site_rows",
    "render_site_class",
    "compute_counted_places",
]

CONSTANTS = (
    "chi_attached",
    "chi_hybrid",
    "chi_group",
    "charge_attached",
    "sigma_i",
    "sigma_star",
    "sigma_r",
    "size",
)
"""Constants of a group, see `shiftpred.electronics`; the three electronegativities count from hydrogen's 2.20."""

CONSTANT_LEVEL = 2
"""Level of the group code whose short group gives the constants (out to gamma of the group)."""

REACH = 4
"""Bonds from the site to the farthest substituent that counts (para)."""

SITE_FEATURES = (
    "atomic_number",
    "attached_h",
    "formal_charge",
    "is_sp3",
    "is_sp2",
    "is_sp",
    "is_aromatic",
    "aromatic_rings",
    "ring_size",
)

FEATURE_NAMES = SITE_FEATURES + tuple(
    f"{position}_{name}" for position in POSITIONS for name in ("count", *CONSTANTS, "undefined")
)
"""`beta_sigma_i`: sum of sigma_I over the beta substituents; `beta_undefined`: how many of them lack a constant."""

_CHI_HYDROGEN = 2.20
"""Pauling's reference (Allred 1961, doi 10.1016/0022-1902(61)80142-5, doi from memory)."""
_N_CHI = 3
_UNDEFINED = (float("nan"),) * len(CONSTANTS)
_HYBRID_DIGIT = {"sp3": "3", "sp2": "2", "sp": "1", "s": "0"}
_RING = {0: "", 3: "r3", 4: "r4", 5: "r5", 6: "r6", 7: "r7"}
_TABLE = Chem.GetPeriodicTable()


@dataclass(frozen=True)
class SiteRow:
    """One site as a named row."""

    atom_index: int
    """0-based."""
    site_class: str
    """Short class: element with charge (lower case if aromatic), hybridisation, hydrogens, ring; 'C3H2r5'."""
    coarse_class: str
    """Element and hybridisation alone; 'C3'."""
    values: np.ndarray
    """(n_features,) in the order of `FEATURE_NAMES`."""

    @property
    def feature_names(self) -> tuple[str, ...]:
        return FEATURE_NAMES

    def as_dict(self) -> dict[str, float]:
        """Return the row as name → value."""
        return dict(zip(FEATURE_NAMES, self.values.tolist(), strict=True))


def compute_site_class(codes: GroupCodes, atom_index: int) -> tuple[str, str]:
    """Return the class of a site, fine and coarse.

    Parameters
    ----------
    codes : GroupCodes
    atom_index : int
        0-based.

    Returns
    -------
    (str, str)
        ('C3H2r5', 'C3') for a CH2 in cyclopentane; 'f' marks a fusion atom of aromatic rings ('c2H0r6f').
    """
    atom = codes.atoms[atom_index]
    coarse = atom + _HYBRID_DIGIT.get(codes.hybrids[atom_index], "x")
    fused = "f" if codes.aromatic_rings[atom_index] > 1 else ""
    return f"{coarse}H{codes.hydrogens[atom_index]}{_RING.get(codes.rings[atom_index], 'r8')}{fused}", coarse


def render_site_class(codes: GroupCodes, atom_index: int) -> str:
    """Return the class of a site in words: 'sp3 CH2 in a ring of 5', 'aromatic CH'."""
    symbol, hydrogens = codes.atoms[atom_index], codes.hydrogens[atom_index]
    element = symbol.rstrip("+-")
    aromatic = element[0].islower()
    count = "" if not hydrogens else "H" if hydrogens == 1 else f"H{hydrogens}"
    kind = "aromatic" if aromatic else codes.hybrids[atom_index] if codes.hybrids[atom_index] != "other" else ""
    words = f"{kind} {element.capitalize()}{count}{symbol[len(element) :]}".strip()
    size = codes.rings[atom_index]
    if codes.aromatic_rings[atom_index] > 1:
        return f"{words} at a fusion"
    return f"{words} in a ring of {size}" if size and not (aromatic and size == 6) else words


@lru_cache(maxsize=200_000)
def compute_constants(code: str) -> tuple[float, ...]:
    """Return the electronic constants of the group that a level-2 code stands for.

    Parameters
    ----------
    code : str
        Level-2 code, see `shiftpred.substituents.group_codes`.

    Returns
    -------
    tuple of float
        In the order of `CONSTANTS`, electronegativities on Pauling's scale as they are; nan where one is not defined
        (charged groups, metals).
    """
    from shiftpred.electronics import group_vector

    group = build_model_group(code)
    if group is None:
        return _UNDEFINED
    try:
        vector = group_vector(group)
    except NotApplicable:
        return _UNDEFINED
    return tuple(float(getattr(vector, name)) for name in CONSTANTS)


@lru_cache(maxsize=200_000)
def compute_regressors(code: str) -> tuple[float, ...]:
    """Return the constants of a group as they enter sums: electronegativities from hydrogen's, undefined ones as 0."""
    shifted = (v - _CHI_HYDROGEN if k < _N_CHI else v for k, v in enumerate(compute_constants(code)))
    return tuple(0.0 if isnan(v) else v for v in shifted)


def compute_counted_places(codes: GroupCodes, atom_index: int, ranks: Sequence[int] | None = None) -> list[Place]:
    """List the substituents that count: alpha, beta, gamma, ortho, meta, para (see `compute_places`)."""
    reach = REACH if codes.six_rings[atom_index] else REACH - 1
    return [p for p in compute_places(codes, atom_index, reach, ranks) if p.distance < REACH or p.position == "para"]


def compute_site_row(mol: Chem.Mol, atom_index: int, codes: GroupCodes | None = None) -> SiteRow:
    """Describe one site as one named row.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised, hydrogens implicit.
    atom_index : int
        0-based index of the site.
    codes : GroupCodes or None, default None
        From `compute_group_codes(mol)`, if at hand.

    Returns
    -------
    SiteRow
    """
    codes = codes or compute_group_codes(mol)
    site_class, coarse = compute_site_class(codes, atom_index)
    symbol = codes.atoms[atom_index]
    element = symbol.rstrip("+-")
    hybrid = codes.hybrids[atom_index]
    values = np.zeros(len(FEATURE_NAMES))
    values[: len(SITE_FEATURES)] = (
        _TABLE.GetAtomicNumber(element.capitalize()),
        codes.hydrogens[atom_index],
        (len(symbol) - len(element)) * (-1 if symbol.endswith("-") else 1),
        hybrid == "sp3",
        hybrid == "sp2",
        hybrid == "sp",
        element[0].islower(),
        codes.aromatic_rings[atom_index],
        codes.rings[atom_index],
    )
    width = len(CONSTANTS) + 2
    for place in compute_counted_places(codes, atom_index):
        code = codes.levels[CONSTANT_LEVEL][place.parent][place.atom]
        start = len(SITE_FEATURES) + POSITIONS.index(place.position) * width
        values[start] += 1
        values[start + 1 : start + width - 1] += compute_regressors(code)
        values[start + width - 1] += any(isnan(v) for v in compute_constants(code))
    return SiteRow(atom_index, site_class, coarse, values)


def compute_site_rows(mol: Chem.Mol) -> list[SiteRow]:
    """Describe every heavy atom of a molecule; see `compute_site_row`.

    Returns
    -------
    list of SiteRow
        (n_atoms,) in the order of the atoms.
    """
    codes = compute_group_codes(mol)
    return [compute_site_row(mol, i, codes) for i in range(codes.n_atoms)]
