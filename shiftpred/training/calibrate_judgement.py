"""Calibrate the judgement of a model on held-out compounds: `python -m shiftpred.training.calibrate_judgement MODEL TABLES`.

For every compound its measured list is compared with the right structure, with a near relative of it and with another compound,
each with rivals that the tool makes from that proposal; with the list as measured and with corrupted lists. Connectivities of
the split 'calibration' fit the map; those of 'test' are only looked at with --test.
"""

from __future__ import annotations

import argparse
import json
import sys
import time
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
from rdkit import Chem, RDLogger

from shiftpred.assignment import assign_structure, prepare_peaks
from shiftpred.bundles import ModelBundle, load_bundle, save_judgement
from shiftpred.judgement.calibrating import (
    JudgementCase,
    compute_rates,
    compute_reliability,
    fit_logistic_map,
    fit_thresholds_and_gate,
    render_rates,
    render_reliability,
)
from shiftpred.judgement.fit_summary import compute_fit_summary
from shiftpred.judgement.probability import build_judgement_map
from shiftpred.peaks import parse_peaks
from shiftpred.predicting import predict_molecules
from shiftpred.records import Structure
from shiftpred.reporting.saving import save_text
from shiftpred.structures import parse_structure
from shiftpred.structures.rivals import build_rivals
from shiftpred.training.corrupt_lists import CORRUPTIONS, corrupt_carbon_list, corrupt_hydrogen_list
from shiftpred.training.open_tables import compute_split, connectivity
from shiftpred.training.progress import show_progress

__all__ = ["Sample", "build_cases", "calibrate_judgement", "load_samples"]

_FEWEST_LINES = 4
_LARGEST_ATOMS = 45
_LISTS = ("13C", "1H", "13C+1H")


@dataclass(frozen=True)
class Sample:
    """A held-out compound with one measured list for each nucleus."""

    compound: int
    smiles: str
    solvent: str | None
    c13: np.ndarray
    """(n,) distinct 13C lines."""
    h1: np.ndarray
    """(m,) distinct 1H shifts; empty: none, or fewer than half of the compound's CH positions."""


def load_samples(tables: str | Path, split: str, most: int | None = None) -> list[Sample]:
    """Read the compounds of a split, in a fixed random order.

    Parameters
    ----------
    tables : path
        Folder with `compounds` and `peaks`.
    split : {'calibration', 'test'}
    most : int, optional
    """
    tables = Path(tables)
    smiles = pd.read_csv(next(tables.glob("compounds.csv*"))).set_index("compound").smiles
    peaks = pd.read_csv(next(tables.glob("peaks.csv*")))
    peaks = peaks[peaks.nucleus.isin(("13C", "1H"))]
    with_carbon = sorted(set(peaks.compound[peaks.nucleus == "13C"]))
    order = np.random.default_rng(11).permutation(with_carbon)
    groups = {n: dict(tuple(peaks[peaks.nucleus == n].groupby("compound"))) for n in ("13C", "1H")}
    found = []
    for compound in order:
        mol = Chem.MolFromSmiles(smiles[compound])
        if mol is None or mol.GetNumHeavyAtoms() > _LARGEST_ATOMS or compute_split(connectivity(mol)) != split:
            continue
        carbon, solvent = _largest_spectrum(groups["13C"][compound], 2)
        if len(carbon) < _FEWEST_LINES:
            continue
        hydrogen = np.zeros(0)
        if compound in groups["1H"]:
            hydrogen, _ = _largest_spectrum(groups["1H"][compound], 2)
            ranks = Chem.CanonicalRankAtoms(mol, breakTies=False)
            positions = len({r for r, a in zip(ranks, mol.GetAtoms()) if a.GetAtomicNum() == 6 and a.GetTotalNumHs()})
            if len(hydrogen) < max(3, 0.5 * positions):
                hydrogen = np.zeros(0)
        found.append(Sample(int(compound), Chem.MolToSmiles(mol), solvent, carbon, hydrogen))
        if most and len(found) >= most:
            break
    return found


def _largest_spectrum(rows: pd.DataFrame, digits: int) -> tuple[np.ndarray, str | None]:
    counts = rows.spectrum.value_counts()
    chosen = sorted(counts.index, key=lambda s: (-counts[s], s))[0]
    rows = rows[rows.spectrum == chosen]
    solvent = rows.solvent.iloc[0]
    return np.unique(np.round(rows.shift_ppm.to_numpy(float), digits)), solvent if isinstance(solvent, str) else None


def build_cases(
    samples: Iterable[Sample],
    bundle: ModelBundle,
    corruptions: Iterable[str] = CORRUPTIONS,
    n_rivals: int = 9,
    mass_confirmed: bool = False,
    seed: int = 3,
) -> Iterator[JudgementCase]:
    """Compare every sample with a right, a near and a far proposal.

    Every sample gives the cases of its list as measured; each corruption is done to every sample in turn (one a sample besides
    the measured one), so that all are covered evenly.

    Parameters
    ----------
    samples : iterable of Sample
    bundle : ModelBundle
    corruptions : iterable of str
    n_rivals : int
    mass_confirmed : bool
    seed : int
    """  # fmt: skip
    samples, corruptions = list(samples), [c for c in corruptions if c]
    for number, sample in enumerate(show_progress(samples, "cases")):
        random = np.random.default_rng([seed, sample.compound])
        proposals = _choose_proposals(sample, samples, number, n_rivals, mass_confirmed, random)
        candidates = {kind: [parse_structure(s) for s in listed] for kind, listed in proposals.items()}
        flat: list[Structure] = [s for listed in candidates.values() for s in listed]
        own = connectivity(candidates["right"][0].mol)
        other_constitution = [connectivity(s.mol) != own for s in candidates["right"][1:]]
        solvent = sample.solvent if sample.solvent not in ("other", "mixture", "neat") else None
        predictions = dict(zip(candidates, _cut(list(predict_molecules(flat, bundle, "both", solvent)), candidates)))
        done = ["", *([corruptions[number % len(corruptions)]] if corruptions else [])]
        for corruption in done:
            peaks = _corrupted_lists(sample, corruption, random)
            for lists in _LISTS:
                if peaks is None or not set(lists.split("+")) <= set(peaks):
                    continue
                ready = prepare_peaks({n: peaks[n] for n in lists.split("+")}, solvent)
                for kind, predicted in predictions.items():
                    summaries = tuple(compute_fit_summary(assign_structure(p, ready)) for p in predicted)
                    ranks = (0, 0)
                    if kind == "right":
                        ahead = [s.log_evidence >= summaries[0].log_evidence for s in summaries[1:]]
                        ranks = 1 + sum(ahead), 1 + sum(a and o for a, o in zip(ahead, other_constitution))
                    yield JudgementCase(sample.compound, kind, lists, corruption, summaries, *ranks)


