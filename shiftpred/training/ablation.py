"""What each input and each step brings: the same short training with one thing left out at a time.

    python -m shiftpred.training.ablation TABLES FOLDER --share 0.25 --passes 12

Every variant is trained on the same share of the training compounds for as many passes and measured on the same compounds of
the calibration part, each with its own best assignment; the figures say what a step is worth at that length of training, not
how good the finished model is. A run that was stopped goes on with the variants that are missing. FOLDER/ablation.json goes into
the model card.
"""

from __future__ import annotations

import argparse
import json
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.reporting.saving import save_text
from shiftpred.training.assemble_model import build_memory, compute_held_out_errors, place_peaks
from shiftpred.training.fit_substituent_model import fit_to_peak_lists
from shiftpred.training.measured_shifts import load_measured_connectivities
from shiftpred.training.open_tables import load_open_tables
from shiftpred.training.plain_network import build_plain_arrays
from shiftpred.training.predict_graphs import predict_graphs
from shiftpred.training.progress import show_progress

__all__ = ["FILE", "Variant", "build_variants", "compare_variants", "render_ablation"]

FILE = "ablation.json"
_SUBSTITUENT_COMPOUNDS = 4000


@dataclass(frozen=True)
class Variant:
    """One way to train."""

    name: str
    settings: object
    """NetworkSettings."""
    substituents_first: bool = True
    """The first assignment is the substituent model's; otherwise it is confined to unambiguous peaks."""
    plain: bool = False
    """Elements, hydrogens, charges and bond types alone as inputs."""


def build_variants(full) -> Iterator[Variant]:
    """Yield the variants of complete settings (NetworkSettings), those themselves first."""
    yield Variant("complete", full)
    yield Variant("without electronic constants", replace(full, electronic=False))
    yield Variant("without stereo", replace(full, stereo=False))
    yield Variant("elements and bond types alone", replace(full, electronic=False, stereo=False), plain=True)
    yield Variant("first assignment from unambiguous peaks alone", full, substituents_first=False)
    yield Variant("without the order of labels", replace(full, label_order=0.0))
    yield Variant("without setting strange compounds aside", replace(full, cleaning=False))
    yield Variant("128 wide, 4 rounds", replace(full, width=128, layers=4, message=64, hidden=192))
    yield Variant("full precision", replace(full, low_precision=False))


def compare_variants(
    tables: str | Path,
    folder: str | Path,
    share: float = 0.25,
    passes: int = 12,
    processes: int = 2,
    report: Callable[[str], None] = print,
    settings=None,
) -> dict:
    """Train and measure every variant.

    Parameters
    ----------
    tables : path
        Folder with `compounds` and `peaks`.
    folder : path
        Receives `ablation.json` and a working folder for each variant.
    share : float, default 0.25
        Part of the training compounds that is used, by a fixed random choice.
    passes, processes : int
    report : callable
    settings : NetworkSettings, optional
        The complete ones, `passes` aside; default: those of `shiftpred train`.

    Returns
    -------
    dict
        'share', 'passes', 'compounds', and 'rows': name, errors of the network alone and with the memory, ppm.
    """
    from shiftpred.training.network import export_arrays
    from shiftpred.training.train_environment_model import NetworkSettings, build_graphs, train_environment_model

    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    compounds = load_open_tables(tables, load_measured_connectivities())
    train = [i for i, c in enumerate(compounds) if c.split == "train"]
    chosen = np.random.default_rng(1).permutation(train)[: max(1, round(share * len(train)))]
    held_out = [c for c in compounds if c.split == "calibration"]
    compounds = [compounds[i] for i in sorted(chosen)] + held_out
    n = len(chosen)
    done = _read(folder, share, passes, n)
    first = None
    for number, variant in enumerate(build_variants(replace(settings or NetworkSettings(), passes=passes))):
        if any(row["name"] == variant.name for row in done["rows"]):
            continue
        report(variant.name)
        if first is None and variant.substituents_first:
            model, _ = fit_to_peak_lists(compounds[: min(n, _SUBSTITUENT_COMPOUNDS)], log=report)
            first = [
                np.stack([model.predict(c.mol, nucleus) for nucleus in ("13C", "1H")], axis=1)
                for c in show_progress(compounds, "first assignment")
            ]
        graphs = [build_plain_arrays(c.mol) for c in compounds] if variant.plain else build_graphs(compounds, variant.settings)
        trained = train_environment_model(
            compounds,
            variant.settings,
            folder / f"variant_{number}",
            processes,
            report,
            graphs=graphs,
            first_predictions=first if variant.substituents_first else None,
        )
        network = EnvironmentModel(export_arrays(trained))
        predicted = predict_graphs(graphs[:n], network)
        memory = build_memory(graphs[:n], predicted, place_peaks(compounds[:n], predicted, variant.settings.label_order))
        row = dict(
            name=variant.name,
            network=compute_held_out_errors(held_out, graphs[n:], network),
            with_memory=compute_held_out_errors(held_out, graphs[n:], network, memory),
        )
        report(json.dumps(row))
        done["rows"].append(row)
        save_text(folder / FILE, json.dumps(done, indent=1) + "\n")
    return done


def _read(folder: Path, share: float, passes: int, n: int) -> dict:
    """Return what an earlier run with the same settings has measured already."""
    fresh = dict(share=share, passes=passes, compounds=n, rows=[])
    try:
        old = json.loads((folder / FILE).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return fresh
    return (
        old
        if {k: old.get(k) for k in ("share", "passes", "compounds")} == dict(share=share, passes=passes, compounds=n)
        else fresh
    )


def render_ablation(result: dict) -> str:
    """Render the comparison as text; lower is better, differences are against the first row."""
    lines = [
        f"{result['compounds']:,} training compounds, {result['passes']} passes, "
        f"{result['rows'][0]['network']['compounds'] if result['rows'] else 0:,} compounds held out; mean absolute errors in ppm",
        "",
        f"{'':48}{'13C':>8}{'':>9}{'1H on carbon':>14}{'':>9}",
    ]
    for part, title in (("network", "network alone"), ("with_memory", "with the memory of measured surroundings")):
        lines.append(title)
        for row in result["rows"]:
            cells = ""
            for nucleus, width, digits in (("13C", 8, 3), ("1H", 14, 4)):
                value, base = row[part][f"{nucleus}_mean"], result["rows"][0][part][f"{nucleus}_mean"]
                change = "" if row is result["rows"][0] else f"{100 * (value / base - 1):+.1f} %"
                cells += f"{value:>{width}.{digits}f}{change:>9}"
            lines.append(f"  {row['name']:46}{cells}")
    return "\n".join(lines)


def main() -> None:
    """Read the command line."""
    parser = argparse.ArgumentParser(prog="python -m shiftpred.training.ablation", description=__doc__.split("\n")[0])
    parser.add_argument("tables", help="folder with compounds and peaks")
    parser.add_argument("folder", help="where to write")
    parser.add_argument("--share", type=float, default=0.25, help="part of the training compounds")
    parser.add_argument("--passes", type=int, default=12)
    parser.add_argument("--processes", type=int, default=2)
    given = parser.parse_args()
    print(render_ablation(compare_variants(given.tables, given.folder, given.share, given.passes, given.processes)))


if __name__ == "__main__":
    main()
