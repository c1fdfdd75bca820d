"""Fit the substituent model to observed shifts on known atoms, or by alternation to peak lists without atom numbers."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from rdkit import Chem
from sklearn.base import BaseEstimator, RegressorMixin
from sklearn.linear_model import Ridge
from sklearn.utils.validation import _check_sample_weight, check_is_fitted, validate_data

from shiftpred.errors import InputError
from shiftpred.features.site_rows import CONSTANT_LEVEL, CONSTANTS, compute_counted_places, compute_regressors
from shiftpred.records import NUCLEI
from shiftpred.regression.substituent_model import (
    BASE_PENALTIES,
    SOLVENT_PENALTY,
    NucleusTable,
    SubstituentModel,
    compute_base_terms,
    compute_place_penalties,
    compute_place_terms,
    compute_solvent_term,
)
from shiftpred.substituents.group_codes import compute_group_codes
from shiftpred.substituents.positions import POSITIONS
from shiftpred.training.assign_open_peaks import PeakPlacer
from shiftpred.training.open_tables import Compound
from shiftpred.training.settle_increments import compute_settled_increments

__all__ = [
    "ShrunkenRidge",
    "SubstituentDesign",
    "build_substituent_design",
    "compute_pull",
    "fit_substituent_model",
    "fit_to_peak_lists",
]

ALPHA = {"13C": 1.5, "1H": 3.0}
"""Ridge strength; found on the calibration split of the open tables."""
OUTLIER_PPM = {"13C": 3.0, "1H": 0.3}
"""Residuals beyond this pull linearly, not quadratically (Huber 1964, doi 10.1214/aoms/1177703732)."""
LEAST_SEEN = (2, 4)
"""Sites on which a term must have been seen: general terms (penalty below 2), special ones."""
CONSTANT_SCALE = 2.0
"""Weight of the constants against the increments before shrinkage: they explain first, increments what is left."""
NEGLIGIBLE_PPM = {"13C": 0.02, "1H": 0.002}
"""Increments smaller than this are left out of the finished model."""


class ShrunkenRidge(RegressorMixin, BaseEstimator):
    """Ridge regression with a scale for every column and resistance to outliers.

    Parameters
    ----------
    alpha : float, default 1.0
        Ridge strength on the scaled columns.
    column_scale : array-like of shape (n_features,) or None, default None
        Factor for every column; a column with a small factor is shrunk more strongly. None: 1 for all.
    outlier : float or None, default None
        Residual in the unit of y beyond which the pull grows linearly instead of quadratically. None: least squares.
    n_reweightings : int, default 2
        Fits with new weights after the first; not used without `outlier`.
    tol : float, default 1e-4
        Tolerance of the iterative solver.

    Attributes
    ----------
    coef_ : ndarray of shape (n_features,)
        On the columns as given, not as scaled.
    intercept_ : float
    n_features_in_ : int
    feature_names_in_ : ndarray of shape (n_features_in_,)
        Only where X had names.

    References
    ----------
    Hoerl and Kennard, Technometrics 1970, 12, 55 (doi 10.1080/00401706.1970.10488634).

    Examples
    --------
    >>> import numpy as np
    >>> X, y = np.array([[0.0], [1.0], [2.0]]), np.array([1.0, 3.0, 5.0])
    >>> ShrunkenRidge(alpha=1e-9).fit(X, y).predict(X).round(3)
    array([1., 3., 5.])
    """

    def __init__(self, alpha=1.0, column_scale=None, outlier=None, n_reweightings=2, tol=1e-4):
        self.alpha = alpha
        self.column_scale = column_scale
        self.outlier = outlier
        self.n_reweightings = n_reweightings
        self.tol = tol

    def __sklearn_tags__(self):
        tags = super().__sklearn_tags__()
        tags.input_tags.sparse = True
        return tags

    def fit(self, X, y, sample_weight=None):
        """Fit.

        Parameters
        ----------
        X : array-like or sparse matrix of shape (n_samples, n_features)
        y : array-like of shape (n_samples,)
        sample_weight : array-like of shape (n_samples,) or None, default None

        Returns
        -------
        self
        """
        X, y = validate_data(self, X, y, accept_sparse="csr", y_numeric=True, dtype=[np.float64, np.float32])
        weight = _check_sample_weight(sample_weight, X, dtype=X.dtype)
        scale = np.ones(X.shape[1]) if self.column_scale is None else np.asarray(self.column_scale, dtype=float)
        if scale.shape != (X.shape[1],):
            raise ValueError(f"column_scale has shape {scale.shape}, expected ({X.shape[1]},)")
        scaled = X @ sp.diags_array(scale.astype(X.dtype)) if sp.issparse(X) else X * scale.astype(X.dtype)
        solver = "lsqr" if sp.issparse(X) else "auto"
        pull = np.ones(len(y), dtype=X.dtype)
        for _ in range(1 + (self.n_reweightings if self.outlier else 0)):
            inner = Ridge(alpha=self.alpha, solver=solver, tol=self.tol)
            inner.fit(scaled, y, sample_weight=weight * pull)
            if self.outlier:
                pull = compute_pull(y - inner.predict(scaled), self.outlier).astype(X.dtype)
        self.coef_ = inner.coef_ * scale
        self.intercept_ = float(inner.intercept_)
        return self

    def predict(self, X):
        """Predict.

        Parameters
        ----------
        X : array-like or sparse matrix of shape (n_samples, n_features)

        Returns
        -------
        ndarray of shape (n_samples,)
        """
        check_is_fitted(self)
        X = validate_data(self, X, accept_sparse="csr", reset=False, dtype=[np.float64, np.float32])
        return X @ self.coef_ + self.intercept_


def compute_pull(residual: np.ndarray, outlier: float) -> np.ndarray:
    """Return Huber's weights: 1 inside `outlier`, outlier / |residual| beyond."""
    return np.minimum(1.0, outlier / np.maximum(np.abs(residual), 1e-12))


