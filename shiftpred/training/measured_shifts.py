"""The measured shifts with their true atoms: how far predictions are off when no assignment of ours can flatter them."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import pandas as pd
from rdkit import Chem

from shiftpred.bundles import ModelBundle
from shiftpred.bundles.locations import find_datasets
from shiftpred.errors import SettingError
from shiftpred.features.solvents import SOLVENTS
from shiftpred.pipeline import predict_structures
from shiftpred.structures.reading import parse_structure
from shiftpred.training.evaluation_statistics import compute_coverage_figures, compute_error_figures
from shiftpred.training.open_tables import connectivity

__all__ = ["compare_with_measured", "load_measured_connectivities", "load_measured_shifts"]

_WORST = 10
_REFERENCE_SOLVENT = "CDCl3"
_COLUMNS = ("name", "smiles", "atom_index", "nucleus", "solvent", "shift_ppm", "source", "verified", "note")


@lru_cache(maxsize=1)
def load_measured_shifts() -> pd.DataFrame:
    """Read `datasets/measured_shifts`.

    Returns
    -------
    DataFrame
        One row a measured shift; columns as its card describes them, blank where nothing is known.

    Raises
    ------
    SettingError
        If the table is missing or lacks a column.
    """
    path = find_datasets() / "measured_shifts" / "assigned_shifts.csv"
    if not path.exists():
        raise SettingError(str(path), "no such file", "the measured shifts shipped with shiftpred", "reinstall shiftpred")
    table = pd.read_csv(path, keep_default_na=False)
    missing = [c for c in _COLUMNS if c not in table]
    if missing:
        raise SettingError(
            str(path), f"no column {', '.join(missing)}", ", ".join(_COLUMNS), "restore the file as it was shipped"
        )
    return table


@lru_cache(maxsize=1)
def load_measured_connectivities() -> frozenset[str]:
    """Return the connectivities of the measured compounds, which no model may be trained on."""
    return frozenset(connectivity(Chem.MolFromSmiles(s)) for s in load_measured_shifts().smiles.unique())


def compare_with_measured(bundle: ModelBundle, coverage: float = 0.9) -> dict:
    """Predict every measured shift in its own solvent and compare.

    Parameters
    ----------
    bundle : ModelBundle
    coverage : float, default 0.9

    Returns
    -------
    dict
        'nuclei': errors and coverage for 13C, 1H on carbon and exchangeable 1H; 'without_suspects': the errors without
        the rows whose note suspects a misprint; 'by_solvent'; 'worst': the ten worst atoms of each nucleus, each in
        its worst solvent; 'solvent_differences': published and predicted change from CDCl3 to another solvent.
    """
    table = _predict_rows(load_measured_shifts().copy(), bundle, coverage)
    table["error"] = table.shift_ppm - table.predicted
    table["kind"] = np.where(table.nucleus == "13C", "13C", np.where(table.on_carbon, "1H on carbon", "1H exchangeable"))
    table["suspect"] = table.note.str.contains("suspect|misprint| vs ", regex=True)
    nuclei, by_solvent = {}, {}
    for kind, rows in table.groupby("kind"):
        by_solvent[kind] = {s: compute_error_figures(r.error) for s, r in rows.groupby("solvent")}
        molecule = rows.smiles.to_numpy()
        nuclei[kind] = compute_error_figures(rows.error) | compute_coverage_figures(
            rows.error.to_numpy(), rows.half.to_numpy(), molecule, coverage
        )
    return dict(
        rows=len(table),
        compounds=int(table.smiles.nunique()),
        from_memory=int((table.verified == "memory").sum()),
        nuclei=nuclei,
        without_suspects={k: compute_error_figures(r.error) for k, r in table[~table.suspect].groupby("kind")},
        by_solvent=by_solvent,
        worst={kind: _list_worst(rows) for kind, rows in table.groupby("kind")},
        solvent_differences=_compare_solvents(table),
    )


def _predict_rows(table: pd.DataFrame, bundle: ModelBundle, coverage: float) -> pd.DataFrame:
    table["predicted"], table["half"], table["environment"], table["on_carbon"] = np.nan, np.nan, "", True
    structures = {s: parse_structure(Chem.MolFromSmiles(s), name=s) for s in table.smiles.unique()}
    for solvent, rows in table.groupby("solvent"):
        names = list(rows.smiles.unique())
        known = solvent if solvent in SOLVENTS else None
        predictions = predict_structures([structures[s] for s in names], "both", known, coverage, bundle)
        found: dict[tuple[str, int, str], list] = {}
        for name, prediction in zip(names, predictions):
            for nucleus in prediction.nuclei:
                found.setdefault((name, nucleus.atom - 1, nucleus.nucleus), []).append(nucleus)
        for index, row in rows.iterrows():
            # The two hydrogens of a CH2 are one row in the published tables: their mean.
            values = found[row.smiles, int(row.atom_index), row.nucleus]
            table.at[index, "predicted"] = float(np.mean([v.shift_ppm for v in values]))
            table.at[index, "half"] = float(np.mean([v.upper_ppm - v.lower_ppm for v in values])) / 2
            table.at[index, "environment"] = values[0].environment
            table.at[index, "on_carbon"] = not values[0].labile
    return table


def _list_worst(rows: pd.DataFrame) -> list[dict]:
    ordered = rows.reindex(rows.error.abs().sort_values(ascending=False).index)
    # Once for each atom, in the solvent where it is worst: else one compound in seven solvents would fill the list.
    worst = ordered.drop_duplicates(["smiles", "atom_index"])[:_WORST]
    return [
        dict(
            name=r["name"],
            smiles=r.smiles,
            atom_index=int(r.atom_index),
            solvent=r.solvent,
            observed_ppm=float(r.shift_ppm),
            predicted_ppm=round(r.predicted, 3),
            error_ppm=round(r.error, 3),
            inside=bool(abs(r.error) <= r.half),
            source=r.source,
            verified=r.verified,
            note=r.note,
        )
        for _, r in worst.iterrows()
    ]


def _compare_solvents(table: pd.DataFrame) -> dict:
    """Compare the change from CDCl3 to each other solvent, where one source gives both, with what is predicted."""
    key = ["smiles", "atom_index", "nucleus", "source"]
    names = {"shift_ppm": "base_observed", "predicted": "base_predicted"}
    base = table[table.solvent == _REFERENCE_SOLVENT].groupby(key)[list(names)].mean().rename(columns=names)
    other = table[table.solvent.isin(SOLVENTS[1:]) & ~table.solvent.isin((_REFERENCE_SOLVENT, "neat"))]
    pairs = other.join(base, on=key, how="inner")
    pairs = pairs.assign(published=pairs.shift_ppm - pairs.base_observed, computed=pairs.predicted - pairs.base_predicted)
    out = {}
    for kind, rows in pairs.groupby("kind"):
        out[kind] = dict(
            all=_summarise_differences(rows),
            by_solvent={s: _summarise_differences(r) for s, r in rows.groupby("solvent")},
            by_group={e: _summarise_differences(r) for e, r in rows.groupby("environment")},
        )
    return out


def _summarise_differences(rows: pd.DataFrame) -> dict:
    published, computed = rows.published.to_numpy(), rows.computed.to_numpy()
    varied = len(rows) > 2 and published.std() > 0 and computed.std() > 0
    return dict(
        sites=len(rows),
        mean_published=round(float(published.mean()), 4),
        mean_predicted=round(float(computed.mean()), 4),
        error=round(float(np.abs(published - computed).mean()), 4),
        error_without_effect=round(float(np.abs(published).mean()), 4),
        correlation=round(float(np.corrcoef(published, computed)[0, 1]), 3) if varied else None,
    )
