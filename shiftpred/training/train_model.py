"""From two tables to a model folder: `shiftpred train`. One command, resumable, with fixed seeds."""

from __future__ import annotations

import hashlib
import json
import platform
import time
from collections.abc import Callable
from dataclasses import asdict, replace
from importlib.metadata import version
from pathlib import Path

import numpy as np

from shiftpred.bundles import load_bundle, save_bundle
from shiftpred.errors import InputError
from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.training.assemble_model import (
    build_calibration,
    build_memory,
    build_substituents,
    compute_held_out_errors,
    place_peaks,
    render_set_aside,
)
from shiftpred.training.fit_substituent_model import fit_to_peak_lists
from shiftpred.training.measured_shifts import load_measured_connectivities
from shiftpred.training.network import build_state, export_arrays
from shiftpred.training.open_tables import load_open_tables
from shiftpred.training.predict_graphs import predict_graphs
from shiftpred.training.progress import show_progress
from shiftpred.training.train_environment_model import (
    NetworkSettings,
    build_graphs,
    count_finished_passes,
    train_environment_model,
)

__all__ = ["train_model"]

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
        Compounds that the first assignment's substituent model is fitted to.
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
    graphs = build_graphs(compounds, settings)
    train, calibration, test = ([i for i, c in enumerate(compounds) if c.split == s] for s in ("train", "calibration", "test"))
    held_out = test or calibration

    def choose(which):
        return [compounds[i] for i in which], [graphs[i] for i in which]

    base, starting, first, before = None, None, None, {}
    if start_from:
        base = load_bundle(start_from)
        starting = build_state(base.environment_model.arrays)
        settings = replace(settings, **_sizes(base.environment_model.arrays))
        before = compute_held_out_errors(*choose(held_out), base.environment_model, base.memory)
        report(f"held out, before: {json.dumps(before)}")
    elif count_finished_passes(working, settings) < settings.first_passes:
        report("substituent model, for the first assignment")
        some = np.random.default_rng(settings.random_seed).permutation(train)[:substituent_compounds]
        first_model, _ = fit_to_peak_lists([compounds[i] for i in some], log=report)
        first = [_predict_substituents(first_model, c.mol) for c in show_progress(compounds, "first assignment")]
    fitting = time.time()
    trained = train_environment_model(compounds, settings, working, processes, report, starting, graphs, first)
    log = (working / "rounds.jsonl").read_text(encoding="utf-8")
    # A run that was stopped has spent time before, which its log knows.
    elsewhere = sum(json.loads(line)["seconds"] for line in log.splitlines()) - (time.time() - fitting)
    arrays = _round_weights(export_arrays(trained))
    network = EnvironmentModel(arrays)
    report("memory of measured surroundings")
    train_compounds, train_graphs = choose(train)
    predicted = predict_graphs(train_graphs, network)
    placed = place_peaks(train_compounds, predicted, settings.label_order)
    memory = build_memory(train_graphs, predicted, placed, base)
    alone = compute_held_out_errors(*choose(held_out), network)
    after = compute_held_out_errors(*choose(held_out), network, memory)
    report(f"held out, network alone: {json.dumps(alone)}")
    report(f"held out, after: {json.dumps(after)}")
    report("intervals")
    fitted, novelty_arrays = build_calibration(*choose(calibration), network, memory, train_graphs, base)
    if base:
        substituents = base.substituent_model
    else:
        report("substituent model, from the network's assignments")
        held_compounds, held_graphs = choose(calibration)
        held_predicted = predict_graphs(held_graphs, network, memory)
        substituents = build_substituents(train_compounds, placed, held_compounds, held_predicted)
    substituent_arrays, substituent_meta = substituents.to_arrays()
    origin = dict(
        tables={p.name: hashlib.sha256(p.read_bytes()).hexdigest() for p in sorted(tables.glob("*.csv*"))},
        compounds=counts,
        settings=asdict(settings),
        started_from=base.edition if base else None,
        versions={p: version(p) for p in ("numpy", "rdkit", "scikit-learn", "torch")} | {"python": platform.python_version()},
        minutes=round((time.time() - begun + elsewhere) / 60, 1),
        held_out=dict(before=before, network_alone=alone, after=after),
    )
    save_bundle(
        output,
        name=output.name,
        edition=time.strftime("%Y.%m.%d"),
        network_arrays=arrays,
        novelty_arrays=novelty_arrays,
        memory_arrays=memory.arrays,
        calibration=fitted | (dict(judgement=base.judgement) if base and base.judgement else {}),
        substituent_arrays=substituent_arrays,
        substituent_meta=substituent_meta,
        origin=origin,
        texts={
            "rounds.jsonl": log,
            "set_aside.csv": render_set_aside(train_compounds, predicted, placed),
        },
    )
    report(f"written to {output} after {(time.time() - begun) / 60:.0f} min")
    return dict(before=before, after=after)


def _predict_substituents(model, mol) -> np.ndarray:
    return np.stack([model.predict(mol, "13C"), model.predict(mol, "1H")], axis=1)


def _round_weights(arrays: dict[str, np.ndarray]) -> dict[str, np.ndarray]:
    """Return the weights as a model folder keeps them, so that what is measured here is what is shipped."""
    return {name: values.astype(np.float16).astype(np.float32) for name, values in arrays.items()}


def _sizes(arrays) -> dict[str, int]:
    message, hidden = arrays["layers.0.update_heard.weight"].shape
    layers = 1 + max(int(k.split(".")[1]) for k in arrays if k.startswith("layers."))
    return dict(width=arrays["embed.weight"].shape[1], layers=layers, message=message, hidden=hidden)
