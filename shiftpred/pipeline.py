"""START HERE: the way of a value, one line per step. Nothing is computed in this file.

text, file ─ structures ─ substituents ─ electronics ─ features ─ regression ─ calibration ─ assignment ─ judgement ─ reporting
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from shiftpred.bundles import ModelBundle, load_bundle, load_default_bundle
from shiftpred.peaks.solvents import normalise_solvent
from shiftpred.predicting import predict_molecules, select_nucleus
from shiftpred.records import Comparison, Explanation, MoleculePrediction, Ranking, RecordFailure, Structure
from shiftpred.structures.reading import parse_listed_structures, parse_structure, parse_structures

__all__ = [
    "compare",
    "explain",
    "iterate_predictions",
    "load_model",
    "predict",
    "predict_structures",
    "rank",
    "rank_structures",
]


def load_model(model: ModelBundle | str | None = None) -> ModelBundle:
    """Return the model: one that is loaded already, one from a folder, or the shipped one."""
    if isinstance(model, ModelBundle):
        return model
    return load_bundle(model) if model else load_default_bundle()


def iterate_predictions(
    records: Iterable[Structure | RecordFailure],
    nucleus: str = "both",
    solvent: str | None = None,
    coverage: float = 0.9,
    model=None,
) -> Iterator[MoleculePrediction | RecordFailure]:
    """Predict record after record in their order, with flat memory; what could not be read is handed on as it is."""
    bundle = load_model(model)
    solvent = normalise_solvent(solvent) if solvent else None
    return predict_molecules(records, bundle, nucleus, solvent, coverage)


def predict_structures(
    structures: Iterable[Structure], nucleus: str = "both", solvent: str | None = None, coverage: float = 0.9, model=None
) -> list[MoleculePrediction]:
    """Predict a list of structures (see `iterate_predictions` for many)."""
    return list(iterate_predictions(structures, nucleus, solvent, coverage, model))


def predict(structure, nucleus: str = "both", solvent: str | None = None, coverage: float = 0.9, model=None):
    """Predict the shift of every nucleus with its interval.

    Parameters
    ----------
    structure : str, path, rdkit Mol or iterable of these
        A SMILES, a file, or '-' (see `shiftpred.structures.parse_structures`).
    nucleus : {'both', '13C', '1H'}
    solvent : str, optional
        Any common spelling; None: not reported.
    coverage : float, default 0.9
        How often an interval is meant to hold the observed value.
    model : str or ModelBundle, optional
        Folder of a trained model; default the shipped one.

    Returns
    -------
    pandas.DataFrame
        One row a site and nucleus with the columns `molecule, atom, nucleus, hydrogen, attached_h, equivalent_atoms, shift_ppm,
        lower_ppm, upper_ppm, coverage, environment, note`; a record that cannot be read has only `molecule` and `note`.

    Raises
    ------
    InputError
        If the source as a whole cannot be read.
    SettingError
        If an argument is outside what is accepted.

    Examples
    --------
    >>> import shiftpred
    >>> table = shiftpred.predict("CCO", nucleus="13C")
    >>> list(table.atom), list(table.attached_h)
    ([1, 2], [3, 2])
    """
    from shiftpred.reporting import build_prediction_frame

    records = parse_structures(structure)
    predictions = iterate_predictions(records, nucleus, solvent, coverage, model)
    return build_prediction_frame(predictions)


def explain(
    structure, atom_index: int, nucleus: str = "13C", solvent: str | None = None, coverage: float = 0.9, model=None
) -> Explanation:
    """Say why a shift lies where it lies.

    Parameters
    ----------
    structure : str, path or rdkit Mol
    atom_index : int
        0-based index of the heavy atom in the order of the input.
    nucleus : {'13C', '1H'}
    solvent, coverage, model
        As for `predict`.

    Returns
    -------
    Explanation
        Base, every substituent with its constants, and the environment model's remainder; the contributions add up to
        `shift_ppm` exactly.

    Raises
    ------
    InputError, SettingError
        As for `predict`; also if the atom does not exist or has no such nucleus.
    """
    from shiftpred.regression.explanation_parts import build_explanation_parts, build_measured_part

    bundle = load_model(model)
    read = parse_structure(structure)
    prediction = predict_structures([read], nucleus, solvent, coverage, bundle)[0]
    chosen, shift = select_nucleus(prediction, atom_index, nucleus)
    parts = build_explanation_parts(
        read, chosen.atom_index, nucleus, bundle.substituent_model, shift, prediction.solvent, build_measured_part(chosen)
    )
    return Explanation(
        read,
        nucleus,
        chosen.atom_index,
        chosen.atom,
        shift,
        chosen.lower_ppm,
        chosen.upper_ppm,
        coverage,
        parts,
        bundle.edition,
        read.notes,
    )


def compare(structure, c13=None, h1=None, solvent: str | None = None, model=None, **settings) -> Comparison:
    """Judge whether measured peaks bear a structure out.

    Parameters
    ----------
    structure : str, path, rdkit Mol, Structure or NmredataRecord
        An NMReDATA file brings its peaks and an assignment of its own, which is checked.
    c13, h1 : str, path, iterable of numbers, PeakList or None
        Plain numbers, journal text or a file; None: not measured. Where both are None, an NMReDATA file's own are taken.
    solvent : str, optional
        Any common spelling; None: the one that a list's heading states, if any.
    model : str or ModelBundle, optional
        Folder of a trained model; default the shipped one.
    **settings
        `coverage`, `frequency_mhz`, `rivals`, `mass_confirmed`, `prior`, `expected` (see `shiftpred.records.Settings`).

    Returns
    -------
    Comparison
        A prediction is evidence, not proof of identity; see its `cautions`.

    Raises
    ------
    InputError, SettingError
        If the structure or a peak list cannot be read, or a setting is outside what is accepted.

    Examples
    --------
    >>> import shiftpred
    >>> found = shiftpred.compare("CCOC(=O)c1ccccc1", c13=[166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3], solvent="CDCl3")
    >>> found.judgement
    'supported'
    """
    from shiftpred.judgement import (
        add_given_assignment,
        build_comparison,
        build_ionised_structures,
        build_judgement_map,
        build_settings,
        choose_lists,
        read_sample,
    )
    from shiftpred.peaks.nmredata import find_nmredata
    from shiftpred.structures.rivals import build_rivals

    bundle, asked = load_model(model), build_settings(solvent=solvent, **settings)
    given = find_nmredata(structure)
    proposal = parse_structure(given.structure if given else structure)
    peaks = read_sample(*choose_lists(given, c13, h1), asked)
    rivals = build_rivals(proposal, asked.rivals, asked.mass_confirmed)
    forms = build_ionised_structures(proposal)
    read = [proposal, *parse_listed_structures(r.smiles for r in rivals), *(form for form, _ in forms)]
    fits = _assign_structures(read, peaks, asked, bundle)
    main, ionised = fits[: 1 + len(rivals)], [(fit, how) for fit, (_, how) in zip(fits[1 + len(rivals) :], forms)]
    found = build_comparison(proposal, asked, peaks, main, rivals, build_judgement_map(bundle.judgement), ionised)
    return add_given_assignment(found, given)


def _assign_structures(read: list[Structure], peaks, asked, bundle: ModelBundle) -> list:
    """Predict structures and what is expected beside them, and assign the lists to each."""
    from shiftpred.assignment import assign_structure
    from shiftpred.judgement import choose_solvent

    beside = parse_listed_structures(asked.expected)
    predictions = predict_structures([*read, *beside], "both", choose_solvent(peaks, asked), asked.coverage, bundle)
    expected = tuple(predictions[len(read) :])
    return [assign_structure(p, peaks, expected) for p in predictions[: len(read)]]


def rank_structures(structures, c13=None, h1=None, solvent: str | None = None, model=None, **settings) -> Ranking:
    """Put candidate structures in order of how well they explain the peaks; a record that cannot be read is listed as failed.

    Parameters
    ----------
    structures : iterable of str, path, rdkit Mol, Structure or RecordFailure, or a file of them
        A text in an iterable is a structure, never the name of a file.
    c13, h1, solvent, model, **settings
        As for `compare`.

    Returns
    -------
    Ranking
        The same input always gives the same order; ties keep the order of the input.

    Raises
    ------
    InputError, SettingError
        As for `compare`; also if no candidate can be read.
    """
    from shiftpred.judgement import build_judgement_map, build_ranking, build_settings, read_sample, require_candidates

    bundle, asked = load_model(model), build_settings(solvent=solvent, **settings)
    peaks = read_sample(c13, h1, asked)
    positions, read, failures = require_candidates(parse_structures(structures))
    fits = _assign_structures(read, peaks, asked, bundle)
    return build_ranking(asked, peaks, fits, positions, build_judgement_map(bundle.judgement), bundle.edition, failures)


def rank(structures, c13=None, h1=None, solvent: str | None = None, model=None, **settings):
    """Rank candidate structures (see `rank_structures`).

    Returns
    -------
    pandas.DataFrame
        Columns `candidate` (0-based input position), `probability`, `misfit` (minus the log likelihood); best first.

    Examples
    --------
    >>> import shiftpred
    >>> list(shiftpred.rank(["CCC(=O)Oc1ccccc1", "CCOC(=O)c1ccccc1"], c13=[166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3]).candidate)
    [1, 0]
    """
    import pandas as pd

    found = rank_structures(structures, c13, h1, solvent, model, **settings).candidates
    return pd.DataFrame(
        [dict(candidate=r.candidate, probability=r.probability, misfit=r.misfit) for r in found],
        columns=["candidate", "probability", "misfit"],
    )
