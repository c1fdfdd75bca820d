"""Fit the environment model to peaks without atom numbers: assign, fit, assign again, once for every pass over the data.

The work is shared by processes of one thread each (two by default): every process takes its part of each batch, and the
gradients are averaged. That is nearly twice as fast on two cores as one process with two threads, and the result does not
depend on what else the machine is doing.
"""

from __future__ import annotations

import json
import math
import os
import socket
import time
from dataclasses import asdict, dataclass
from pathlib import Path

import numpy as np
import torch
import torch.distributed as distributed

from shiftpred.features.molecule_arrays import MoleculeArrays, build_molecule_arrays, join_molecule_arrays
from shiftpred.regression.environment_model import OUTPUT_CENTRE, OUTPUT_UNIT
from shiftpred.training.assign_open_peaks import PeakPlacer
from shiftpred.training.network import EnvironmentNetwork
from shiftpred.training.open_tables import Compound
from shiftpred.training.progress import show_progress

__all__ = ["NetworkSettings", "build_graphs", "build_network", "compute_errors", "count_finished_passes", "is_strange",
           "predict_compounds",
           "train_environment_model"]


@dataclass(frozen=True)
class NetworkSettings:
    """What a training run was asked for; written beside the model."""

    width: int = 256
    layers: int = 6
    message: int = 128
    hidden: int = 384
    passes: int = 68
    restart: int = 54
    """Pass after which the learning rate, down to nothing by then, starts once more at half its height (Loshchilov & Hutter, SGDR,
    ICLR 2017); a run of fewer passes has no restart."""
    first_passes: int = 2
    """Passes on the first assignment (by the substituent model, or of the unambiguous peaks alone)."""
    batch: int = 48
    learning_rate: float = 1.0e-3
    weight_decay: float = 1e-3
    averaging: float = 0.999
    random_seed: int = 7
    label_order: float = 0.3
    """Worth of a bond between consecutive labels when peaks are assigned (see `PeakPlacer.assign`), from the middle on."""
    cleaning: bool = True
    """From the middle on, compounds that fit far worse than the rest are not learned from."""
    electronic: bool = True
    stereo: bool = True
    low_precision: bool = True
    """Matrix products in bfloat16 (twice as fast where the processor has it)."""


_UNIT = np.array(OUTPUT_UNIT)
_CENTRE = np.array(OUTPUT_CENTRE)
_T_UNIT = torch.tensor(OUTPUT_UNIT)
# Weight of one ppm in the loss, and the error (ppm) beyond which it counts less and less: a wrong label or a wrong spectrum
# must not pull as hard as its distance.
_T_WEIGHT = torch.tensor([0.5, 8.0, 4.0])
_T_LIMIT = torch.tensor([8.0, 1.0, 1.0])


def build_network(settings: NetworkSettings) -> EnvironmentNetwork:
    """Return a fresh network of the size that the settings ask for."""
    return EnvironmentNetwork(settings.width, settings.layers, settings.message, settings.hidden)


def build_graphs(compounds: list[Compound], settings: NetworkSettings) -> list[MoleculeArrays]:
    """Turn the compounds' structures into arrays."""
    return [
        build_molecule_arrays(c.mol, settings.electronic, settings.stereo)
        for c in show_progress(compounds, "molecules to arrays")
    ]


def train_environment_model(
    compounds: list[Compound],
    settings: NetworkSettings,
    folder: str | Path,
    processes: int = 2,
    report=print,
    starting_weights: dict | None = None,
    graphs: list[MoleculeArrays] | None = None,
    first_predictions: list[np.ndarray] | None = None,
) -> EnvironmentNetwork:
    """Train, leaving a checkpoint in `folder` after every pass; a run that was stopped goes on from it.

    Parameters
    ----------
    compounds : list of Compound
        Those of split 'train' are learned from, those of 'calibration' are watched; others are left alone.
    settings : NetworkSettings
    folder : path
        Receives `checkpoint.pt` (a working file, not part of the model) and `rounds.jsonl`, the log of the rounds.
    processes : int, default 2
    report : callable, default print
        Gets one line for each pass.
    starting_weights : dict, optional
        State of a network of the same size to start from (training on top of a model).
    graphs : list of MoleculeArrays, optional
        Of the compounds, where they have been made already.
    first_predictions : list of ndarray of shape (n_atoms, 2), optional
        13C and 1H shifts (ppm; nan: none) of every compound by another model, for the first assignment; without them it is
        confined to the peaks that are unambiguous by hydrogen count.

    Returns
    -------
    EnvironmentNetwork
        With averaged weights.
    """
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    if graphs is None:
        graphs = build_graphs(compounds, settings)
    chosen = [i for i, c in enumerate(compounds) if c.split in ("train", "calibration")]
    job = _Job([compounds[i] for i in chosen], [graphs[i] for i in chosen], settings, folder, processes, report,
               starting_weights, _free_port(), [first_predictions[i] for i in chosen] if first_predictions else None)
    torch.set_num_threads(1)
    if processes == 1:
        _work(0, job)
    else:
        method = "fork" if "fork" in torch.multiprocessing.get_all_start_methods() else "spawn"
        torch.multiprocessing.start_processes(_work, (job,), nprocs=processes, start_method=method)
    network = build_network(settings)
    network.load_state_dict(torch.load(folder / "checkpoint.pt", weights_only=True)["average"])
    return network


