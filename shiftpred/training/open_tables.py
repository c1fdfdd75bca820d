"""Read the two tables that training starts from: compounds (structures) and peaks (without atom numbers)."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
from rdkit import Chem

from shiftpred.errors import InputError
from shiftpred.features.solvents import SOLVENTS
from shiftpred.structures.standardise import standardise_mol

__all__ = ["Compound", "compute_split", "connectivity", "load_open_tables"]

_RANGE = {"13C": (-30.0, 270.0), "1H": (-5.0, 20.0)}


@dataclass
class Compound:
    """One compound of the tables with its peaks by site label.

    A site is known to be one heavy atom; which one is what training has to find out.
    """

    key: int
    smiles: str
    mol: Chem.Mol
    c13: np.ndarray
    """(n_sites,) median 13C shift in ppm over the compound's spectra; nan: none."""
    h1: np.ndarray
    """(n_sites,) mean 1H shift in ppm; nan: none."""
    attached_h: np.ndarray
    """(n_sites,) hydrogens on the carbon as the source states them; -1: not stated."""
    labels: np.ndarray
    """(n_sites,) the source's site labels."""
    samples: list[tuple[int, np.ndarray]]
    """One entry for each solvent: (index into SOLVENTS, (n_sites, 3) 13C, 1H mean, 1H half gap of a CH2; nan: none)."""
    split: str = "train"


def connectivity(mol: Chem.Mol) -> str:
    """Return the canonical SMILES without stereo: what splits are made by."""
    return Chem.MolToSmiles(mol, isomericSmiles=False)


def compute_split(connectivity_smiles: str) -> str:
    """Put a connectivity into 'train' (86 %), 'calibration' (7 %) or 'test' (7 %), the same on every machine."""
    place = int(hashlib.md5(connectivity_smiles.encode()).hexdigest(), 16) % 1000
    return "train" if place < 860 else "calibration" if place < 930 else "test"


def load_open_tables(folder: str | Path, exclude: frozenset[str] = frozenset(), max_atoms: int = 150) -> list[Compound]:
    """Read `compounds.csv[.gz]` and `peaks.csv[.gz]` of a folder.

    Parameters
    ----------
    folder : path
        Holds the two tables: compounds with `compound,smiles`, peaks with
        `compound,spectrum,nucleus,solvent,shift_ppm,attached_h,site` (columns `solvent`, `attached_h` may be blank).
    exclude : set of str
        Connectivities that must not be trained on; they get the split 'excluded'.
    max_atoms : int, default 150
        Larger molecules are left out.

    Returns
    -------
    list of Compound
        In ascending order of their key; compounds without a usable 13C or 1H peak are left out.

    Raises
    ------
    InputError
        If a table or a column is missing.
    """
    folder = Path(folder)
    compounds = _read(folder, "compounds", ("compound", "smiles"))
    peaks = _read(folder, "peaks", ("compound", "nucleus", "shift_ppm", "site"))
    for column, default in (("solvent", ""), ("attached_h", np.nan), ("spectrum", 0)):
        if column not in peaks:
            peaks[column] = default
    peaks = peaks[peaks.nucleus.isin(_RANGE)].copy()
    peaks["solvent"] = peaks.solvent.astype(object).where(peaks.solvent.notna(), "").astype(str)
    keep = np.zeros(len(peaks), dtype=bool)
    for nucleus, (low, high) in _RANGE.items():
        keep |= ((peaks.nucleus == nucleus) & (peaks.shift_ppm > low) & (peaks.shift_ppm < high)).to_numpy()
    peaks = peaks[keep]
    smiles = dict(zip(compounds.compound, compounds.smiles))
    out = []
    for key, group in peaks.groupby("compound", sort=True):
        mol = Chem.MolFromSmiles(smiles.get(key, ""))
        if mol is None or not 0 < mol.GetNumAtoms() <= max_atoms:
            continue
        plain = connectivity(mol)
        try:
            mol = standardise_mol(mol)[0]  # what prediction sees, too
        except Chem.MolSanitizeException:
            continue
        compound = _build_compound(key, smiles[key], mol, group)
        compound.split = "excluded" if plain in exclude else compute_split(plain)
        out.append(compound)
    return out


def _read(folder: Path, name: str, columns: tuple[str, ...]) -> pd.DataFrame:
    for suffix in (".csv.gz", ".csv"):
        path = folder / f"{name}{suffix}"
        if path.exists():
            table = pd.read_csv(path)
            missing = [c for c in columns if c not in table]
            if missing:
                raise InputError(
                    str(path),
                    f"no column {', '.join(missing)}",
                    f"the columns {', '.join(columns)}",
                    "see datasets/open_shift_data/README.md for the table format",
                )
            return table
    raise InputError(
        str(folder),
        f"no file {name}.csv.gz or {name}.csv",
        "a folder with both compounds and peaks",
        "see datasets/open_shift_data/README.md for the table format",
    )


def _build_compound(key, smiles, mol, group) -> Compound:
    labels, place = np.unique(group.site.to_numpy(), return_inverse=True)
    shift, is_c = group.shift_ppm.to_numpy(float), group.nucleus.to_numpy() == "13C"
    solvent, spectrum = group.solvent.to_numpy(), group.spectrum.to_numpy()
    count = pd.to_numeric(group.attached_h, errors="coerce").to_numpy(float)
    n = len(labels)
    attached = np.full(n, -1)
    stated = np.flatnonzero(is_c & ~np.isnan(count))
    attached[place[stated]] = count[stated]
    c13, h1 = _gather(place[is_c], shift[is_c], n, np.median), _gather(place[~is_c], shift[~is_c], n, np.mean)
    names = np.unique(solvent.astype(str))
    samples = []
    for name in names:
        inside = solvent == name
        values = np.full((n, 3), np.nan)
        if len(names) == 1:
            values[:, 0], values[:, 1] = c13, h1
        else:
            values[:, 0] = _gather(place[inside & is_c], shift[inside & is_c], n, np.median)
            values[:, 1] = _gather(place[inside & ~is_c], shift[inside & ~is_c], n, np.mean)
        hydrogens = inside & ~is_c
        for k in np.flatnonzero(np.bincount(place[hydrogens], minlength=n) > 1):
            h = hydrogens & (place == k)
            gaps = [np.ptp(shift[h & (spectrum == s)]) / 2 for s in np.unique(spectrum[h])
                    if (h & (spectrum == s)).sum() == 2]
            if gaps:
                values[k, 2] = np.mean(gaps)
        samples.append((SOLVENTS.index(name) if name in SOLVENTS else SOLVENTS.index("other"), values))
    return Compound(int(key), smiles, mol, c13, h1, attached, labels, samples)


def _gather(place, shift, n, combine):
    """Combine the shifts of each label; nan: none."""
    out = np.full(n, np.nan)
    out[place] = shift
    for k in np.flatnonzero(np.bincount(place, minlength=n) > 1):
        out[k] = combine(shift[place == k])
    return out
