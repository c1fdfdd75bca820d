"""How good is a model on compounds that it has not seen? Errors by environment class, intervals, and three baselines beside it.

Peaks without atom numbers are assigned by the model that is judged, which flatters it. So errors against true assignments
(`datasets/measured_shifts`), on sites whose assignment needs no prediction, and the agreement of 13C and 1H assignments that
were made apart stand beside them.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
from rdkit import Chem
from rdkit.Chem.Scaffolds import MurckoScaffold

from shiftpred.bundles import ModelBundle
from shiftpred.errors import BundleError, InputError, SettingError, quote
from shiftpred.pipeline import load_model
from shiftpred.training.additivity_rules import RULES, choose_first_rule, predict_each_rule
from shiftpred.training.environment_lookup import build_environment_lookup, compute_environment_codes
from shiftpred.training.evaluation_sites import (
    collect_sites,
    compare_geminal_hydrogens,
    count_pair_agreement,
    place_training_peaks,
    predict_compounds,
)
from shiftpred.training.evaluation_statistics import (
    compute_coverage_figures,
    compute_error_figures,
    compute_interval_scores,
    compute_shortfall,
    correct_for_many,
)
from shiftpred.training.evaluation_text import render_evaluation
from shiftpred.training.measured_shifts import compare_with_measured, load_measured_connectivities
from shiftpred.training.open_tables import Compound, load_open_tables
from shiftpred.training.progress import show_progress

__all__ = ["SPLIT_CHOICES", "compute_width_ratio", "evaluate_model"]

SCHEMA_VERSION = 1
SPLIT_CHOICES = ("test", "calibration", "ours", "all")
"""Parts of the tables that can be judged on: one of the two held-out parts, both ('ours'), or every compound ('all', for tables
that no part of the model has seen)."""
COVERAGES = (0.5, 0.8, 0.9, 0.95, 0.99)
_NOMINAL = 0.9
_SHORT = 0.88
"""A class is called short if its 90 % intervals hold significantly less often than this."""
_LARGE_CLASS = 200
_NUCLEI = ("13C", "1H")
_BASELINES = ("rules", "lookup", "substituents", "plain")


def evaluate_model(
    model: ModelBundle | str | Path,
    tables: str | Path,
    split: str = "test",
    *,
    max_atoms: int = 70,
    baselines: bool = True,
    baseline_tables: str | Path | None = None,
    plain_network: str | Path | None = None,
    report: Callable[[str], None] | None = None,
) -> dict:
    """Measure a model.

    Parameters
    ----------
    model : ModelBundle or path
        A loaded model or its folder.
    tables : path
        Folder with `compounds` and `peaks` (see `load_open_tables`).
    split : {'test', 'calibration', 'ours', 'all'}
        Which compounds; 'ours' is test and calibration together. Compounds of `datasets/measured_shifts` count for 'all' only.
    max_atoms : int, default 70
        Heavy atoms of the largest molecule.
    baselines : bool, default True
        False leaves out everything that has to read the training part, which is most of the time.
    baseline_tables : path, optional
        Folder whose training part the look-up is made of; default `tables`. The look-up is not asked about compounds that it
        was made of.
    plain_network : path, optional
        `plain_network.npz` from `shiftpred.training.plain_network`: a fourth baseline.
    report : callable, optional
        Gets the finished page of text.

    Returns
    -------
    dict
        JSON-ready; `shiftpred.training.evaluation_text.render_evaluation` turns it into text. Its keys: schema_version, model,
        tables, split, compounds, overall, by_class, by_element, by_novelty, coverage, baselines, rules, certain,
        without_hydrogen_counts, new_scaffolds, pairs, geminal, measured, seconds. Shifts in ppm; None: nothing to compute from.

    Raises
    ------
    SettingError
        For another split.
    InputError
        If the tables cannot be read, or hold no such compounds.
    BundleError
        If the model cannot be read.
    """
    begun = time.time()
    if split not in SPLIT_CHOICES:
        raise SettingError("split", quote(split), f"one of {', '.join(SPLIT_CHOICES)}", "--split test")
    bundle = load_model(model)
    compounds = load_open_tables(tables, load_measured_connectivities())
    wanted = dict(ours=("test", "calibration"), all=("train", "calibration", "test", "excluded")).get(split, (split,))
    chosen = [c for c in compounds if c.split in wanted and c.mol.GetNumAtoms() <= max_atoms]
    if not chosen:
        raise InputError(
            str(tables),
            f"no compounds of the part {quote(split)}",
            "at least one compound with peaks",
            "--split all, if no compound of these tables was trained on",
        )
    predicted = predict_compounds(chosen, bundle, _NOMINAL)
    values, by_rule, notes = {}, None, []
    training: list[Compound] = []
    if baselines:
        source = load_open_tables(baseline_tables) if baseline_tables else compounds
        training = [c for c in source if c.split == "train"]
        values, by_rule, notes = _predict_baselines(chosen, training, bundle, plain_network)
    sites, own = collect_sites(chosen, predicted, values)
    bare, _ = collect_sites(chosen, predicted, {}, hydrogen_counts=False)
    for frame in (sites, bare):
        frame["error"] = frame.observed - frame.predicted
        frame["kind"] = _name_kind(frame)
    result = dict(
        schema_version=SCHEMA_VERSION,
        model=bundle.edition,
        tables=str(tables),
        split=split,
        compounds=len(chosen),
        overall=_summarise_overall(sites),
        without_hydrogen_counts={k: compute_error_figures(r.error) for k, r in bare.groupby("kind")},
        certain=_summarise(sites[sites.certain]),
        by_class=_summarise_classes(sites, bare),
        by_element=_summarise_elements(sites),
        by_novelty={k: _summarise(r) for k, r in sites.groupby(_name_novelty(sites))},
        new_scaffolds=_summarise_new_scaffolds(sites, chosen, training),
        coverage=_summarise_coverages(sites, bundle),
        baselines=_compare_baselines(sites, own, values),
        rules=_compare_rules(sites, by_rule),
        pairs=count_pair_agreement(chosen, predicted),
        geminal=compare_geminal_hydrogens(chosen, predicted),
        measured=compare_with_measured(bundle, _NOMINAL),
        notes=notes,
        seconds=round(time.time() - begun, 1),
    )
    if report:
        report(render_evaluation(result))
    return result


def _predict_baselines(chosen: list[Compound], training: list[Compound], bundle: ModelBundle, plain_network):
    """Return {baseline: one (n_atoms, 2) array for each compound}, {nucleus: {rule: arrays}}, and notes on what is missing."""
    notes = []
    by_rule = [predict_each_rule(c.mol) for c in show_progress(chosen, "additivity rules", len(chosen))]
    values = {"rules": [np.stack([choose_first_rule(each[n]) for n in _NUCLEI], axis=1) for each in by_rule]}
    if training:
        shifts = place_training_peaks(training, bundle.environment_model)
        lookup = build_environment_lookup([compute_environment_codes(c.mol) for c in training], shifts)
        made_of = {c.key for c in training}
        values["lookup"] = [
            np.full((c.mol.GetNumAtoms(), 2), np.nan)
            if c.key in made_of and c.split == "train"
            else lookup.predict(compute_environment_codes(c.mol))[0]
            for c in chosen
        ]
    else:
        notes.append("no look-up: the tables hold no training part")
    try:
        alone = bundle.substituent_model
    except (BundleError, KeyError):
        notes.append("no substituent model in this model folder")
    else:
        values["substituents"] = [
            np.stack([alone.predict(c.mol, n) for n in _NUCLEI], axis=1)
            for c in show_progress(chosen, "substituent model", len(chosen))
        ]
    if plain_network:
        from shiftpred.training.plain_network import load_plain_network, predict_plain

        values["plain"] = predict_plain(load_plain_network(plain_network), [c.mol for c in chosen])
    rules = {n: {rule: [each[n][rule] for each in by_rule] for rule in RULES[n]} for n in _NUCLEI}
    return {name: values[name] for name in _BASELINES if name in values}, rules, notes


def _name_kind(sites: pd.DataFrame) -> np.ndarray:
    return np.where(sites.nucleus == "13C", "13C", np.where(sites.element == "C", "1H on carbon", "1H on others"))


def _summarise(sites: pd.DataFrame) -> dict:
    """Return errors and interval figures of each kind of site."""
    return {
        kind: compute_error_figures(rows.error)
        | compute_coverage_figures(rows.error.to_numpy(), rows.half.to_numpy(), rows.molecule.to_numpy(), _NOMINAL)
        | dict(molecules=int(rows.molecule.nunique()))
        for kind, rows in sites.groupby("kind")
    }


def _summarise_overall(sites: pd.DataFrame) -> dict:
    """Like `_summarise`, with the interval score of one constant width beside it.

    That width is the one that holds 90 % of these very sites, which favours it.
    """
    out = _summarise(sites)
    for kind, rows in sites.groupby("kind"):
        error = rows.error.to_numpy()
        constant = np.full(len(error), np.quantile(np.abs(error), _NOMINAL))
        score = float(compute_interval_scores(error, constant, _NOMINAL).mean())
        own = out[kind]["interval_score"]
        out[kind] |= dict(constant_width_score=round(score, 4), score_ratio=round(own / score, 4) if own and score else None)
    return out


def _summarise_classes(sites: pd.DataFrame, bare: pd.DataFrame) -> list[dict]:
    """Return one row for each environment class, the most sites first within a nucleus.

    `bare` holds the sites as they are assigned without hydrogen counts.
    """
    rows = []
    bare_means = bare.error.abs().groupby([bare.nucleus, bare.environment]).mean()
    for (nucleus, environment), members in sites.groupby(["nucleus", "environment"]):
        error, half, molecule = (members[c].to_numpy() for c in ("error", "half", "molecule"))
        row = dict(nucleus=nucleus, environment=environment, molecules=int(members.molecule.nunique()))
        row |= compute_error_figures(error) | compute_coverage_figures(error, half, molecule, _NOMINAL)
        without = bare_means.get((nucleus, environment))
        row["mean_without_hydrogen_counts"] = None if without is None else round(float(without), 4)
        row["p_short"] = compute_shortfall(np.abs(error) <= half, molecule, _SHORT) if len(members) >= _LARGE_CLASS else None
        for name in _BASELINES:
            if name in members:
                row[name] = _compare_on_same(members, members[name])
        rows.append(row)
    tested = [r for r in rows if r["p_short"] is not None]
    for row, p in zip(tested, correct_for_many([r["p_short"] for r in tested])):
        row["p_short"] = round(float(p), 4)
        row["short"] = bool(p < 0.05)
    return sorted(rows, key=lambda r: (_NUCLEI.index(r["nucleus"]), -r["sites"]))


def _compare_on_same(sites: pd.DataFrame, values: pd.Series) -> dict:
    """Return the mean error of a baseline where it has a value, and the model's on the very same sites."""
    has = ~np.isnan(values.to_numpy(float))
    if not has.any():
        return dict(sites=0, mean=None, median=None, model_mean=None, model_median=None)
    theirs = np.abs(sites.observed.to_numpy() - values.to_numpy(float))[has]
    ours = np.abs(sites.error.to_numpy())[has]
    return dict(
        sites=int(has.sum()),
        mean=round(float(theirs.mean()), 4),
        median=round(float(np.median(theirs)), 4),
        model_mean=round(float(ours.mean()), 4),
        model_median=round(float(np.median(ours)), 4),
    )