@dataclass(frozen=True)
class SubstituentDesign:
    """All sites of many molecules as sparse rows; sites with the same terms share one row."""

    rows: sp.csr_array
    """(n_rows, n_columns) float32: first one column for each (coarse class, position, constant), then the terms."""
    site_rows: list[np.ndarray]
    """One (n_atoms,) array for each molecule: row of each atom, -1 where it bears neither nucleus."""
    is_carbon: list[np.ndarray]
    bears_hydrogen: list[np.ndarray]
    classes: tuple[str, ...]
    terms: tuple[str, ...]
    penalties: np.ndarray
    """(n_terms,)"""

    @property
    def n_constant_columns(self) -> int:
        return len(self.classes) * len(POSITIONS) * len(CONSTANTS)

    def predict(self, model: SubstituentModel) -> list[np.ndarray]:
        """Predict all molecules of the design at once, as (n_atoms, 2) arrays [13C, 1H]; nan: no site."""
        columns = []
        for nucleus in NUCLEI:
            table = model.tables[nucleus]
            beta = np.zeros(self.rows.shape[1])
            places = {name: k for k, name in enumerate(table.classes)}
            block = len(POSITIONS) * len(CONSTANTS)
            for k, name in enumerate(self.classes):
                if name in places:
                    beta[k * block : (k + 1) * block] = table.coefficients[places[name]].ravel()
            start = self.n_constant_columns
            beta[start:] = [table.increments.get(term, 0.0) for term in self.terms]
            columns.append(self.rows @ beta + table.intercept)
        both = np.stack(columns, axis=1)
        out = []
        for index, carbon, hydrogen in zip(self.site_rows, self.is_carbon, self.bears_hydrogen, strict=True):
            y = both[index]
            y[~carbon, 0] = np.nan
            y[~hydrogen, 1] = np.nan
            out.append(y)
        return out


