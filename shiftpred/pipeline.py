"""START HERE: the way of a value, one line per step. Nothing is computed in this file.

text, file ─ structures ─ substituents ─ electronics ─ features ─ regression ─ calibration ─ assignment ─ judgement ─ reporting
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from shiftpred.bundles import ModelBundle, load_bundle, load_default_bundle
from shiftpred.peaks.solvents import normalise_solvent
from shiftpred.predicting import predict_molecules, select_nucleus
from shiftpred.records import Explanation, MoleculePrediction, RecordFailure, Structure
from shiftpred.structures.reading import parse_structure, parse_structures

__all__ = ["explain", "iterate_predictions", "load_model", "predict", "predict_structures"]


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
    from shiftpred.regression.explanation_parts import build_explanation_parts

    bundle = load_model(model)
    read = parse_structure(structure)
    prediction = predict_structures([read], nucleus, solvent, coverage, bundle)[0]
    chosen, shift = select_nucleus(prediction, atom_index, nucleus)
    parts = build_explanation_parts(read, chosen.atom_index, nucleus, bundle.substituent_model, shift, prediction.solvent)
    return Explanation(
        read, nucleus, chosen.atom_index, chosen.atom, shift, chosen.lower_ppm, chosen.upper_ppm, coverage, parts, bundle.edition,
        read.notes,
    )