def _compare_baselines(sites: pd.DataFrame, own: dict[str, pd.DataFrame], values) -> dict:
    """Return for each baseline and kind: the same sites with the model's assignment, and all sites with its own."""
    out = {}
    for name in values:
        frame = own[name].assign(kind=_name_kind(own[name]))
        own_means = frame.groupby("kind").error.mean()
        out[name] = {}
        for kind, rows in sites.groupby("kind"):
            out[name][kind] = _compare_on_same(rows, rows[name])
            # Rules leave most sites without a value; an assignment of their own would measure only that.
            complete = name != "rules" and kind in own_means
            out[name][kind]["mean_with_own_assignment"] = round(float(own_means[kind]), 4) if complete else None
    return out


def _compare_rules(sites: pd.DataFrame, by_rule) -> dict:
    """Return for each nucleus and published rule its error, and the model's on the same sites."""
    out: dict[str, dict] = {}
    for nucleus, rules in (by_rule or {}).items():
        rows = sites[sites.nucleus == nucleus]
        place = list(zip(rows.molecule, rows.atom))
        for rule, arrays in rules.items():
            column = pd.Series([arrays[m][a] for m, a in place], dtype=float)
            out.setdefault(nucleus, {})[rule] = _compare_on_same(rows, column)
    return out