def build_substituent_design(
    mols: Sequence[Chem.Mol],
    solvents: Sequence[str | None] | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> SubstituentDesign:
    """Describe every site of many molecules once, for any number of fits.

    Parameters
    ----------
    mols : sequence of rdkit.Chem.Mol
    solvents : sequence of str or None, default None
        Short name of each molecule's solvent; None: not known.
    progress : callable (done, of) or None, default None

    Returns
    -------
    SubstituentDesign
    """
    numbers: dict[str, int] = {}
    penalties: list[float] = []
    classes: dict[str, int] = {}
    known: dict[bytes, int] = {}
    term_rows, constant_rows, site_rows, is_carbon, bears_hydrogen = [], [], [], [], []
    width = len(POSITIONS) * len(CONSTANTS)
    position_number = {name: k for k, name in enumerate(POSITIONS)}

    def number(term: str, penalty: float) -> int:
        found = numbers.setdefault(term, len(numbers))
        if found == len(penalties):
            penalties.append(penalty)
        return found

    for done, mol in enumerate(mols):
        codes = compute_group_codes(mol)
        carbon = np.array([symbol.rstrip("+-") in ("C", "c") for symbol in codes.atoms], dtype=bool)
        hydrogen = np.array(codes.hydrogens) > 0
        ranks = list(Chem.CanonicalRankAtoms(mol, breakTies=False))
        by_rank: dict[int, int] = {}
        index = np.full(codes.n_atoms, -1)
        solvent = solvents[done] if solvents else None
        for i in np.flatnonzero(carbon | hydrogen):
            if ranks[i] in by_rank:
                index[i] = by_rank[ranks[i]]
                continue
            fine, coarse, base = compute_base_terms(codes, i)
            entries = [number(t, p) for t, p in zip(base, BASE_PENALTIES, strict=True)]
            sums = np.zeros((len(POSITIONS), len(CONSTANTS)))
            for place in compute_counted_places(codes, i):
                terms = compute_place_terms(codes, fine, coarse, place)
                entries += [number(t, p) for t, p in zip(terms, compute_place_penalties(place), strict=True)]
                code = codes.levels[CONSTANT_LEVEL][place.parent][place.atom]
                sums[position_number[place.position]] += compute_regressors(code)
            if solvent:
                entries.append(number(compute_solvent_term(coarse, solvent), SOLVENT_PENALTY))
            entries = np.sort(np.array(entries, dtype=np.int32))
            sums = sums.ravel().round(6)
            key = entries.tobytes() + sums.tobytes()
            row = known.get(key)
            if row is None:
                row = known[key] = len(known)
                start = classes.setdefault(coarse, len(classes)) * width
                filled = np.flatnonzero(sums)
                term_rows.append(entries)
                constant_rows.append((filled + start, sums[filled]))
            by_rank[ranks[i]] = index[i] = row
        site_rows.append(index)
        is_carbon.append(carbon)
        bears_hydrogen.append(hydrogen)
        if progress:
            progress(done + 1, len(mols))
    if not known:
        raise InputError("argument 'mols'", "no carbon and no hydrogen", "molecules with sites", "check the structures")
    offset = len(classes) * width
    columns = [np.concatenate((c, t + offset)) for (c, _), t in zip(constant_rows, term_rows, strict=True)]
    values = [np.concatenate((v, np.ones(len(t)))) for (_, v), t in zip(constant_rows, term_rows, strict=True)]
    ends = np.cumsum([0] + [len(c) for c in columns])
    rows = sp.csr_array(
        (np.concatenate(values).astype(np.float32), np.concatenate(columns).astype(np.int32), ends.astype(np.int32)),
        shape=(len(columns), offset + len(numbers)),
    )
    rows.sum_duplicates()
    return SubstituentDesign(rows, site_rows, is_carbon, bears_hydrogen, tuple(classes), tuple(numbers), np.array(penalties))


def fit_substituent_model(
    mols: Sequence[Chem.Mol],
    targets: Sequence[np.ndarray],
    sample_weight: Sequence[float] | None = None,
    solvents: Sequence[str | None] | None = None,
    design: SubstituentDesign | None = None,
    alpha: dict[str, float] | None = None,
) -> SubstituentModel:
    """Fit the substituent model to observed shifts on known atoms.

    Parameters
    ----------
    mols : sequence of rdkit.Chem.Mol
        Sanitised, hydrogens implicit.
    targets : sequence of ndarray of shape (n_atoms, 2)
        Observed [13C, 1H] of each atom in ppm; nan: not observed.
    sample_weight : sequence of float or None, default None
        One for each molecule.
    solvents : sequence of str or None, default None
        Short name of each molecule's solvent; None: not known.
    design : SubstituentDesign or None, default None
        From `build_substituent_design(mols, solvents)`, if the same molecules are fitted more than once.
    alpha : dict of str to float or None, default None
        Ridge strength by nucleus; None: `ALPHA`.

    Returns
    -------
    SubstituentModel

    Raises
    ------
    InputError
        If the numbers of molecules, targets or atoms do not fit together, or nothing was observed.
    """
    _require_matching(mols, targets)
    design = design or build_substituent_design(mols, solvents)
    index = np.concatenate(design.site_rows)
    observed = np.concatenate([np.asarray(t, dtype=float) for t in targets])
    weight = np.ones(len(index))
    if sample_weight is not None:
        weight = np.repeat(np.asarray(sample_weight, dtype=float), [len(t) for t in targets])
    tables, counts = {}, {}
    for column, nucleus in enumerate(NUCLEI):
        used = (index >= 0) & ~np.isnan(observed[:, column])
        strength = (alpha or ALPHA)[nucleus]
        tables[nucleus] = _fit_table(design, nucleus, index[used], observed[used, column], weight[used], strength)
        counts[nucleus] = int(used.sum())
    return SubstituentModel(tables, {"sites": counts, "molecules": len(mols), "alpha": dict(alpha or ALPHA)})


def fit_to_peak_lists(
    compounds: Sequence[Compound], n_rounds: int = 4, log: Callable[[str], None] | None = None
) -> tuple[SubstituentModel, list[np.ndarray]]:
    """Fit the substituent model to peak lists without atom numbers: fit, predict, assign, and again.

    The first fit uses the peaks whose hydrogen count leaves only one kind of atom.

    Parameters
    ----------
    compounds : sequence of Compound
        From `load_open_tables`; those with more site labels than atoms are left out.
    n_rounds : int, default 4
        Fits; between two of them every compound's peaks are assigned anew.
    log : callable or None, default None
        Gets one line a round.

    Returns
    -------
    SubstituentModel
    list of ndarray of shape (n_atoms, 2)
        The last assignment [13C, 1H] of each compound; all nan for one that was left out.
    """
    placers = [PeakPlacer(compound) for compound in compounds]
    mols = [compound.mol for compound in compounds]
    values = [np.stack((compound.c13, compound.h1), axis=1) for compound in compounds]
    design = build_substituent_design(mols)
    targets = [p.place(v, p.assign_unambiguous()) for p, v in zip(placers, values, strict=True)]
    for number in range(1, n_rounds + 1):
        model = fit_substituent_model(mols, targets, design=design)
        predicted = design.predict(model)
        targets = [p.place(v, p.assign(y)) for p, v, y in zip(placers, values, predicted, strict=True)]
        if log:
            error = np.abs(np.concatenate(targets) - np.concatenate(predicted))
            n_placed = (~np.isnan(error)).sum(axis=0)
            mean = np.nanmean(error, axis=0)
            log(
                f"substituent model, round {number} of {n_rounds}: {n_placed[0]} carbons at {mean[0]:.2f} ppm, "
                f"{n_placed[1]} hydrogen-bearing atoms at {mean[1]:.3f} ppm (training, mean absolute)"
            )
    return model, targets


def _fit_table(design, nucleus, index, y, weight, alpha) -> NucleusTable:
    n_constants = design.n_constant_columns
    if not len(y):
        raise InputError("argument 'targets'", f"no {nucleus} shift", "at least one", "leave the other nucleus out")
    present, index = np.unique(index, return_inverse=True)
    rows = design.rows[present]
    seen = np.bincount(index, minlength=len(present))
    count = (rows != 0).astype(np.float32).T @ seen
    least = np.where(design.penalties < 2, LEAST_SEEN[0], LEAST_SEEN[1])
    keep = np.concatenate((count[:n_constants] > 0, count[n_constants:] >= least))
    kept = np.flatnonzero(keep)
    rows = rows[:, kept]
    scale = 2.0 ** (-0.5 * np.concatenate((np.zeros(n_constants), design.penalties)))[kept]
    # Constants are brought to a common spread, so that a unit does not decide how much one is shrunk.
    n_first = int((kept < n_constants).sum())
    total = rows.multiply(rows).T @ seen / np.maximum(count[kept], 1)
    scale[:n_first] = CONSTANT_SCALE / np.sqrt(np.maximum(total[:n_first], 1e-6))
    pull = np.ones(len(y))
    for _ in range(3):
        # Sites that share a row enter as their weighted mean: the same normal equations, far fewer rows.
        w = weight * pull
        mass = np.bincount(index, weights=w, minlength=len(present))
        mean = np.bincount(index, weights=w * y, minlength=len(present)) / np.maximum(mass, 1e-12)
        ridge = ShrunkenRidge(alpha=alpha, column_scale=scale).fit(rows, mean, sample_weight=mass)
        pull = compute_pull(y - ridge.predict(rows)[index], OUTLIER_PPM[nucleus])
    beta = np.zeros(design.rows.shape[1])
    beta[kept] = ridge.coef_
    coefficients = beta[:n_constants].reshape(len(design.classes), len(POSITIONS), len(CONSTANTS))
    fitted = [k for k in kept if k >= n_constants]
    terms = [design.terms[k - n_constants] for k in fitted]
    settled = compute_settled_increments(
        dict(zip(terms, beta[fitted].tolist(), strict=True)), dict(zip(terms, count[fitted].tolist(), strict=True))
    )
    # Rounded to the precision in which they are stored, so that a reloaded model predicts the same.
    increments = {t: float(np.float32(v)) for t, v in settled.items() if abs(v) >= NEGLIGIBLE_PPM[nucleus]}
    return NucleusTable(ridge.intercept_, increments, design.classes, coefficients)


def _require_matching(mols, targets) -> None:
    if len(mols) != len(targets) or not len(mols):
        raise InputError(
            "argument 'targets'",
            f"{len(targets)} arrays for {len(mols)} molecules",
            "one (n_atoms, 2) array for each molecule",
            "targets=[array, …] in the order of mols",
        )
    for k, (mol, target) in enumerate(zip(mols, targets, strict=True)):
        if np.shape(target) != (mol.GetNumAtoms(), 2):
            raise InputError(
                f"argument 'targets', entry {k}",
                f"an array of shape {np.shape(target)}",
                f"shape ({mol.GetNumAtoms()}, 2): [13C, 1H] for each atom",
                "nan where nothing was observed",
            )
