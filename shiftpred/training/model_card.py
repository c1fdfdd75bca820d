"""Write a model's card: what it is, what it was made from, how good it is.

    python -m shiftpred.training.model_card MODEL TABLES [--judgement FILE] [--ablation FILE] [--unseen FILE]

Every figure is measured by this command, or read from the files that the commands named in the card have written.
"""

from __future__ import annotations

import argparse
import json
from pathlib import Path

from shiftpred.bundles import load_bundle
from shiftpred.judgement.calibrating import render_rates, render_reliability
from shiftpred.reporting.saving import save_text
from shiftpred.training.ablation import render_ablation
from shiftpred.training.evaluate import evaluate_model
from shiftpred.training.evaluation_text import render_evaluation
from shiftpred.training.unseen_chemistry import render_unseen_chemistry

__all__ = ["build_model_card"]

_WHAT = """## What it is
Predicts 1H and 13C shifts of organic compounds in solution, with an error size for each site. Three parts:

- an **environment model**: message passing on the molecular graph, {layers} rounds, {width} numbers an atom, {weights:,} weights.
  Inputs are elements, bonds, rings, conjugation, electronic constants (Pauling, hybrid, Sanderson and Allen values, equalised
  group electronegativity over one to three shells, partial charges, an inductive field), relative stereo (E/Z, cis/trans on
  rings, like and unlike neighbours) and the solvent;
- a **memory** of {memory:,} measured surroundings out to one to five bonds: what the network missed where atoms with exactly the
  same surroundings were measured, shrunk by how few they were;
- a **substituent model** (additive, what `explain` prints); `explain` shows what the other two add as lines of their own."""

_USE = """## Intended use, and misuse
For assigning spectra and for judging whether measured peaks bear a proposed structure out. A prediction is evidence, not proof
of identity; release testing, forensic and clinical use follow local rules and a qualified person's judgement. Not for solids,
paramagnetic compounds, or metals beyond what little the data have."""

_DATA = """## Data and their licence
The open data of nmrshiftdb2 (Kuhn and Schlörer, Magn. Reson. Chem. 2015, 53, 582; Steinbeck, Krause and Kuhn,
J. Chem. Inf. Comput. Sci. 2003, 43, 1733), published under an open licence of its own that asks for attribution; see
`datasets/open_shift_data/README.md`. The model holds weights, hashes of surroundings and medians over the atoms that share them,
and no structures or spectra. SHA-256 of the tables:

{tables}

Compounds with a 13C or a 1H peak: {train:,} to train on, {calibration:,} to calibrate on, {test:,} held back for the figures
below, split by connectivity; {excluded:,} more share a connectivity with `datasets/measured_shifts` and were not trained on.
`set_aside.csv` lists {aside:,} training compounds whose peaks fit far worse than the rest (spectrum or structure probably wrong);
neither the network in its second half nor the memory learned from them. The source has no atom numbers: peaks were assigned anew
before each pass, by hydrogen counts, C-H pairs and, where shifts leave it open, the order of the labels."""

_WEAK = """## Known weak spots
- Ketone and ester carbons in D2O come out too low; the solvent effect in D2O on 13C is no better than none (see SOLVENT EFFECT).
- CS2, methane, iodomethane: molecules too small to share surroundings with anything (see the lists of the worst).
- Thiocarbonyl carbons, tin, mercury, selenium: large errors, and intervals that hold too seldom.
- O-H and N-H hydrogens move with concentration and water: wide intervals, and still too narrow.
- Sites whose assignment needs no prediction are covered somewhat less than all sites: the best assignment flatters.
- One wrong entry among the training data pulls the prediction of a site with the same surroundings, and its interval does not know;
  `explain` names how many atoms were measured alike and what they add.
- Diastereomers, and E/Z isomers without a pair of shifts that tells them apart: often no more than a guess from bare 13C lines."""