def _summarise_elements(sites: pd.DataFrame) -> dict:
    """Return errors on molecules that contain an element ('only C, H, N, O' for those with nothing else), by kind."""
    sets = {text: frozenset(text.split()) for text in sites.elements.unique()}
    usual = frozenset("CHNO")
    out = {"only C, H, N, O": _summarise_brief(sites[[sets[t] <= usual for t in sites.elements]])}
    for element in sorted(set().union(*sets.values()) - frozenset("CH")):
        out[f"with {element}"] = _summarise_brief(sites[[element in sets[t] for t in sites.elements]])
    return out


def _summarise_brief(sites: pd.DataFrame) -> dict:
    names = ("sites", "molecules", "mean", "median", "coverage")
    return {kind: {k: figures[k] for k in names} for kind, figures in _summarise(sites).items()}


def _name_novelty(sites: pd.DataFrame) -> pd.Series:
    return sites.note.map(
        lambda note: (
            "unlike the training data"
            if "unlike the training data" in note
            else "surroundings not in the training data"
            if "not in the training data" in note
            else "familiar"
        )
    )


def _summarise_new_scaffolds(sites: pd.DataFrame, chosen: list[Compound], training: list[Compound]) -> dict | None:
    """Return the figures for molecules with rings whose scaffold no training compound has; None without a training part."""
    if not training:
        return None
    seen = {_find_scaffold(c.mol) for c in training}
    scaffolds = [_find_scaffold(c.mol) for c in chosen]
    new = np.array([bool(s) and s not in seen for s in scaffolds])
    return _summarise(sites[new[sites.molecule.to_numpy()]])


