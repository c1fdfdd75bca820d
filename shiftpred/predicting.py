"""From structures to predicted nuclei: arrays, network, solvent, intervals; in batches, so that memory stays flat."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from itertools import islice

import numpy as np

from shiftpred.bundles import ModelBundle
from shiftpred.calibration.error_size import ErrorSize
from shiftpred.calibration.intervals import require_coverage
from shiftpred.calibration.novelty import NEW_NEIGHBOURS, NEW_SURROUNDINGS, compute_surroundings_codes
from shiftpred.errors import SettingError, quote
from shiftpred.features.concentric_environments import RADII, compute_environment_codes
from shiftpred.features.molecule_arrays import MoleculeArrays, build_molecule_arrays, join_molecule_arrays
from shiftpred.features.solvents import SOLVENTS
from shiftpred.records import MoleculePrediction, NucleusPrediction, RecordFailure, Structure
from shiftpred.regression.environment_memory import EnvironmentMemory, Recollection
from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.structures.sites import compute_sites

__all__ = ["predict_molecules", "predict_values", "require_nucleus", "select_nucleus"]

_BATCH = 64
_NOVELTY_NOTE = {
    NEW_SURROUNDINGS: "surroundings not in the training data",
    NEW_NEIGHBOURS: "unlike the training data",
}
_NUCLEUS_CHOICES = {"13C": ("13C",), "1H": ("1H",), "both": ("13C", "1H")}


def require_nucleus(nucleus: str) -> tuple[str, ...]:
    """Return the nuclei that `nucleus` ('13C', '1H' or 'both') names.

    Raises
    ------
    SettingError
        For anything else.
    """
    if nucleus not in _NUCLEUS_CHOICES:
        raise SettingError("nucleus", quote(nucleus), "'13C', '1H' or 'both'", "nucleus='both'")
    return _NUCLEUS_CHOICES[nucleus]


def predict_molecules(
    structures: Iterable[Structure | RecordFailure],
    bundle: ModelBundle,
    nucleus: str = "both",
    solvent: str | None = None,
    coverage: float = 0.9,
) -> Iterator[MoleculePrediction | RecordFailure]:
    """Predict every nucleus of every structure, in order, batch by batch.

    Parameters
    ----------
    structures : iterable of Structure or RecordFailure
        Failures are handed on in their place.
    bundle : ModelBundle
    nucleus : {'13C', '1H', 'both'}
    solvent : str, optional
        Short name as `shiftpred.peaks.solvents.normalise_solvent` gives it; None: not reported.
    coverage : float
        How often the interval is meant to hold the observed value.

    Yields
    ------
    MoleculePrediction or RecordFailure

    Raises
    ------
    SettingError
        At once, if nucleus or coverage are outside what is accepted.
    """
    nuclei, coverage = require_nucleus(nucleus), require_coverage(coverage)
    known = solvent if solvent in SOLVENTS else "other" if solvent else ""
    return _iterate(iter(structures), bundle, nuclei, known, solvent, coverage)


def _iterate(source, bundle, nuclei, known, solvent, coverage):
    while batch := list(islice(source, _BATCH)):
        readable = [s for s in batch if not isinstance(s, RecordFailure)]
        predicted = iter(_predict_batch(readable, bundle, nuclei, known, solvent, coverage) if readable else ())
        for record in batch:
            yield record if isinstance(record, RecordFailure) else next(predicted)


def select_nucleus(prediction: MoleculePrediction, atom_index: int, nucleus: str) -> tuple[NucleusPrediction, float]:
    """Return the row of one nucleus and its shift in ppm (of two differing hydrogens: the first row and their mean).

    Raises
    ------
    SettingError
        If the atom does not exist or bears no such nucleus.
    """
    rows = [n for n in prediction.nuclei if n.atom_index == atom_index and n.nucleus == nucleus]
    if not rows:
        atoms = [n.atom for n in prediction.nuclei if n.nucleus == nucleus and n.hydrogen in ("", "a")]
        raise SettingError(
            "atom",
            f"atom_index {atom_index!r}, which has no {nucleus} here",
            f"an atom with a {nucleus} nucleus (numbers from 1: {', '.join(map(str, atoms[:30])) or 'none'})",
            "atom numbers on the command line count from 1, atom_index in Python from 0",
        )
    return rows[0], sum(r.shift_ppm for r in rows) / len(rows)


def predict_values(
    graph: MoleculeArrays, network: EnvironmentModel, memory: EnvironmentMemory, error_size: ErrorSize, solvent: int = 0
) -> tuple[np.ndarray, np.ndarray, Recollection]:
    """Predict the atoms of a graph: network, memory of measured surroundings, solvent.

    Parameters
    ----------
    graph : MoleculeArrays
        Of one molecule or of several joined.
    network, memory, error_size
        Of a model.
    solvent : int, default 0
        Index into `SOLVENTS`; 0: not reported.

    Returns
    -------
    values : ndarray of shape (n_atoms, 3)
        13C shift, 1H shift, half gap of a CH2's hydrogens, in ppm; meaningful only where the atom is a carbon or bears a
        hydrogen.
    scales : ndarray of shape (n_atoms, 2)
        Raw size of the error of 13C and 1H, in ppm, before calibration.
    known : Recollection
        What the memory contributed.
    """
    values, scales, inner = network.predict_raw(graph)
    if solvent:
        values[:, :2] += network.predict_solvent_effect(inner, solvent)
    values, scales = values.astype(float), scales.astype(float)
    known = memory.recall(compute_environment_codes(graph))
    values[:, :2] += known.correction
    return values, error_size.compute(scales, known), known


def _predict_batch(batch, bundle, nuclei, known_solvent, solvent, coverage):
    graph, offsets = join_molecule_arrays([build_molecule_arrays(s.mol) for s in batch])
    values, scales, known = predict_values(
        graph, bundle.environment_model, bundle.memory, bundle.error_size, SOLVENTS.index(known_solvent) if known_solvent else 0
    )
    levels = bundle.novelty.compute_levels(compute_surroundings_codes(graph))
    for structure, begin, end in zip(batch, offsets[:-1], offsets[1:]):
        part = slice(begin, end)
        measured = known.correction[part], known.counts[part]
        yield _build_prediction(
            structure, bundle, nuclei, solvent, coverage, values[part], scales[part], levels[part], measured
        )


def _build_prediction(structure, bundle, nuclei, solvent, coverage, values, scales, levels, measured):
    sites = compute_sites(structure)
    rows: list[NucleusPrediction] = []
    for column, nucleus in enumerate(("13C", "1H")):
        if nucleus not in nuclei:
            continue
        shared = _average_over_equivalent(sites, values[:, column], scales[:, column])
        for site in sites:
            if (site.element != "C") if nucleus == "13C" else (site.attached_h == 0):
                continue
            i, environment = site.atom_index, site.environment
            shift, scale = shared[i]
            level = int(levels[i])
            scale *= bundle.intervals.compute_novelty_factor(nucleus, level)
            half = scale * bundle.intervals.compute_factor(nucleus, environment, coverage)
            t_scale, degrees = bundle.intervals.compute_student(nucleus, environment)
            note = _build_note(site, nucleus, level)
            equivalent = tuple(structure.atom_numbers[j] for j in site.equivalent)
            if nucleus == "1H" and site.geminal_differ:
                gap = float(values[i, 2])
                placed = (("a", shift + gap), ("b", shift - gap))
            else:
                placed = (("", shift),)
            sites_alike, bonds_alike = _find_widest(measured[1][i, :, column])
            for hydrogen, ppm in placed:
                # One answer on every machine and for every batch size: float32 sums differ in their last digits, four
                # decimals do not.
                ppm = round(ppm, 4)
                rows.append(
                    NucleusPrediction(
                        nucleus,
                        i,
                        site.atom,
                        hydrogen,
                        site.attached_h,
                        equivalent,
                        ppm,
                        round(ppm - half, 4),
                        round(ppm + half, 4),
                        coverage,
                        scale * t_scale,
                        degrees,
                        environment,
                        nucleus == "1H" and site.labile,
                        note,
                        round(float(measured[0][i, column]), 4),
                        sites_alike,
                        bonds_alike,
                    )
                )
    return MoleculePrediction(structure, sites, tuple(rows), solvent, bundle.edition, structure.notes)


def _find_widest(counts: np.ndarray) -> tuple[int, int]:
    """Return how many measured atoms are alike out to the largest number of bonds for which there are any, and that number."""
    for k in range(RADII - 1, -1, -1):
        if counts[k]:
            return int(counts[k]), k + 1
    return 0, 0


def _average_over_equivalent(sites, values, scales):
    """Return (shift, scale) by atom index; equivalent sites share one value to the last digit."""
    shift, scale = values.tolist(), scales.tolist()
    shared: dict[int, tuple[float, float]] = {}
    for site in sites:
        members = site.equivalent
        if site.atom_index not in shared:
            both = (sum(shift[j] for j in members) / len(members), sum(scale[j] for j in members) / len(members))
            shared.update(dict.fromkeys(members, both))
    return shared


def _build_note(site, nucleus, level):
    parts = []
    if level in _NOVELTY_NOTE:
        parts.append(_NOVELTY_NOTE[level])
    if nucleus == "1H" and site.labile:
        parts.append("exchangeable: anywhere, broad or absent")
    if site.deuterium:
        parts.append("carries deuterium")
    if site.diastereotopic and not site.geminal_differ:
        parts.append("diastereotopic or slow to exchange with an equal group: may give a line of its own")
    return "; ".join(parts)