def count_finished_passes(folder: str | Path, settings: NetworkSettings) -> int:
    """Return after which pass a run with these very settings was stopped in `folder`; 0: there is none to go on from."""
    checkpoint = Path(folder) / "checkpoint.pt"
    if not checkpoint.exists():
        return 0
    state = torch.load(checkpoint, weights_only=True)
    return state["pass"] if state["settings"] == json.dumps(asdict(settings)) else 0


@dataclass
class _Job:
    compounds: list
    graphs: list
    settings: NetworkSettings
    folder: Path
    processes: int
    report: object
    starting_weights: dict | None
    port: int
    first_predictions: list | None


def _free_port() -> int:
    with socket.socket() as s:
        s.bind(("127.0.0.1", 0))
        return s.getsockname()[1]


def _work(rank: int, job: _Job) -> None:
    """Train in one of the processes; the first writes the log and the checkpoints."""
    torch.set_num_threads(1)
    settings, shared = job.settings, job.processes > 1
    if shared:
        distributed.init_process_group(
            "gloo", init_method=f"tcp://127.0.0.1:{job.port}", rank=rank, world_size=job.processes
        )
    torch.manual_seed(settings.random_seed)
    network, average = build_network(settings), build_network(settings)
    if job.starting_weights is not None:
        network.load_state_dict(job.starting_weights)
    average.load_state_dict(network.state_dict())
    optimiser = torch.optim.AdamW(
        network.parameters(), lr=settings.learning_rate, weight_decay=settings.weight_decay, foreach=True
    )
    checkpoint = job.folder / "checkpoint.pt"
    first = count_finished_passes(job.folder, settings)
    if first:
        state = torch.load(checkpoint, weights_only=True)
        for thing, name in ((network, "network"), (average, "average"), (optimiser, "optimiser")):
            thing.load_state_dict(state[name])
        if rank == 0:
            job.report(f"going on after pass {first}")
    placers = [PeakPlacer(c) for c in job.compounds]
    train = [i for i, c in enumerate(job.compounds) if c.split == "train"]
    watch = [i for i, c in enumerate(job.compounds) if c.split == "calibration"]
    all_samples = samples = np.array([(i, s) for i in train for s in range(len(job.compounds[i].samples))], dtype=np.int64)
    assignments: list[np.ndarray] | None = None
    first_end = min(settings.restart, settings.passes)
    middle = (first_end - settings.first_passes) // 2 if job.starting_weights is None else 1
    for number in range(first, settings.passes):
        begun = time.time()
        start = number < settings.first_passes and job.starting_weights is None
        errors: dict[str, float] = {}
        if start and job.first_predictions is not None:
            fresh = [p.assign(v) for p, v in zip(placers, job.first_predictions)]
        elif start:
            fresh = [p.assign_unambiguous() for p in placers]
        else:
            model = network if number <= settings.first_passes else average
            late = number >= middle
            fresh, strange, errors = _assign_all(
                model, job, placers, watch, rank, settings.label_order if late else 0.0, f"pass {number + 1}: assign"
            )
            if late and settings.cleaning:
                samples = all_samples[~strange[all_samples[:, 0]]]
        changed = math.nan
        if assignments is not None:
            changed = np.mean(np.concatenate([a != b for a, b in zip(fresh, assignments)]))
        assignments = fresh
        order = np.random.default_rng(settings.random_seed + number).permutation(samples)
        steps = math.ceil(len(order) / settings.batch)
        network.train()
        total = 0.0
        bar = show_progress(range(steps), f"pass {number + 1}/{settings.passes}: fit", wanted=rank == 0)
        for step in bar:
            mine = order[step * settings.batch : (step + 1) * settings.batch][rank :: job.processes]
            share = 1.0 if start else _compute_share_of_rate(number + step / steps, settings)
            for group in optimiser.param_groups:
                group["lr"] = settings.learning_rate * share
            optimiser.zero_grad(set_to_none=True)
            loss, known = _batch_loss(network, mine, job, placers, assignments)
            loss.backward()
            mean, any_known = _share_gradients(network, float(loss.detach()), known, shared)
            if not any_known:
                continue
            total += mean
            torch.nn.utils.clip_grad_norm_(network.parameters(), 1.0)
            optimiser.step()
            with torch.no_grad():
                keep = min(settings.averaging, 1 - 1 / (1.0 + 0.1 * (step + steps * number)))
                torch._foreach_lerp_(list(average.parameters()), list(network.parameters()), 1 - keep)
        if rank == 0:
            row = dict(
                number=number + 1, loss=round(total / steps, 4), changed=round(float(changed), 4),
                placed=int(sum((a >= 0).sum() for a in assignments)), seconds=round(time.time() - begun, 1), **errors,
            )
            with open(job.folder / "rounds.jsonl", "a", encoding="utf-8") as log:
                log.write(json.dumps(row) + "\n")
            job.report(json.dumps(row))
            temporary = job.folder / "checkpoint.pt.tmp"
            torch.save(
                {"settings": json.dumps(asdict(settings)), "network": network.state_dict(),
                 "average": average.state_dict(), "optimiser": optimiser.state_dict(), "pass": number + 1}, temporary,
            )
            os.replace(temporary, checkpoint)
    if shared:
        distributed.barrier()
        distributed.destroy_process_group()