def _choose_proposals(sample, samples, number, n_rivals, mass_confirmed, random) -> dict[str, list[str]]:
    """Return kind → SMILES of the proposal and its rivals."""
    own = [sample.smiles, *(r.smiles for r in _rivals(sample.smiles, n_rivals, mass_confirmed))]
    out = {"right": own}
    if len(own) > 1:
        near = own[1 + int(random.integers(len(own) - 1))]
        out["near"] = [near, *(r.smiles for r in _rivals(near, n_rivals, mass_confirmed))]
    others = [s for k, s in enumerate(samples) if k != number and abs(len(s.c13) - len(sample.c13)) <= 3]
    if others:
        far = others[int(random.integers(len(others)))].smiles
        out["far"] = [far, *(r.smiles for r in _rivals(far, n_rivals, mass_confirmed))]
    return out


def _rivals(smiles, n_rivals, mass_confirmed):
    return build_rivals(parse_structure(smiles), n_rivals, mass_confirmed)


def _cut(predictions, candidates):
    begin, out = 0, []
    for listed in candidates.values():
        out.append(predictions[begin : begin + len(listed)])
        begin += len(listed)
    return out


def _corrupted_lists(sample, corruption, random):
    mol = Chem.MolFromSmiles(sample.smiles)
    out = {}
    carbon = corrupt_carbon_list(sample.c13, corruption, mol, random)
    if carbon is None:
        return None
    out["13C"] = parse_peaks([float(x) for x in carbon], "13C")
    if len(sample.h1):
        hydrogen = corrupt_hydrogen_list(sample.h1, corruption, mol, random)
        if hydrogen is not None:
            out["1H"] = parse_peaks([float(x) for x in hydrogen], "1H")
    return out


def calibrate_judgement(
    cases: list[JudgementCase], most_wrong: float = 0.02, most_right: float = 0.01, report: Callable[[str], None] = print
) -> dict:
    """Fit maps, gate and thresholds.

    Returns
    -------
    dict
        Parameters for the model bundle, with the reliability curve and the number of cases in 'cases'.
    """
    maps = {}
    for lists in _LISTS:
        chosen = [c for c in cases if c.lists == lists]
        maps[lists] = fit_logistic_map(chosen)
        report(f"{lists}: {len(chosen)} cases, {json.dumps(maps[lists])}")
    measured = [c for c in cases if c.corruption == ""]
    parameters = fit_thresholds_and_gate(measured, maps, most_wrong, most_right)
    fitted = build_judgement_map(parameters)
    curve = compute_reliability(cases, fitted)
    parameters["cases"] = dict(
        samples=len({c.compound for c in cases}), cases=len(cases), reliability=curve,
        mix="half of the proposals right, 35 % near relatives, 15 % far off",
    )  # fmt: skip
    report(render_reliability(curve))
    return parameters


def main(arguments: list[str] | None = None) -> int:
    """Run from the command line."""
    RDLogger.DisableLog("rdApp.*")
    parser = argparse.ArgumentParser(description="Calibrate a model's judgement on held-out compounds.")
    parser.add_argument("model", help="folder of a trained model")
    parser.add_argument("tables", help="folder with compounds and peaks")
    parser.add_argument("--samples", type=int, default=None, help="most compounds")
    parser.add_argument("--output", help="write the parameters here as JSON")
    parser.add_argument("--store", action="store_true", help="put the parameters into the model folder")
    parser.add_argument("--test", action="store_true", help="fit nothing: rates of the stored parameters on the test split")
    asked = parser.parse_args(arguments)
    begun, bundle = time.time(), load_bundle(asked.model)
    samples = load_samples(asked.tables, "test" if asked.test else "calibration", asked.samples)
    print(f"{len(samples)} compounds")
    cases = list(build_cases(samples, bundle))
    print(f"{len(cases)} cases after {time.time() - begun:.0f} s")
    parameters = bundle.judgement if asked.test else calibrate_judgement(cases)
    fitted = build_judgement_map(parameters)
    rates = compute_rates(cases, fitted)
    print(render_rates(rates))
    parameters = dict(parameters)
    if asked.test:
        curve = compute_reliability(cases, fitted)
        print(render_reliability(curve))
        parameters["test_cases"] = dict(samples=len(samples), cases=len(cases), reliability=curve, rates=rates)
    else:
        parameters["cases"] = dict(parameters["cases"], rates=rates)
    if asked.output:
        save_text(asked.output, json.dumps(parameters, indent=1) + "\n")
    if asked.store and not asked.test:
        save_judgement(parameters, asked.model)
    return 0


if __name__ == "__main__":
    sys.exit(main())
