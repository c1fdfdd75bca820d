"""The substituent model: a base for the class of the site plus one contribution for every substituent.

Contributions add up exactly, and each is the sum of two parts. The first comes from the group's electronic constants,
with coefficients that belong to the site's coarse class and the position (linear free-energy thinking). The second is
an increment that was learned for the group itself, as published additivity rules have one for each group and position,
from the general to the special: the attached atom, then the group out to beta, gamma and delta. Each step is shrunk
towards zero, so that a rare group leans on its constants and its more general relatives. Prediction needs numpy only.

What counts as zero. Every CH2 has two alpha substituents, so data alone cannot tell its base from what they contribute.
For reading, contributions are therefore given relative to hydrogen, and multiple and aromatic bonds relative to ethene's
=CH2, ethyne's CH and benzene's ring CH: the base of an sp3 carbon is methane's shift (that of an sp2 carbon ethene's),
corrected for its ring, as in the rules of Shoolery and of Grant and Paul. The sum is the same either way.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from rdkit import Chem

from shiftpred.errors import BundleError, SettingError, quote
from shiftpred.features.site_rows import (
    CONSTANT_LEVEL,
    CONSTANTS,
    compute_constants,
    compute_counted_places,
    compute_regressors,
    compute_site_class,
    render_site_class,
)
from shiftpred.records import NUCLEI
from shiftpred.substituents.group_codes import GroupCodes, compute_group_codes
from shiftpred.substituents.group_smiles import build_bare_molecule
from shiftpred.substituents.positions import POSITIONS, Place
from shiftpred.substituents.split import compute_ranks_from, split_substituents

__all__ = [
    "NucleusTable",
    "Part",
    "SubstituentModel",
    "compute_base_terms",
    "compute_place_terms",
    "compute_solvent_term",
]

FORMAT = 1
"""Number of the array format that `to_arrays` writes."""

BASE_PENALTIES = (0.0, 0.0, 1.0, 3.0)
"""Shrinkage of coarse class, fine class and the alpha atoms taken together (their elements; then with what they carry),
in halvings of the squared scale."""
PLACE_PENALTIES = {
    "alpha": (0.0, 1.0, 2.0, 3.0, 1.0, 2.0, 3.0, 4.0),
    "beta": (0.0, 1.0, 1.0, 2.0),
    "far": (0.0, 1.0),
}
"""Likewise for a substituent: levels 0 to 3 at alpha, 0 and 1 further out; coarse class first, then the fine one."""
SOLVENT_PENALTY = 1.0

ZERO_SHIFT = {"13C": {"C3": -2.3, "C2": 123.3}, "1H": {"C3": 0.23, "C2": 5.25}}
"""Base of a site without substituents, ppm. 13C: methane as Grant and Paul, J. Am. Chem. Soc. 1964, 86, 2984 have it,
ethene as in the alkene rule; 1H: Shoolery 1959, and the olefin rule of Pascual, Meier and Simon 1966. All four verified by
transcription. They fix only where the zero of the contributions lies; no predicted shift depends on them."""

_REFERENCE = {"=": "C=C", "#": "C#C", ":": "c1ccccc1"}
_POSITION_NUMBER = {position: k for k, position in enumerate(POSITIONS)}


@dataclass(frozen=True)
class Part:
    """One line of a decomposition; like `shiftpred.records.Contribution`, with 0-based atoms."""

    label: str
    kind: str
    """'base', 'substituent' or 'solvent'."""
    position: str
    """'alpha', 'beta', 'gamma'; '' for the base and for a para substituent (its label says para)."""
    group: str
    atoms: tuple[int, ...]
    """0-based indices."""
    constants: dict[str, float]
    contribution_ppm: float


@dataclass(frozen=True)
class NucleusTable:
    """What was learned for one nucleus."""

    intercept: float
    """ppm."""
    increments: Mapping[str, float]
    """Term → increment in ppm; a term that is not there counts as 0."""
    classes: tuple[str, ...]
    """(n_classes,) coarse classes that have coefficients."""
    coefficients: np.ndarray
    """(n_classes, n_positions, n_constants) ppm per unit of the constant."""
    residual_scale: Mapping[str, float] = field(default_factory=dict)
    """Coarse class → 95th percentile of |total - substituent model| in ppm; '' holds the value for all others. Empty:
    not known, and no remainder is called large."""

    def __post_init__(self):
        expected = (len(self.classes), len(POSITIONS), len(CONSTANTS))
        if self.coefficients.shape != expected:
            raise ValueError(f"coefficients of shape {self.coefficients.shape}, expected {expected}")


def compute_base_terms(codes: GroupCodes, atom_index: int) -> tuple[str, str, list[str]]:
    """Return fine class, coarse class and the base terms of a site (in the order of `BASE_PENALTIES`)."""
    fine, coarse = compute_site_class(codes, atom_index)
    elements = "".join(sorted(codes.levels[0][atom_index].values()))
    carrying = "".join(sorted(codes.levels[1][atom_index].values()))
    return fine, coarse, [coarse, fine, f"{fine}&{elements}", f"{fine}&&{carrying}"]


def compute_place_terms(codes: GroupCodes, fine: str, coarse: str, place: Place) -> list[str]:
    """Return the increment terms of one substituent (in the order of its `PLACE_PENALTIES`)."""
    parent, atom = place.parent, place.atom
    levels = codes.levels
    if place.distance == 1:
        groups = [levels[0][parent][atom], levels[1][parent][atom], levels[2][parent][atom], levels[3][parent][atom]]
        return [f"{coarse}|alpha|{group}" for group in groups] + [f"{fine}|alpha|{group}" for group in groups]
    tail = f"|{place.position}{place.path}|"
    general, special = tail + levels[0][parent][atom], tail + levels[1][parent][atom]
    if place.distance == 2:
        return [coarse + general, coarse + special, fine + general, fine + special]
    return [coarse + general, coarse + special]


def compute_place_penalties(place: Place) -> tuple[float, ...]:
    """Return the penalties of a substituent's terms."""
    return PLACE_PENALTIES[{1: "alpha", 2: "beta"}.get(place.distance, "far")]