def _compute_share_of_rate(done: float, settings: NetworkSettings) -> float:
    """Return the share of the learning rate after so many passes: a short rise and a cosine down to nothing, and the same once
    more at half the height after the restart."""
    end = min(settings.restart, settings.passes)
    if done < end:
        part, height = (done - settings.first_passes) / max(1, end - settings.first_passes), 1.0
    else:
        part, height = (done - end) / max(1, settings.passes - end), 0.5
    return height * min(1.0, part / 0.02 + 0.05) * 0.5 * (1 + math.cos(math.pi * min(1.0, part)))


def _assign_all(model, job, placers, watch, rank, label_order, what):
    """Predict and assign this process' share of the compounds; bring the shares of all processes together.

    Returns the assignments, which compounds fit strangely badly, and the errors of the watched ones (of this share).
    """
    n = len(placers)
    mine = list(range(rank, n, job.processes))
    predicted = dict(zip(mine, predict_compounds(model, [job.graphs[i] for i in mine], job.settings, progress=what)))
    sizes = np.array([len(c.c13) for c in job.compounds])
    offsets = np.concatenate([[0], np.cumsum(sizes)])
    flat = torch.zeros(offsets[-1] + n, dtype=torch.int32)
    watched = set(watch)
    for i in mine:
        # What is watched is scored by shifts alone, as others score it.
        assignment = placers[i].assign(predicted[i][:, :2], 0.0 if i in watched else label_order)
        flat[offsets[i] : offsets[i + 1]] = torch.from_numpy(assignment.astype(np.int32))
        flat[offsets[-1] + i] = int(is_strange(job.compounds[i], assignment, predicted[i]))
    if job.processes > 1:
        distributed.all_reduce(flat)
    values = flat.numpy().astype(np.int64)
    fresh, strange = np.split(values[: offsets[-1]], offsets[1:-1]), values[offsets[-1] :] > 0
    cases = [(placers[i], job.compounds[i], fresh[i], predicted[i]) for i in watch if i in predicted]
    return fresh, strange, compute_errors(cases) if cases else {}


def is_strange(compound: Compound, assignment: np.ndarray, predicted: np.ndarray) -> bool:
    """Say whether peaks fit so badly that spectrum or structure is probably wrong: on average beyond four times the error
    that is expected there, and beyond 6 ppm (13C) or 0.8 ppm (1H)."""
    used = assignment >= 0
    for column, (observed, worst) in enumerate(((compound.c13, 6.0), (compound.h1, 0.8))):
        error = np.abs(observed[used] - predicted[assignment[used], column])
        known = ~np.isnan(error)
        if known.any():
            expected = predicted[assignment[used], 3 + column][known]
            if error[known].mean() > worst and (error[known] / expected).mean() > 4:
                return True
    return False


def _batch_loss(network, mine, job, placers, assignments):
    """Return the summed loss of this process' part of a batch and the number of known values in it."""
    rows, solvents, sizes = [], [], []
    for i, s in mine:
        solvent, values = job.compounds[i].samples[s]
        rows.append(placers[i].place(values, assignments[i]))
        solvents.append(solvent)
        sizes.append(len(rows[-1]))
    if not rows:
        return sum(p.sum() for p in network.parameters()) * 0.0, 0
    graph = _padded([job.graphs[i] for i, _ in mine])
    n = len(graph[0])
    target = np.full((n, 3), np.nan, dtype=np.float32)
    target[: sum(sizes)] = (np.concatenate(rows) - _CENTRE) / _UNIT
    solvent = np.zeros(n, dtype=np.int64)
    solvent[: sum(sizes)] = np.repeat(solvents, sizes)
    with torch.autocast("cpu", torch.bfloat16, enabled=job.settings.low_precision):
        out, scale = network(*graph, torch.from_numpy(solvent))
    return _loss(out, scale, torch.from_numpy(target))


