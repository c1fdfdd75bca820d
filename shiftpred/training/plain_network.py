"""A plain message-passing network for comparison: elements, hydrogens, charges and bond types alone.

What does it bring to give the network electronic constants, hybridisation, rings, conjugation and stereo, and to make it wide
and deep? This one has none of them: 128 wide, 4 layers, one-hot atoms and bonds, the optimal assignment redone in every
pass. It is trained on the same compounds with the same loss by the same trainer, so that nothing else differs.

    python -m shiftpred.training.plain_network TABLES FOLDER --passes 24 --processes 2

writes FOLDER/plain_network.npz, which `shiftpred evaluate --plain-network` reads, and FOLDER/figures.json with its errors on
the compounds held out. A run that was stopped goes on from FOLDER/checkpoint.pt.
"""

from __future__ import annotations

import argparse
import json
import time
from collections.abc import Callable, Iterable
from dataclasses import asdict, replace
from pathlib import Path

import numpy as np
from rdkit import Chem

from shiftpred.errors import BundleError
from shiftpred.features.molecule_arrays import ATOM_FEATURES, BOND_FEATURES, MoleculeArrays, build_molecule_arrays
from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.reporting.saving import save_text
from shiftpred.training.measured_shifts import load_measured_connectivities
from shiftpred.training.open_tables import load_open_tables
from shiftpred.training.predict_graphs import predict_shifts
from shiftpred.training.progress import show_progress

__all__ = ["build_plain_arrays", "load_plain_network", "predict_plain", "train_plain_network"]

PASSES = 24
FILE = "plain_network.npz"
_KEPT_ATOMS = np.array([n.startswith(("element_", "hydrogens_")) or n in ("positive", "negative") for n in ATOM_FEATURES])
_KEPT_BONDS = np.array([name in ("single", "double", "triple", "aromatic", "other_order") for name in BOND_FEATURES])


def build_plain_arrays(mol: Chem.Mol) -> MoleculeArrays:
    """Turn a molecule into arrays in which only elements, hydrogens, charges and bond types are filled in.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised, hydrogens implicit.

    Returns
    -------
    MoleculeArrays
        All other columns are zero; there are no stereo relations.
    """
    full = build_molecule_arrays(mol, electronic=False, stereo=False)
    return replace(full, atoms=full.atoms * _KEPT_ATOMS, edges=full.edges * _KEPT_BONDS)


def load_plain_network(path: str | Path) -> EnvironmentModel:
    """Read `plain_network.npz`.

    Raises
    ------
    BundleError
        If the file is missing or holds anything but plain arrays.
    """
    try:
        with np.load(path, allow_pickle=False) as archive:
            return EnvironmentModel({name: archive[name] for name in archive.files})
    except (OSError, ValueError, KeyError) as error:
        raise BundleError(
            str(path),
            f"no readable network ({error})",
            f"a {FILE} as this module writes it",
            "python -m shiftpred.training.plain_network TABLES FOLDER",
        ) from None


def predict_plain(model: EnvironmentModel, mols: Iterable[Chem.Mol]) -> list[np.ndarray]:
    """Predict with the plain network.

    Returns
    -------
    list of ndarray of shape (n_atoms, 2)
        13C and 1H in ppm.
    """
    mols = list(mols)
    return predict_shifts([build_plain_arrays(m) for m in show_progress(mols, "plain network", len(mols))], model)


def train_plain_network(
    tables: str | Path,
    folder: str | Path,
    passes: int = PASSES,
    processes: int = 2,
    report: Callable[[str], None] = print,
) -> dict:
    """Train the plain network and measure it on the compounds held out.

    Parameters
    ----------
    tables : path
        Folder with `compounds` and `peaks`.
    folder : path
        Receives `plain_network.npz`, `figures.json`, `rounds.jsonl` and the working file `checkpoint.pt`.
    passes : int, default 24
        Passes over the data, each with a new assignment of all peaks; the first one learns from unambiguous peaks alone.
    processes : int, default 2
    report : callable
        Gets one line for each pass.

    Returns
    -------
    dict
        'calibration' and 'test': mean and median errors after the network's own best assignment, ppm (1H on carbon).
    """
    from shiftpred.training.assign_open_peaks import PeakPlacer
    from shiftpred.training.network import export_arrays
    from shiftpred.training.train_environment_model import NetworkSettings, compute_errors, train_environment_model

    begun, folder = time.time(), Path(folder)
    settings = NetworkSettings(
        width=128,
        layers=4,
        message=128,
        hidden=128,
        passes=passes,
        first_passes=1,
        label_order=0.0,
        cleaning=False,
        electronic=False,
        stereo=False,
    )
    compounds = load_open_tables(tables, load_measured_connectivities())
    graphs = [build_plain_arrays(c.mol) for c in show_progress(compounds, "molecules to arrays", len(compounds))]
    network = train_environment_model(compounds, settings, folder, processes, report, graphs=graphs)
    arrays = export_arrays(network)
    np.savez_compressed(folder / FILE, **arrays)
    model, figures = EnvironmentModel(arrays), {}
    for split in ("calibration", "test"):
        chosen = [i for i, c in enumerate(compounds) if c.split == split]
        cases = []
        for i, values in zip(chosen, predict_shifts([graphs[i] for i in chosen], model)):
            placer = PeakPlacer(compounds[i])
            cases.append((placer, compounds[i], placer.assign(values), values))
        if cases:
            figures[split] = compute_errors(cases) | dict(compounds=len(cases))
    parameters = int(sum(a.size for a in arrays.values()))
    text = dict(settings=asdict(settings), parameters=parameters, minutes=round((time.time() - begun) / 60, 1), **figures)
    save_text(folder / "figures.json", json.dumps(text, indent=1) + "\n")
    report(json.dumps(figures))
    return figures


def main() -> None:
    """Read the command line."""
    parser = argparse.ArgumentParser(prog="python -m shiftpred.training.plain_network", description=__doc__.split("\n")[0])
    parser.add_argument("tables", help="folder with compounds and peaks")
    parser.add_argument("folder", help="where to write")
    parser.add_argument("--passes", type=int, default=PASSES)
    parser.add_argument("--processes", type=int, default=2)
    given = parser.parse_args()
    train_plain_network(given.tables, given.folder, given.passes, given.processes)


if __name__ == "__main__":
    main()