def compute_solvent_term(coarse: str, solvent: str) -> str:
    """Return the term of a solvent for a class of sites."""
    return f"{coarse}~{solvent}"


class SubstituentModel:
    """Shift = base(class of the site) + sum of contribution(substituent, position) [+ solvent].

    Parameters
    ----------
    tables : mapping of str to NucleusTable
        '13C' and '1H'.
    description : dict, default {}
        What the model was trained on and how (numbers and texts only).
    """

    def __init__(self, tables: Mapping[str, NucleusTable], description: dict | None = None):
        self.tables = dict(tables)
        self.description = dict(description or {})
        self._class_numbers = {
            nucleus: {name: k for k, name in enumerate(table.classes)} for nucleus, table in self.tables.items()
        }

    def predict(self, mol: Chem.Mol, nucleus: str, solvent: str | None = None, codes: GroupCodes | None = None):
        """Predict the shift of every site of one molecule.

        Parameters
        ----------
        mol : rdkit.Chem.Mol
            Sanitised, hydrogens implicit.
        nucleus : {'13C', '1H'}
        solvent : str or None, default None
            Short name; ignored where the model has no term for it.
        codes : GroupCodes or None, default None
            From `compute_group_codes(mol)`, if at hand.

        Returns
        -------
        ndarray of shape (n_atoms,)
            ppm; nan where there is no such nucleus (a heteroatom for 13C, an atom without hydrogen for 1H).

        Raises
        ------
        SettingError
            If the nucleus is unknown.
        """
        table = self._require_table(nucleus)
        codes = codes or compute_group_codes(mol)
        increment = table.increments.get
        numbers = self._class_numbers[nucleus]
        out = np.full(codes.n_atoms, np.nan)
        sites, slots, rows = [], [], []
        for i in range(codes.n_atoms):
            if not _has_nucleus(codes, i, nucleus):
                continue
            fine, coarse, base = compute_base_terms(codes, i)
            total = table.intercept
            for term in base:
                total += increment(term, 0.0)
            number = numbers.get(coarse, -1)
            for place in compute_counted_places(codes, i):
                for term in compute_place_terms(codes, fine, coarse, place):
                    total += increment(term, 0.0)
                if number >= 0:
                    sites.append(i)
                    slots.append((number, _POSITION_NUMBER[place.position]))
                    rows.append(compute_regressors(codes.levels[CONSTANT_LEVEL][place.parent][place.atom]))
            if solvent:
                total += increment(compute_solvent_term(coarse, solvent), 0.0)
            out[i] = total
        if rows:
            slots = np.array(slots)
            ppm = np.einsum("ij,ij->i", table.coefficients[slots[:, 0], slots[:, 1]], np.array(rows))
            out += np.bincount(sites, weights=ppm, minlength=codes.n_atoms)
        return out

    def contributions(self, mol: Chem.Mol, atom_index: int, nucleus: str, solvent: str | None = None) -> tuple[Part, ...]:
        """Decompose the predicted shift of one site.

        Returns
        -------
        tuple of Part
            Base first, then every substituent at alpha, beta, gamma (and para), then the solvent; they add up to what
            `predict` gives.

        Raises
        ------
        SettingError
            If the nucleus is unknown or the atom does not bear it.
        """
        table = self._require_table(nucleus)
        codes = compute_group_codes(mol)
        if not _has_nucleus(codes, atom_index, nucleus):
            what = "a carbon" if nucleus == "13C" else "an atom that bears hydrogen"
            raise SettingError(
                "argument 'atom_index'",
                f"{codes.atoms[atom_index]} with {codes.hydrogens[atom_index]} hydrogens for nucleus {nucleus}",
                what,
                "the other nucleus, or another atom",
            )
        fine, coarse, base = compute_base_terms(codes, atom_index)
        increment = table.increments.get
        base_ppm, offsets = self._choose_zero(codes, atom_index, nucleus, fine, coarse)
        parts = [Part(f"base: {render_site_class(codes, atom_index)}", "base", "", "", (), {}, base_ppm)]
        together = increment(base[2], 0.0) + increment(base[3], 0.0)
        if together:
            names = ", ".join(sorted(codes.atoms[v].capitalize() for v in codes.neighbours[atom_index]))
            parts.append(Part(f"base: {names} on one atom", "base", "", "", (), {}, together))
        ranks = compute_ranks_from(build_bare_molecule(mol), atom_index)
        places = {place.atom: place for place in compute_counted_places(codes, atom_index, ranks)}
        for group in split_substituents(mol, atom_index, codes):
            place = places[group.attached_atom]
            ppm = self._compute_contribution(codes, nucleus, fine, coarse, place)
            if place.distance == 1:
                ppm -= offsets.get(codes.levels[0][atom_index][place.atom][0], 0.0)
            code = codes.levels[CONSTANT_LEVEL][place.parent][place.atom]
            values = dict(zip(CONSTANTS, compute_constants(code), strict=True))
            parts.append(
                Part(
                    f"{group.ring_position or group.position} {group.name}",
                    "substituent",
                    "" if group.position == "delta" else group.position,
                    group.group,
                    group.atoms,
                    {name: value for name, value in values.items() if not np.isnan(value)},
                    ppm,
                )
            )
        if solvent:
            ppm = increment(compute_solvent_term(coarse, solvent), 0.0)
            parts.append(Part(f"solvent {solvent}", "solvent", "", "", (), {}, ppm))
        return tuple(parts)

    def _compute_contribution(self, codes: GroupCodes, nucleus: str, fine: str, coarse: str, place: Place) -> float:
        table = self.tables[nucleus]
        ppm = sum(table.increments.get(term, 0.0) for term in compute_place_terms(codes, fine, coarse, place))
        number = self._class_numbers[nucleus].get(coarse, -1)
        if number >= 0:
            code = codes.levels[CONSTANT_LEVEL][place.parent][place.atom]
            coefficients = table.coefficients[number, _POSITION_NUMBER[place.position]]
            ppm += float(coefficients @ np.array(compute_regressors(code)))
        return ppm

    def _choose_zero(self, codes, atom_index, nucleus, fine, coarse) -> tuple[float, dict[str, float]]:
        """Return the base in ppm and what to subtract from an alpha contribution by the kind of its bond."""
        table = self.tables[nucleus]

        def base_of(fine_class: str, marks: list[str]) -> float:
            learned = table.increments.get(coarse, 0.0) + table.increments.get(fine_class, 0.0)
            return table.intercept + learned + sum(offsets.get(mark, 0.0) for mark in marks)

        offsets = {}
        marks = [code[0] for code in codes.levels[0][atom_index].values()]
        for mark in set(marks) & set(_REFERENCE):
            reference = compute_group_codes(Chem.MolFromSmiles(_REFERENCE[mark]))
            (place,) = [p for p in compute_counted_places(reference, 0) if p.atom == 1]
            offsets[mark] = self._compute_contribution(reference, nucleus, fine, coarse, place)
        base = base_of(fine, marks)
        singles = sum(mark in "-_" for mark in marks)
        zero = ZERO_SHIFT[nucleus].get(coarse)
        if zero is None or not singles:
            return base, offsets
        open_chain = fine.split("r")[0]
        plain = base_of(open_chain, marks) if open_chain in table.increments else base
        offsets["-"] = offsets["_"] = -(plain - zero) / singles
        return base - (plain - zero), offsets

    def set_residual_scale(self, nucleus: str, scale: Mapping[str, float]) -> None:
        """Store how large the remainder of a full model usually is.

        Parameters
        ----------
        nucleus : {'13C', '1H'}
        scale : mapping of str to float
            Coarse class → 95th percentile of |total - substituent model| in ppm; '' for all other classes. Made by
            `shiftpred.regression.explanation_parts.compute_residual_scale`.
        """
        table = self._require_table(nucleus)
        self.tables[nucleus] = NucleusTable(table.intercept, table.increments, table.classes, table.coefficients, dict(scale))

    def to_arrays(self) -> tuple[dict[str, np.ndarray], dict]:
        """Return the model as plain arrays and a dictionary that JSON can hold.

        Returns
        -------
        arrays : dict of str to ndarray
            Texts are UTF-8 bytes, one line a term; nothing in here needs pickling.
        meta : dict
        """
        arrays = {}
        meta = {
            "format": FORMAT,
            "constants": list(CONSTANTS),
            "positions": list(POSITIONS),
            "nuclei": {},
            "description": self.description,
        }
        for nucleus, table in self.tables.items():
            terms = sorted(table.increments)
            arrays[f"{nucleus}_terms"] = np.frombuffer("\n".join(terms).encode(), dtype=np.uint8)
            arrays[f"{nucleus}_increments"] = np.array([table.increments[t] for t in terms], dtype=np.float32)
            arrays[f"{nucleus}_coefficients"] = table.coefficients.astype(np.float64)
            meta["nuclei"][nucleus] = {
                "intercept": float(table.intercept),
                "classes": list(table.classes),
                "residual_scale": {name: float(value) for name, value in table.residual_scale.items()},
            }
        return arrays, meta

    @classmethod
    def from_arrays(cls, arrays: Mapping[str, np.ndarray], meta: dict) -> SubstituentModel:
        """Rebuild a model from what `to_arrays` gave.

        Raises
        ------
        BundleError
            If format, constants, positions or lengths do not fit this version.
        """
        here = {"format": FORMAT, "constants": list(CONSTANTS), "positions": list(POSITIONS)}
        for name, expected in here.items():
            if meta.get(name) != expected:
                raise BundleError(
                    f"substituent model, '{name}'", quote(meta.get(name)), quote(expected), "train the model anew"
                )
        tables = {}
        for nucleus, entry in meta["nuclei"].items():
            text = np.asarray(arrays[f"{nucleus}_terms"], dtype=np.uint8).tobytes().decode()
            terms = text.split("\n") if text else []
            values = arrays[f"{nucleus}_increments"].astype(np.float64).tolist()
            if len(terms) != len(values):
                raise BundleError(
                    f"substituent model, {nucleus}",
                    f"{len(terms)} terms and {len(values)} increments",
                    "as many of one as of the other",
                    "restore the model folder from its source",
                )
            tables[nucleus] = NucleusTable(
                entry["intercept"],
                dict(zip(terms, values, strict=True)),
                tuple(entry["classes"]),
                np.asarray(arrays[f"{nucleus}_coefficients"], dtype=np.float64),
                entry["residual_scale"],
            )
        return cls(tables, meta.get("description"))

    def _require_table(self, nucleus: str) -> NucleusTable:
        if nucleus not in self.tables:
            raise SettingError("argument 'nucleus'", quote(nucleus), f"one of {', '.join(map(repr, NUCLEI))}", "nucleus='13C'")
        return self.tables[nucleus]


def _has_nucleus(codes: GroupCodes, atom_index: int, nucleus: str) -> bool:
    if nucleus == "1H":
        return codes.hydrogens[atom_index] > 0
    return codes.atoms[atom_index].rstrip("+-") in ("C", "c")
