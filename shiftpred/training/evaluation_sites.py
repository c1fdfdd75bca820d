"""Predictions and peaks of many compounds → one row for each site whose peak is known, beside what the baselines say of it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace

import numpy as np
import pandas as pd

from shiftpred.bundles import ModelBundle
from shiftpred.features.molecule_arrays import build_molecule_arrays
from shiftpred.pipeline import iterate_predictions
from shiftpred.records import MoleculePrediction
from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.structures.reading import parse_structure
from shiftpred.training.assign_open_peaks import PeakPlacer
from shiftpred.training.open_tables import Compound
from shiftpred.training.predict_graphs import predict_shifts
from shiftpred.training.progress import show_progress

__all__ = [
    "CAP_PPM",
    "SiteTable",
    "collect_sites",
    "compare_geminal_hydrogens",
    "count_pair_agreement",
    "place_training_peaks",
    "predict_compounds",
]

CAP_PPM = (40.0, 4.0)
"""What a peak without any prediction costs in an error, 13C and 1H; the same as the cap of the assignment."""
_NUCLEI = ("13C", "1H")
_BATCH = 64


class SiteTable:
    """Per-atom arrays of one compound's prediction.

    Attributes
    ----------
    shift, half, degrees : ndarray of shape (n_atoms, 2)
        13C and 1H: shift, half width of the interval (ppm; of a CH2's two hydrogens their mean); nan: not predicted.
    gap : ndarray of shape (n_atoms,)
        Half the distance of the two hydrogens of a CH2 that differ, ppm; nan: they do not, or there are not two.
    environment, note : list of two lists of str
    labile : ndarray of shape (n_atoms,), bool
    """

    def __init__(self, prediction: MoleculePrediction, n_atoms: int):
        self.shift, self.half = np.full((n_atoms, 2), np.nan), np.full((n_atoms, 2), np.nan)
        self.gap, self.labile = np.full(n_atoms, np.nan), np.zeros(n_atoms, dtype=bool)
        self.environment = [[""] * n_atoms, [""] * n_atoms]
        self.note = [[""] * n_atoms, [""] * n_atoms]
        first: dict[int, float] = {}
        for row in prediction.nuclei:
            i, k = row.atom - 1, _NUCLEI.index(row.nucleus)
            half = (row.upper_ppm - row.lower_ppm) / 2
            if row.hydrogen == "b" and i in first:
                self.gap[i] = abs(first[i] - row.shift_ppm) / 2
                self.shift[i, k] = (first[i] + row.shift_ppm) / 2
                self.half[i, k] = (self.half[i, k] + half) / 2
            else:
                first[i] = row.shift_ppm if k == 1 else first.get(i, np.nan)
                self.shift[i, k], self.half[i, k] = row.shift_ppm, half
            self.environment[k][i], self.note[k][i] = row.environment, row.note
            self.labile[i] |= row.labile


def predict_compounds(compounds: Iterable[Compound], bundle: ModelBundle, coverage: float) -> list[SiteTable]:
    """Predict compounds exactly as a user's call would (solvent not stated)."""
    compounds = list(compounds)
    structures = (parse_structure(c.mol, name=str(c.key)) for c in compounds)
    predictions = iterate_predictions(structures, "both", None, coverage, bundle)
    return [SiteTable(p, c.mol.GetNumAtoms()) for c, p in zip(compounds, show_progress(predictions, "predict", len(compounds)))]


def place_training_peaks(compounds: list[Compound], model: EnvironmentModel) -> list[np.ndarray]:
    """Assign the peaks of training compounds with the model: (n_atoms, 2) observed 13C and 1H on atoms, nan where none."""
    out = []
    for begin in show_progress(range(0, len(compounds), _BATCH), "assign training peaks"):
        batch = compounds[begin : begin + _BATCH]
        for compound, values in zip(batch, predict_shifts([build_molecule_arrays(c.mol) for c in batch], model)):
            placer = PeakPlacer(compound)
            out.append(placer.place_observed(placer.assign(values)))
    return out


def collect_sites(
    compounds: list[Compound],
    tables: list[SiteTable],
    baselines: Mapping[str, list[np.ndarray]],
    hydrogen_counts: bool = True,
) -> tuple[pd.DataFrame, dict[str, pd.DataFrame]]:
    """Assign every compound's peaks with the model and list the sites.

    Parameters
    ----------
    compounds : list of Compound
    tables : list of SiteTable
        Predictions of the same compounds.
    baselines : mapping of str to list of ndarray of shape (n_atoms, 2)
        Name → 13C and 1H of each compound; nan: the baseline has no value.
    hydrogen_counts : bool, default True
        False ignores the hydrogen counts that the peak table states.

    Returns
    -------
    sites : DataFrame
        One row for each atom and nucleus with a known peak: compound, molecule, atom (0-based), nucleus, element,
        environment, note, labile, observed, predicted, half, certain (by hydrogen count and C-H pair alone), the elements of
        the molecule, and one column for each baseline. Each atom of an equivalent set has a row of its own.
    own : dict of str to DataFrame
        For each baseline that has a value for every site of its own: nucleus, element, error (ppm) after an assignment with the
        baseline's own values.
    """
    rows: list[tuple] = []
    own_rows: dict[str, list[tuple]] = {name: [] for name in baselines}
    for number, (compound, table) in enumerate(zip(show_progress(compounds, "assign", len(compounds)), tables)):
        placer = PeakPlacer(compound, hydrogen_counts)
        placed = placer.place_observed(placer.assign(table.shift))
        known = ~np.isnan(placed)
        if not known.any():
            continue
        certain = ~np.isnan(placer.place_observed(placer.assign_unambiguous()))
        symbols = [a.GetSymbol() for a in compound.mol.GetAtoms()]
        elements = " ".join(sorted(set(symbols)))
        values = [baselines[name][number] for name in baselines]
        for i, k in zip(*np.nonzero(known)):
            rows.append(
                (
                    compound.key,
                    number,
                    i,
                    _NUCLEI[k],
                    symbols[i],
                    table.environment[k][i],
                    table.note[k][i],
                    table.labile[i],
                    placed[i, k],
                    table.shift[i, k],
                    table.half[i, k],
                    certain[i, k],
                    elements,
                    *(v[i, k] for v in values),
                )
            )
        for name, v in zip(baselines, values):
            by_own = placer.place_observed(placer.assign(v))
            error = np.where(np.isnan(v), CAP_PPM, np.minimum(np.abs(by_own - v), 1e6))
            for i, k in zip(*np.nonzero(~np.isnan(by_own))):
                own_rows[name].append((_NUCLEI[k], symbols[i], error[i, k]))
    columns = "compound molecule atom nucleus element environment note labile observed predicted half certain elements".split()
    own = {name: pd.DataFrame(r, columns=["nucleus", "element", "error"]) for name, r in own_rows.items()}
    return pd.DataFrame(rows, columns=columns + list(baselines)), own


def count_pair_agreement(compounds: list[Compound], tables: list[SiteTable]) -> dict:
    """Hide which 13C and which 1H peak belong together, assign both lists on their own, and count how often they meet.

    Returns
    -------
    dict
        'pairs': C-H pairs in all; 'same_atom': share whose 13C and 1H peak land on one atom or on equivalent ones;
        'open_pairs', 'open_same_atom': the same for pairs whose carbon the hydrogen counts alone do not settle; 'by_chance':
        what a random choice among the carbons with as many hydrogens would reach on all pairs.
    """
    total = same = open_total = open_same = 0
    chance = 0.0
    for compound, table in zip(show_progress(compounds, "pairs", len(compounds)), tables):
        has_c, has_h = ~np.isnan(compound.c13), ~np.isnan(compound.h1)
        if not (has_c & has_h).any():
            continue
        hydrogens = np.array([a.GetTotalNumHs() if a.GetAtomicNum() == 6 else -1 for a in compound.mol.GetAtoms()])
        carbon_side = PeakPlacer(_keep(compound, has_c, h1=False))
        hydrogen_side = PeakPlacer(_keep(compound, has_h, h1=True))
        on_carbon, on_hydrogen, settled = (np.full(len(has_c), -1) for _ in range(3))
        on_carbon[has_c] = carbon_side.assign(table.shift)
        on_hydrogen[has_h] = hydrogen_side.assign(table.shift)
        settled[has_c] = carbon_side.assign_unambiguous()
        group = carbon_side.group
        for k in np.flatnonzero((on_carbon >= 0) & (on_hydrogen >= 0)):
            meets = bool(group[on_carbon[k]] == group[on_hydrogen[k]])
            total, same = total + 1, same + meets
            chance += 1 / len(set(group[hydrogens == hydrogens[on_carbon[k]]]))
            if settled[k] < 0:
                open_total, open_same = open_total + 1, open_same + meets
    return dict(
        pairs=total,
        same_atom=_share(same, total),
        open_pairs=open_total,
        open_same_atom=_share(open_same, open_total),
        by_chance=_share(chance, total),
    )


def compare_geminal_hydrogens(compounds: list[Compound], tables: list[SiteTable]) -> dict:
    """Compare the two hydrogens of CH2 groups for which a spectrum lists two values.

    Returns
    -------
    dict
        'groups': CH2 with two values; 'said_to_differ': share for which the prediction has rows a and b; of those,
        'mean_gap_ppm', 'gap_error_ppm' and 'coverage' of the single hydrogens.
    """
    total, differ, gaps, errors, inside = 0, 0, [], [], []
    for compound, table in zip(compounds, tables):
        site_gap = np.full(len(compound.c13), np.nan)
        for _, values in compound.samples:
            site_gap = np.where(np.isnan(site_gap), values[:, 2], site_gap)
        if np.isnan(site_gap).all():
            continue
        placer = PeakPlacer(compound)
        placed = placer.place(np.stack([compound.h1, site_gap], axis=1), placer.assign(table.shift))
        for i in np.flatnonzero(~np.isnan(placed).any(axis=1)):
            centre, gap = placed[i]
            total += 1
            if np.isnan(table.gap[i]):
                continue
            differ += 1
            gaps.append(2 * gap)
            errors.append(2 * abs(gap - table.gap[i]))
            for sign in (1, -1):
                off = centre + sign * gap - (table.shift[i, 1] + sign * table.gap[i])
                inside.append(abs(off) <= table.half[i, 1])
    return dict(
        groups=total,
        said_to_differ=_share(differ, total),
        mean_gap_ppm=round(float(np.mean(gaps)), 4) if gaps else None,
        gap_error_ppm=round(float(np.mean(errors)), 4) if gaps else None,
        coverage=_share(sum(inside), len(inside)),
    )


def _share(part: float, whole: int) -> float | None:
    return round(part / whole, 4) if whole else None


def _keep(compound: Compound, which: np.ndarray, h1: bool) -> Compound:
    """Return the compound with one nucleus' peaks alone; hydrogen counts come with 13C peaks."""
    nothing = np.full(int(which.sum()), np.nan)
    return replace(
        compound,
        c13=nothing if h1 else compound.c13[which],
        h1=compound.h1[which] if h1 else nothing,
        attached_h=np.full(len(nothing), -1) if h1 else compound.attached_h[which],
        labels=compound.labels[which],
        samples=[],
    )

