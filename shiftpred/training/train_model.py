"""From two tables to a model folder: `shiftpred train`. One command, resumable, with fixed seeds."""

from __future__ import annotations

import hashlib
import json
import platform
import sys
import time
from collections.abc import Callable
from dataclasses import asdict, replace
from importlib.metadata import version
from pathlib import Path

import numpy as np
from rdkit import Chem
from tqdm import tqdm

from shiftpred.bundles import load_bundle, save_bundle
from shiftpred.bundles.locations import find_datasets
from shiftpred.calibration.novelty import NoveltyTable
from shiftpred.errors import InputError, SettingError
from shiftpred.features.molecule_arrays import join_molecule_arrays
from shiftpred.features.solvents import SOLVENTS
from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.regression.explanation_parts import compute_residual_scale
from shiftpred.training.assign_open_peaks import PeakPlacer
from shiftpred.training.fit_calibration import build_novelty_arrays, fit_calibration
from shiftpred.training.fit_substituent_model import fit_substituent_model, fit_to_peak_lists
from shiftpred.training.network import build_state, export_arrays
from shiftpred.training.open_tables import Compound, connectivity, load_open_tables
from shiftpred.training.train_environment_model import (
    NetworkSettings,
    build_graphs,
    compute_errors,
    is_strange,
    train_environment_model,
)

__all__ = ["build_bundle", "load_measured_connectivities", "predict_with_arrays", "train_model"]

_FEWEST_COMPOUNDS = 50


def train_model(
    tables: str | Path,
    output: str | Path,
    *,
    start_from: str | Path | None = None,
    settings: NetworkSettings | None = None,
    processes: int = 2,
    substituent_compounds: int = 12000,
    report: Callable[[str], None] = print,
) -> dict:
    """Train a model and write its folder.

    Parameters
    ----------
    tables : path
        Folder with `compounds` and `peaks` (see `load_open_tables`).
    output : path
        The model folder; working files lie in its subfolder `working` until the end, and a run that was stopped goes on
        from them.
    start_from : path, optional
        Folder of a trained model to go on from (training on one's own archive on top of it).
    settings : NetworkSettings, optional
    processes : int, default 2
    substituent_compounds : int, default 12000
        Compounds that the substituent model is fitted to.
    report : callable
        Gets one line for each step.

    Returns
    -------
    dict
        Errors on the compounds held out: 'before' (only with `start_from`) and 'after'.
    """
    begun, tables, output = time.time(), Path(tables), Path(output)
    working = output / "working"
    settings = settings or NetworkSettings(**(dict(passes=12, first_passes=0, learning_rate=3e-4) if start_from else {}))
    report(f"reading {tables}")
    compounds = load_open_tables(tables, load_measured_connectivities())
    counts = {s: sum(c.split == s for c in compounds) for s in ("train", "calibration", "test", "excluded")}
    report(f"{len(compounds)} compounds: " + ", ".join(f"{n} {s}" for s, n in counts.items()))
    if counts["train"] < _FEWEST_COMPOUNDS or counts["calibration"] < 5:
        raise InputError(
            str(tables),
            f"{counts['train']} compounds to train on and {counts['calibration']} to calibrate on",
            f"at least {_FEWEST_COMPOUNDS} and 5",
            "add compounds; a small archive is best trained with --start-from",
        )
    starting, before = None, {}
    graphs = build_graphs(compounds, settings)
    held_out = [i for i, c in enumerate(compounds) if c.split == "test"] or [
        i for i, c in enumerate(compounds) if c.split == "calibration"
    ]
    if start_from:
        base = load_bundle(start_from)
        starting = build_state(base.environment_model.arrays)
        settings = replace(settings, **_sizes(base.environment_model.arrays))
        before = _evaluate(compounds, graphs, held_out, base.environment_model.arrays)
        report(f"held out, before: {json.dumps(before)}")
    first = None
    if not start_from:
        report("substituent model, for the first assignment")
        chosen = [i for i, c in enumerate(compounds) if c.split == "train"]
        some = np.random.default_rng(settings.random_seed).permutation(chosen)[:substituent_compounds]
        substituent_model, _ = fit_to_peak_lists([compounds[i] for i in some], log=report)
        first = [_predict_substituents(substituent_model, c.mol) for c in _progress(compounds)]
    network = train_environment_model(compounds, settings, working, processes, report, starting, graphs, first)
    arrays = export_arrays(network)
    after = _evaluate(compounds, graphs, held_out, arrays)
    report(f"held out, after: {json.dumps(after)}")
    log = (working / "rounds.jsonl").read_text(encoding="utf-8")
    origin = dict(
        tables={p.name: hashlib.sha256(p.read_bytes()).hexdigest() for p in sorted(tables.glob("*.csv*"))},
        compounds=counts,
        settings=asdict(settings),
        started_from=str(start_from) if start_from else None,
        versions={p: version(p) for p in ("numpy", "rdkit", "scikit-learn", "torch")} | {"python": platform.python_version()},
        minutes=round((time.time() - begun) / 60, 1),
        held_out=dict(before=before, after=after),
    )
    build_bundle(output, compounds, graphs, arrays, origin, log, substituent_compounds, report)
    report(f"written to {output} after {(time.time() - begun) / 60:.0f} min")
    return dict(before=before, after=after)