def _find_scaffold(mol: Chem.Mol) -> str:
    """Return the scaffold (Bemis & Murcko, J. Med. Chem. 1996, 39, 2887) as SMILES without stereo; '' without rings."""
    return Chem.MolToSmiles(MurckoScaffold.GetScaffoldForMol(mol), isomericSmiles=False)


def _summarise_coverages(sites: pd.DataFrame, bundle: ModelBundle) -> dict:
    """Return what intervals of other nominal coverages would hold: {kind: {nominal: figures}}."""
    out: dict[str, dict] = {}
    for kind, rows in sites.groupby("kind"):
        nucleus = "13C" if kind == "13C" else "1H"
        out[kind] = {}
        for coverage in COVERAGES:
            ratio = {e: compute_width_ratio(bundle, nucleus, e, coverage) for e in rows.environment.unique()}
            half = rows.half.to_numpy() * rows.environment.map(ratio).to_numpy()
            out[kind][str(coverage)] = compute_coverage_figures(rows.error.to_numpy(), half, rows.molecule.to_numpy(), coverage)
    return out


def compute_width_ratio(bundle: ModelBundle, nucleus: str, environment: str, coverage: float) -> float:
    """Return by how much an interval of a class is wider at `coverage` than at the nominal one."""
    wanted = bundle.intervals.compute_factor(nucleus, environment, coverage)
    base = bundle.intervals.compute_factor(nucleus, environment, _NOMINAL)
    return wanted / base if np.isfinite(base) else 1.0
