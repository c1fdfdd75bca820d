"""Does a model say so where it was never shown something? Elements and a ring system are removed from training on purpose.

    python -m shiftpred.training.unseen_chemistry TABLES FOLDER --share 0.3 --passes 10

A model is trained without them by `shiftpred train`'s own steps, and asked about them: how far off is it, which sites carry a
note, and do the intervals, which cannot have been calibrated on such sites, still hold? FOLDER/unseen_chemistry.json keeps the
figures.
"""

from __future__ import annotations

import argparse
import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
from rdkit import Chem

from shiftpred.reporting.saving import save_text
from shiftpred.training.evaluate import evaluate_model

__all__ = ["FILE", "REMOVED", "measure_unseen_chemistry", "render_unseen_chemistry", "split_tables"]

FILE = "unseen_chemistry.json"
REMOVED = {
    "silicon": "[Si]",
    "selenium": "[Se,se]",
    "boron": "[B,b]",
    "indoles": "c1ccc2[n]ccc2c1",
    "cyclopropanes": "C1CC1",
}
"""What is removed: name → SMARTS."""


def split_tables(tables: str | Path, folder: str | Path, share: float, seed: int = 1) -> dict[str, Path]:
    """Write tables without the removed chemistry, and one folder of tables for each kind that was removed.

    Parameters
    ----------
    tables, folder : path
    share : float
        Part of the other compounds that is kept, by a fixed random choice.
    seed : int

    Returns
    -------
    dict
        'rest' and each name of `REMOVED` → folder with `compounds.csv` and `peaks.csv`.
    """
    tables, folder = Path(tables), Path(folder)
    compounds = pd.read_csv(next(tables.glob("compounds.csv*")))
    peaks = pd.read_csv(next(tables.glob("peaks.csv*")))
    patterns = {name: Chem.MolFromSmarts(smarts) for name, smarts in REMOVED.items()}
    mols = [Chem.MolFromSmiles(s) for s in compounds.smiles]
    has = {name: np.array([m is not None and m.HasSubstructMatch(pattern) for m in mols]) for name, pattern in patterns.items()}
    rest = ~np.any(list(has.values()), axis=0) & (np.random.default_rng(seed).random(len(compounds)) < share)
    out = {}
    for name, chosen in {"rest": rest, **has}.items():
        out[name] = folder / f"tables_{name}"
        out[name].mkdir(parents=True, exist_ok=True)
        some = compounds[chosen]
        some.to_csv(out[name] / "compounds.csv", index=False)
        peaks[peaks.compound.isin(some.compound)].to_csv(out[name] / "peaks.csv", index=False)
    return out


def measure_unseen_chemistry(
    tables: str | Path,
    folder: str | Path,
    share: float = 0.3,
    passes: int = 10,
    processes: int = 2,
    report: Callable[[str], None] = print,
    settings=None,
) -> dict:
    """Train without the removed chemistry and measure on it.

    Parameters
    ----------
    tables, folder : path
    share : float
        Part of the other compounds that is used.
    passes, processes : int
    report : callable
    settings : NetworkSettings, optional
        `passes` aside; default: those of `shiftpred train`.

    Returns
    -------
    dict
        'passes', 'share' and 'rows': name → by kind of site ('familiar', 'surroundings not in the training data', 'unlike the
        training data') → by nucleus → sites, mean error, coverage of the 90 % intervals and their median width, ppm.
    """
    from shiftpred.training.train_environment_model import NetworkSettings
    from shiftpred.training.train_model import train_model

    folder = Path(folder)
    parts = split_tables(tables, folder, share)
    settings = replace(settings or NetworkSettings(), passes=passes)
    train_model(
        parts["rest"], folder / "model", settings=settings, processes=processes, substituent_compounds=4000, report=report
    )
    rows = {"held out, nothing removed": evaluate_model(folder / "model", parts["rest"], "test", baselines=False)["by_novelty"]}
    for name in REMOVED:
        if pd.read_csv(parts[name] / "compounds.csv").empty:
            report(f"no {name} in these tables")
            continue
        rows[name] = evaluate_model(folder / "model", parts[name], "all", baselines=False)["by_novelty"]
    result = dict(share=share, passes=passes, removed=REMOVED, rows=rows)
    save_text(folder / FILE, json.dumps(result, indent=1) + "\n")
    return result


def render_unseen_chemistry(result: dict) -> str:
    """Render the figures as text."""
    lines = [f"{'':58}{'sites':>7}{'mean error':>12}{'covered':>10}{'width':>8}"]
    for name, groups in result["rows"].items():
        lines.append(name)
        for group, kinds in groups.items():
            for kind in ("13C", "1H on carbon"):
                if kind in kinds:
                    f = kinds[kind]
                    width = "-" if f["median_width"] is None else f"{f['median_width']:.3g}"
                    lines.append(
                        f"  {group + ', ' + kind:56}{f['sites']:>7,}{f['mean']:>12.3g}{100 * f['coverage']:>8.1f} %{width:>8}"
                    )
    return "\n".join(lines)


def main() -> None:
    """Read the command line."""
    parser = argparse.ArgumentParser(prog="python -m shiftpred.training.unseen_chemistry", description=__doc__.split("\n")[0])
    parser.add_argument("tables", help="folder with compounds and peaks")
    parser.add_argument("folder", help="where to write")
    parser.add_argument("--share", type=float, default=0.3, help="part of the other compounds that is used")
    parser.add_argument("--passes", type=int, default=10)
    parser.add_argument("--processes", type=int, default=2)
    given = parser.parse_args()
    print(
        render_unseen_chemistry(
            measure_unseen_chemistry(given.tables, given.folder, given.share, given.passes, given.processes)
        )
    )


if __name__ == "__main__":
    main()
