"""Fit the parameters of the inductive and the resonance model to published constants, and test them group by group.

sigma_I, sigma* / 6.23 and F measure nearly the same thing, so they are fitted together: each kind of atom has one common
value, drawn by a ridge towards Cherkasov and Galkin's a Δχ R², and a deviation of each scale from it, drawn towards 0. A
group that is left out is left out of all three scales.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shiftpred.electronics.group_graph import GroupGraph, parse_group
from shiftpred.electronics.inductive import compute_atom_prior, compute_inverse_square_sums
from shiftpred.electronics.resonance import compute_resonance_terms
from shiftpred.electronics.sourced_tables import load_rows

__all__ = ["LeftOut", "fit_inductive", "fit_resonance", "load_published_means"]

_SCALES = {"sigma_I": 1.0, "sigma_star": 1 / 6.23, "F": 1.0}
"""sigma* = 6.23 sigma_I: Taft & Lewis, J. Am. Chem. Soc. 1958, 80, 2436 (from memory)."""
_WEIGHTS = {"sigma_I": 1.0, "sigma_star": 1.0, "F": 0.5}
_RIDGE_COMMON, _RIDGE_SCALE, _RIDGE_CONSTANT = 0.01, 0.1, 0.001
_RIDGE_RESONANCE = 0.1


@dataclass(frozen=True)
class LeftOut:
    """Published values beside those of a fit that never saw the group."""

    quantity: str
    groups: tuple[str, ...]
    published: np.ndarray
    """(n_groups,)"""
    predicted: np.ndarray
    """(n_groups,), each by the fit without that group."""

    @property
    def correlation(self) -> float:
        return float(np.corrcoef(self.published, self.predicted)[0, 1])

    @property
    def mean_error(self) -> float:
        return float(np.abs(self.published - self.predicted).mean())

    def worst(self, n: int = 8) -> list[tuple[str, float, float]]:
        """Return (group, published, predicted), largest differences first."""
        order = np.argsort(-np.abs(self.published - self.predicted))[:n]
        return [(self.groups[k], float(self.published[k]), float(self.predicted[k])) for k in order]


def load_published_means(quantity: str) -> dict[str, tuple[GroupGraph, float]]:
    """Return canonical SMILES → (group, mean of the published values) of the uncharged groups."""
    values: dict[str, list[float]] = {}
    for row in load_rows("substituent_constants"):
        if row["parameter"] == quantity:
            values.setdefault(parse_group(row["smiles"]).smiles, []).append(float(row["value"]))
    groups = {smiles: parse_group(smiles) for smiles in values}
    return {s: (groups[s], float(np.mean(found))) for s, found in values.items() if not groups[s].charge}


def fit_inductive() -> tuple[dict[str, dict[str, float]], list[LeftOut]]:
    """Fit σ0 and the σ_A of every kind of atom.

    Returns
    -------
    parameters : dict
        Scale → kind → value, with 'constant' (σ0) and 'prior' (a of a Δχ R²); Å² but for 'constant' and 'prior'.
    left_out : list of LeftOut
        For sigma_I and sigma*, in their own units.
    """
    known = {quantity: load_published_means(quantity) for quantity in _SCALES}
    sums = {s: compute_inverse_square_sums(g) for found in known.values() for s, (g, _) in found.items()}
    kinds = sorted({kind for found in sums.values() for kind, _ in found})
    prior_of = {kind: compute_atom_prior(symbol) for found in sums.values() for kind, symbol in found}
    n, scales = len(kinds), list(_SCALES)
    rows, target, groups, which = [], [], [], []
    for k, quantity in enumerate(scales):
        for smiles, (_, value) in known[quantity].items():
            row = np.zeros(n * (1 + len(scales)) + len(scales))
            for (kind, _), inverse in sums[smiles].items():
                row[[kinds.index(kind), n * (1 + k) + kinds.index(kind)]] += inverse
            row[n * (1 + len(scales)) + k] = 1
            rows.append(row)
            target.append(value * _SCALES[quantity])
            groups.append(smiles)
            which.append(quantity)
    x, y, groups, which = np.array(rows), np.array(target), np.array(groups), np.array(which)
    weight = np.array([_WEIGHTS[q] for q in which])
    ridge = np.repeat([_RIDGE_COMMON, _RIDGE_SCALE, _RIDGE_CONSTANT], [n, n * len(scales), len(scales)])
    prior = np.zeros(x.shape[1])
    prior[:n] = [prior_of[kind] for kind in kinds]

    def solve(keep: np.ndarray) -> tuple[np.ndarray, float]:
        along = x[keep] @ prior
        a = float(along @ y[keep] / (along @ along))
        left = y[keep] - a * along
        weighted = x[keep] * weight[keep, None]
        return a * prior + np.linalg.solve(x[keep].T @ weighted + np.diag(ridge), weighted.T @ left), a

    predicted = np.empty(len(y))
    for smiles in sorted(set(groups)):
        out = groups == smiles
        predicted[out] = x[out] @ solve(~out)[0]
    theta, a = solve(np.ones(len(y), dtype=bool))
    parameters, left_out = {}, []
    for k, quantity in enumerate(scales[:2]):
        unit = 1 / _SCALES[quantity]
        own = (theta[:n] + theta[n * (1 + k) : n * (2 + k)]) * unit
        parameters[quantity] = {
            "constant": float(theta[n * (1 + len(scales)) + k] * unit),
            "prior": a * unit,
            **dict(zip(kinds, own.tolist(), strict=True)),
        }
        here = which == quantity
        left_out.append(LeftOut(quantity, tuple(groups[here]), y[here] * unit, predicted[here] * unit))
    return parameters, left_out


def fit_resonance() -> tuple[dict[str, float], LeftOut]:
    """Fit the terms of R.

    Returns
    -------
    parameters : dict
        Term → value, with 'constant'.
    left_out : LeftOut
    """
    known = load_published_means("R")
    counts = {smiles: compute_resonance_terms(group) for smiles, (group, _) in known.items()}
    names = sorted({term for found in counts.values() for term in found})
    x = np.array([[1.0, *(found.get(name, 0.0) for name in names)] for found in counts.values()])
    y = np.array([value for _, value in known.values()])
    ridge = np.diag([1e-3, *[_RIDGE_RESONANCE] * len(names)])

    def solve(keep: np.ndarray) -> np.ndarray:
        return np.linalg.solve(x[keep].T @ x[keep] + ridge, x[keep].T @ y[keep])

    every = np.arange(len(y))
    predicted = np.array([x[k] @ solve(every != k) for k in every])
    theta = solve(every >= 0)
    return dict(zip(["constant", *names], theta.tolist(), strict=True)), LeftOut("R", tuple(known), y, predicted)