def build_bundle(
    output: Path,
    compounds: list[Compound],
    graphs,
    arrays: dict[str, np.ndarray],
    origin: dict,
    log: str,
    substituent_compounds: int = 12000,
    report: Callable[[str], None] = print,
) -> None:
    """Calibrate a trained network, fit the substituent model to its assignments, and write the model folder.

    Parameters
    ----------
    output : path
    compounds : list of Compound
    graphs : list of MoleculeArrays
        Of the compounds.
    arrays : dict of str to ndarray
        The network's weights from `export_arrays`.
    origin : dict
        JSON-ready; `settings.random_seed` is used.
    log : str
        The rounds of assignment, one JSON object a line.
    substituent_compounds : int
        Compounds that the substituent model is fitted to.
    report : callable
    """
    train = [i for i, c in enumerate(compounds) if c.split == "train"]
    calibration = [i for i, c in enumerate(compounds) if c.split == "calibration"]
    predicted = dict(zip(train + calibration, predict_with_arrays(arrays, [graphs[i] for i in train + calibration])))
    report("calibrating intervals")
    novelty_arrays = build_novelty_arrays([graphs[i] for i in train])
    intervals = fit_calibration(
        [compounds[i] for i in calibration],
        [graphs[i] for i in calibration],
        [predicted[i] for i in calibration],
        NoveltyTable(**novelty_arrays),
    )
    report("fitting the substituent model to the network's assignments")
    some = np.random.default_rng(origin["settings"]["random_seed"]).permutation(train)[:substituent_compounds]
    model = fit_substituent_model(
        [compounds[i].mol for i in some],
        [_place(compounds[i], predicted[i]) for i in some],
        solvents=[_only_solvent(compounds[i]) for i in some],
    )
    scale = compute_residual_scale(
        model, [compounds[i].mol for i in calibration], [_mask(compounds[i], predicted[i]) for i in calibration]
    )
    for nucleus, table in scale.items():
        model.set_residual_scale(nucleus, table)
    substituent_arrays, substituent_meta = model.to_arrays()
    set_aside = _list_set_aside([compounds[i] for i in train], [predicted[i] for i in train])
    save_bundle(
        output,
        name=output.name,
        edition=time.strftime("%Y.%m.%d"),
        network_arrays=arrays,
        novelty_arrays=novelty_arrays,
        calibration=dict(intervals=intervals),
        substituent_arrays=substituent_arrays,
        substituent_meta=substituent_meta,
        origin=origin,
        texts={"rounds.jsonl": log, "set_aside.csv": set_aside},
    )