def build_model_card(
    model: str | Path,
    tables: str | Path,
    judgement: dict | None = None,
    ablation: dict | None = None,
    unseen: dict | None = None,
    plain_network: str | Path | None = None,
) -> str:
    """Measure a model on the test part and render its card as Markdown.

    Parameters
    ----------
    model, tables : path
    judgement : dict, optional
        What `python -m shiftpred.training.calibrate_judgement MODEL TABLES --test --output FILE` wrote.
    ablation, unseen : dict, optional
        What the modules of these names wrote.
    plain_network : path, optional
        `plain_network.npz`, as one more baseline.
    """
    bundle = load_bundle(model)
    origin, network = bundle.manifest["origin"], bundle.environment_model
    aside = (Path(model) / "set_aside.csv").read_text(encoding="utf-8").count("\n") - 1
    evaluation = render_evaluation(evaluate_model(model, tables, plain_network=plain_network))
    parts = [
        f"# Model card: {bundle.manifest['name']}, edition {bundle.manifest['edition']}",
        _WHAT.format(
            layers=network.depth,
            width=network.arrays["embed.weight"].shape[1],
            weights=sum(a.size for a in network.arrays.values()),
            memory=len(bundle.memory.codes),
        ),
        _USE,
        _DATA.format(
            tables="\n".join(f"- `{name}`: `{digest}`" for name, digest in origin["tables"].items()),
            aside=aside,
            **origin["compounds"],
        ),
        _render_training(origin),
        _render_judgement(bundle.judgement, judgement),
        _render_block(
            "What each input and step brings",
            "`python -m shiftpred.training.ablation TABLES FOLDER`, short trainings on a part of the data; the figures say what a"
            " step is worth there, not how good this model is.",
            ablation and render_ablation(ablation),
        ),
        _render_block(
            "Chemistry that was removed from training on purpose",
            "`python -m shiftpred.training.unseen_chemistry TABLES FOLDER`: a model trained briefly on a part of the data without"
            " these elements and ring systems, and asked about them.",
            unseen and render_unseen_chemistry(unseen),
        ),
        _WEAK,
        _render_block(
            "Figures on the held-back part",
            "`shiftpred evaluate MODEL TABLES` prints:",
            evaluation.replace(str(tables), "TABLES").strip(),
        ),
    ]
    return "\n\n".join(p for p in parts if p) + "\n"


def _render_training(origin: dict) -> str:
    settings = ", ".join(f"{k} {v}" for k, v in origin["settings"].items())
    held = origin["held_out"]
    versions = ", ".join(f"{k} {v}" for k, v in origin["versions"].items())
    lines = [
        "## How it was trained",
        f"One run of `shiftpred train TABLES --output MODEL`, {origin['minutes']:.0f} minutes on two cores"
        + (f", on top of {origin['started_from']}" if origin.get("started_from") else "")
        + f". Settings: {settings}. Versions: {versions}. `rounds.jsonl` is its log, one line a pass.",
    ]
    if "network_alone" in held:
        one, both = held["network_alone"], held["after"]
        lines.append(
            f"On the held-back compounds the network alone is off by {one['13C_mean']:.3f} ppm (13C) and {one['1H_mean']:.4f} ppm"
            f" (1H on carbon), with the memory by {both['13C_mean']:.3f} and {both['1H_mean']:.4f} ppm."
        )
    return "\n".join(lines)


def _render_judgement(calibrated: dict, tested: dict | None) -> str:
    if not calibrated:
        return ""
    cases = calibrated["cases"]
    out = [
        "## How the judgement is calibrated",
        f"`python -m shiftpred.training.calibrate_judgement MODEL TABLES` on {cases['samples']} compounds of the calibration part,"
        f" {cases['cases']:,} cases: each list, as measured and corrupted, against its right structure, a near relative and another"
        f" compound, with rivals that the tool makes from that proposal ({cases['mix']}).",
        f"```text\n{render_reliability(cases['reliability'])}\n\n{render_rates(cases['rates'])}\n```",
    ]
    if tested:
        rates = tested["test_cases"]
        out += [
            "On compounds of the test part, which neither the network nor the map has seen (the same command with `--test`):",
            f"```text\n{render_reliability(rates['reliability'])}\n\n{render_rates(rates['rates'])}\n```",
        ]
    return "\n\n".join(out)


def _render_block(title: str, words: str, text: str | None) -> str:
    return f"## {title}\n{words}\n\n```text\n{text}\n```" if text else ""


def main() -> None:
    """Read the command line."""
    parser = argparse.ArgumentParser(prog="python -m shiftpred.training.model_card", description=__doc__.split("\n")[0])
    parser.add_argument("model", help="folder of a trained model; receives CARD.md")
    parser.add_argument("tables", help="folder with compounds and peaks")
    for name in ("judgement", "ablation", "unseen"):
        parser.add_argument(f"--{name}", metavar="FILE", help="JSON that the command of this name has written")
    parser.add_argument("--plain-network", metavar="FILE", help="plain_network.npz, as one more baseline")
    given = parser.parse_args()
    read = {
        name: json.loads(Path(path).read_text(encoding="utf-8"))
        for name in ("judgement", "ablation", "unseen")
        if (path := getattr(given, name))
    }
    save_text(
        Path(given.model) / "CARD.md", build_model_card(given.model, given.tables, plain_network=given.plain_network, **read)
    )


if __name__ == "__main__":
    main()