def _loss(out, scale, target):
    known = torch.isfinite(target)
    difference = torch.where(known, out - target, torch.zeros_like(out)).abs()
    ppm = difference * _T_UNIT
    value = (_T_LIMIT * torch.log1p(ppm / _T_LIMIT) * _T_WEIGHT)[known].sum()
    both = known[:, :2]
    log_scale = scale.clamp(-8, 3)
    likelihood = (log_scale + difference[:, :2].detach() / torch.exp(log_scale))[both].sum()
    return value + 0.2 * likelihood, int(both.sum())


def _share_gradients(network, loss, known, shared):
    """Turn the summed gradients of all processes into those of the mean loss of the whole batch."""
    parameters = [p for p in network.parameters() if p.grad is not None]
    flat = torch.cat([p.grad.reshape(-1) for p in parameters] + [torch.tensor([loss, float(known)])])
    if shared:
        distributed.all_reduce(flat)
    count = float(flat[-1])
    flat /= max(1.0, count)
    at = 0
    for p in parameters:
        p.grad.copy_(flat[at : at + p.numel()].view_as(p))
        at += p.numel()
    return float(flat[-2]), count > 0


def _padded(graphs: list[MoleculeArrays], atom_step: int = 256, edge_step: int = 512):
    """Join graphs and pad them to few different sizes, for which the machine keeps its compiled kernels.

    The padding is atoms without a value and edges from and to the last of them.
    """
    joined, _ = join_molecule_arrays(graphs)
    n, m = len(joined.atoms), len(joined.source)
    size, edges = -(-(n + 1) // atom_step) * atom_step, -(-(m + 1) // edge_step) * edge_step
    atoms = np.zeros((size, joined.atoms.shape[1]), dtype=np.float32)
    atoms[:n] = joined.atoms
    rows = np.zeros((edges, joined.edges.shape[1]), dtype=np.float32)
    rows[:m] = joined.edges
    source, target = np.full(edges, size - 1), np.full(edges, size - 1)
    source[:m], target[:m] = joined.source, joined.target
    return tuple(torch.from_numpy(x) for x in (atoms, rows, source, target))


@torch.no_grad()
def predict_compounds(network, graphs, settings, batch: int = 128, progress: str = "predict", solvents=None):
    """Return a list of (n_atoms, 5): 13C, 1H, half gap, and the raw scales of 13C and 1H, all in ppm."""
    network.eval()
    order = np.argsort([len(g.atoms) for g in graphs], kind="stable")
    result: list[np.ndarray | None] = [None] * len(graphs)
    for begin in show_progress(range(0, len(order), batch), progress):
        chosen = order[begin : begin + batch]
        arrays = _padded([graphs[i] for i in chosen])
        sizes = [len(graphs[i].atoms) for i in chosen]
        solvent = np.zeros(len(arrays[0]), dtype=np.int64)
        if solvents is not None:
            solvent[: sum(sizes)] = np.repeat(np.asarray(solvents)[chosen], sizes)
        with torch.autocast("cpu", torch.bfloat16, enabled=settings.low_precision):
            out, scale = network(*arrays, torch.from_numpy(solvent))
        values = out.float().numpy() * _UNIT + _CENTRE
        scales = np.exp(scale.float().numpy().clip(-8, 3)) * _UNIT[:2]
        both = np.concatenate([values, scales], axis=1)[: sum(sizes)]
        for i, part in zip(chosen, np.split(both, np.cumsum(sizes)[:-1])):
            result[i] = part
    return result


def compute_errors(cases) -> dict[str, float]:
    """Mean and median absolute errors after the best assignment, over atoms; 1H on carbon only."""
    errors = {"13C": [], "1H": []}
    for placer, compound, assignment, predicted in cases:
        y = placer.place_observed(assignment)
        e = np.abs(y - predicted[:, :2])
        errors["13C"].append(e[~np.isnan(e[:, 0]), 0])
        on_carbon = np.array([a.GetAtomicNum() == 6 for a in compound.mol.GetAtoms()])
        errors["1H"].append(e[~np.isnan(e[:, 1]) & on_carbon, 1])
    out = {}
    for nucleus, parts in errors.items():
        e = np.concatenate(parts)
        out[f"{nucleus}_mean"], out[f"{nucleus}_median"] = round(float(e.mean()), 4), round(float(np.median(e)), 4)
    return out
