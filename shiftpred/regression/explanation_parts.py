"""Take a predicted shift apart: base, every substituent, and last what the environment model adds."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from rdkit import Chem

from shiftpred.features.site_rows import compute_site_class
from shiftpred.records import NUCLEI, Contribution, NucleusPrediction, Structure
from shiftpred.regression.substituent_model import SubstituentModel
from shiftpred.substituents.group_codes import compute_group_codes

__all__ = ["LARGE_QUANTILE", "LEAST_SITES", "build_explanation_parts", "build_measured_part", "compute_residual_scale"]

LARGE_QUANTILE = 0.95
"""A remainder is called large beyond this quantile of |remainder| in its class of sites."""
LEAST_SITES = 100
"""Classes with fewer sites than this use the quantile of all sites."""


def build_explanation_parts(
    structure: Structure,
    atom_index: int,
    nucleus: str,
    model: SubstituentModel,
    total_shift: float,
    solvent: str | None = None,
    measured: Contribution | None = None,
) -> tuple[Contribution, ...]:
    """List what makes up a predicted shift.

    Parameters
    ----------
    structure : Structure
    atom_index : int
        0-based index of the site.
    nucleus : {'13C', '1H'}
    model : SubstituentModel
    total_shift : float
        The full prediction in ppm.
    solvent : str or None, default None
        Short name, if the prediction was made for one.
    measured : Contribution or None, default None
        What training atoms measured in the same surroundings add (`build_measured_part`).

    Returns
    -------
    tuple of Contribution
        Base, substituents at alpha, beta and gamma (and para), solvent, measured surroundings, and last the remainder: what
        the network sees beyond the substituents. 'large remainder' flags it where total - substituent model is beyond the 95th
        percentile of its class. They add up to `total_shift`.

    Raises
    ------
    SettingError
        If the nucleus is unknown or the atom does not bear it.
    """
    parts = model.contributions(structure.mol, atom_index, nucleus, solvent)
    lines = [
        Contribution(
            label=part.label,
            kind=part.kind,
            position=part.position,
            group=part.group,
            atoms=tuple(structure.atom_numbers[a] for a in part.atoms),
            constants=part.constants,
            contribution_ppm=part.contribution_ppm,
        )
        for part in parts
    ]
    remainder = total_shift - sum(line.contribution_ppm for line in lines)
    _, coarse = compute_site_class(compute_group_codes(structure.mol), atom_index)
    scale = model.tables[nucleus].residual_scale
    usual = scale.get(coarse, scale.get("", float("inf")))
    flag = "large remainder" if abs(remainder) > usual else ""
    if measured is not None:
        lines.append(measured)
        remainder -= measured.contribution_ppm
    lines.append(Contribution("environment model, remainder", "remainder", "", "", (), {}, remainder, flag))
    return tuple(lines)


def build_measured_part(chosen: NucleusPrediction) -> Contribution | None:
    """Return the line for training atoms that were measured in the same surroundings; None where there are none.

    Examples
    --------
    >>> import shiftpred
    >>> line = [part for part in shiftpred.explain("CCO", 0).contributions if part.kind == "measured"]
    >>> len(line)
    1
    """
    if not chosen.measured_sites:
        return None
    many = "1 training atom" if chosen.measured_sites == 1 else f"{chosen.measured_sites} training atoms"
    bonds = "1 bond" if chosen.measured_bonds == 1 else f"{chosen.measured_bonds} bonds"
    return Contribution(f"measured: {many} alike out to {bonds}", "measured", "", "", (), {}, chosen.measured_ppm)


def compute_residual_scale(
    model: SubstituentModel, mols: Iterable[Chem.Mol], totals: Iterable[np.ndarray]
) -> dict[str, dict[str, float]]:
    """Find how large the remainder usually is, for `SubstituentModel.set_residual_scale`.

    Parameters
    ----------
    model : SubstituentModel
    mols : iterable of rdkit.Chem.Mol
        A few thousand molecules that the model was not fitted to.
    totals : iterable of ndarray of shape (n_atoms, 2)
        The full model's prediction [13C, 1H] for each, ppm; nan: none.

    Returns
    -------
    dict of str to dict
        Nucleus → coarse class → 95th percentile of |total - substituent model| in ppm; '' holds that of all sites,
        which classes with fewer than 100 sites use.

    Examples
    --------
    >>> scale = compute_residual_scale(model, mols, totals)  # doctest: +SKIP
    >>> for nucleus, table in scale.items():  # doctest: +SKIP
    ...     model.set_residual_scale(nucleus, table)
    """
    found: dict[str, dict[str, list[float]]] = {nucleus: {} for nucleus in NUCLEI}
    for mol, total in zip(mols, totals, strict=True):
        codes = compute_group_codes(mol)
        for column, nucleus in enumerate(NUCLEI):
            remainder = np.abs(np.asarray(total)[:, column] - model.predict(mol, nucleus, codes=codes))
            for i in np.flatnonzero(~np.isnan(remainder)):
                found[nucleus].setdefault(compute_site_class(codes, i)[1], []).append(remainder[i])
    out = {}
    for nucleus, classes in found.items():
        together = [value for values in classes.values() for value in values]
        out[nucleus] = {
            name: float(np.quantile(values, LARGE_QUANTILE))
            for name, values in sorted(classes.items())
            if len(values) >= LEAST_SITES
        }
        if together:
            out[nucleus][""] = float(np.quantile(together, LARGE_QUANTILE))
    return out