def _predict_substituents(model, mol) -> np.ndarray:
    return np.stack([model.predict(mol, "13C"), model.predict(mol, "1H")], axis=1)


def _only_solvent(compound: Compound) -> str | None:
    """Return the compound's solvent where all its peaks were measured in one that is known."""
    names = {SOLVENTS[k] for k, _ in compound.samples}
    return names.pop() or None if len(names) == 1 else None


def _mask(compound: Compound, predicted: np.ndarray) -> np.ndarray:
    """Return (n_atoms, 2) predicted shifts with nan where the atom has no such nucleus."""
    out = predicted[:, :2].copy()
    for atom in compound.mol.GetAtoms():
        if atom.GetAtomicNum() != 6:
            out[atom.GetIdx(), 0] = np.nan
        if atom.GetTotalNumHs() == 0:
            out[atom.GetIdx(), 1] = np.nan
    return out


def _progress(items):
    return tqdm(items, desc="first assignment", leave=False, disable=not sys.stderr.isatty())


def load_measured_connectivities() -> frozenset[str]:
    """Return the connectivities of the measured shifts that models are checked against; they are never trained on."""
    path = find_datasets() / "measured_shifts" / "assigned_shifts.csv"
    if not path.exists():
        raise SettingError(str(path), "no such file", "the reference shifts shipped with shiftpred", "reinstall shiftpred")
    import pandas as pd

    smiles = pd.read_csv(path).smiles.unique()
    return frozenset(connectivity(Chem.MolFromSmiles(s)) for s in smiles)


def predict_with_arrays(arrays: dict[str, np.ndarray], graphs, solvent: int = 0, batch: int = 64) -> list[np.ndarray]:
    """Predict as the shipped model does: (n_atoms, 5) 13C, 1H, half gap, raw scales of 13C and 1H for every graph, ppm."""
    model, out = EnvironmentModel(arrays), []
    for begin in tqdm(range(0, len(graphs), batch), desc="predict", leave=False, disable=not sys.stderr.isatty()):
        joined, offsets = join_molecule_arrays(graphs[begin : begin + batch])
        values, scales, inner = model.predict_raw(joined)
        if solvent:
            values[:, :2] += model.predict_solvent_effect(inner, solvent)
        out += np.split(np.concatenate([values, scales], axis=1).astype(float), offsets[1:-1])
    return out


def _evaluate(compounds: list[Compound], graphs, which, arrays) -> dict:
    cases = []
    for i, values in zip(which, predict_with_arrays(arrays, [graphs[i] for i in which])):
        placer = PeakPlacer(compounds[i])
        cases.append((placer, compounds[i], placer.assign(values[:, :2]), values))
    return {**compute_errors(cases), "compounds": len(which)}


def _place(compound: Compound, predicted: np.ndarray) -> np.ndarray:
    placer = PeakPlacer(compound)
    return placer.place(np.stack([compound.c13, compound.h1], axis=1), placer.assign(predicted[:, :2]))


def _list_set_aside(compounds: list[Compound], predicted: list[np.ndarray]) -> str:
    """List training compounds whose peaks fit far worse than the rest: probably wrong spectra or structures."""
    lines = ["compound,mean_13C_error_ppm,smiles"]
    for compound, values in zip(compounds, predicted):
        if is_strange(compound, PeakPlacer(compound).assign(values[:, :2]), values):
            error = np.abs(_place(compound, values)[:, 0] - values[:, 0])
            mean = "" if np.isnan(error).all() else f"{np.nanmean(error):.2f}"
            lines.append(f"{compound.key},{mean},{compound.smiles}")
    return "\n".join(lines) + "\n"


def _sizes(arrays) -> dict[str, int]:
    message, hidden = arrays["layers.0.update_heard.weight"].shape
    layers = 1 + max(int(k.split(".")[1]) for k in arrays if k.startswith("layers."))
    return dict(width=arrays["embed.weight"].shape[1], layers=layers, message=message, hidden=hidden)
