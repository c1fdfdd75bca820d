"""Raw error size → prediction interval at a nominal coverage, conformal by environment class.

The score of a calibration site is |observed - predicted| in units of its raw error size; the interval of a new site is its raw
error size times a quantile of the scores of its class. A class with too few molecules borrows from the next coarser one.

References
----------
Vovk, Gammerman & Shafer, Algorithmic Learning in a Random World, Springer 2005 (conformal prediction, by category).
Romano, Patterson & Candès, Conformalized Quantile Regression, NeurIPS 2019 (scaled scores).
Barber, Candès, Ramdas & Tibshirani, Ann. Statist. 2021, 49, 486 (what remains true without exchangeability).
"""

from __future__ import annotations

import math

import numpy as np

from shiftpred.errors import SettingError
from shiftpred.structures.environments import coarser_environment

__all__ = ["IntervalTable", "LEVELS", "compute_weighted_quantiles", "fit_interval_table", "require_coverage"]

LEVELS = tuple(np.round(np.concatenate([np.arange(0.05, 0.90, 0.05), np.arange(0.90, 0.99, 0.01), [0.99, 0.995, 0.999]]), 4))
"""Coverages at which quantiles are stored; between them the logarithm of the quantile is interpolated."""
_FEWEST_MOLECULES = 60


def require_coverage(coverage: float) -> float:
    """Return `coverage` if an interval can be given for it.

    Raises
    ------
    SettingError
        Unless 0.05 <= coverage <= 0.999.
    """
    if isinstance(coverage, bool) or not isinstance(coverage, (int, float)) or not 0.05 <= coverage <= 0.999:
        raise SettingError("coverage", repr(coverage), "a number from 0.05 to 0.999", "coverage=0.9")
    return float(coverage)


def compute_weighted_quantiles(scores: np.ndarray, weights: np.ndarray, levels) -> np.ndarray:
    """Return conformal quantiles of weighted scores: the smallest score at which the weight reaches `level` of the total and
    one further case of mean weight at infinity (so that small sets give wide intervals); inf where it never does."""
    order = np.argsort(scores, kind="stable")
    s, w = scores[order], weights[order]
    total = np.cumsum(w)
    goal = np.asarray(levels) * (total[-1] + w.mean())
    place = np.searchsorted(total, goal * (1 - 1e-12))
    return np.where(place < len(s), s[np.minimum(place, len(s) - 1)], np.inf)


def fit_interval_table(nucleus: str, environments, scores, molecules, novelty) -> dict:
    """Fit the table of one nucleus.

    Parameters
    ----------
    nucleus : str
    environments : sequence of str
        (n_sites,) environment class.
    scores : ndarray of shape (n_sites,)
        |observed - predicted| / raw error size.
    molecules : ndarray of shape (n_sites,)
        Which molecule each site belongs to; every molecule weighs the same within a class up to five of its sites.
    novelty : ndarray of shape (n_sites,)
        Level of novelty of each site.

    Returns
    -------
    dict
        JSON-ready: 'classes' {name: {sites, molecules, quantiles, t_scale, t_degrees}}, 'novelty' {level: factor}.
    """
    environments, molecules = np.asarray(environments), np.asarray(molecules)
    factors = {"0": 1.0}
    familiar = np.median(scores[novelty == 0])
    for level in (1, 2):
        here = novelty == level
        # At least wider by a fifth for each level, also where few such sites are at hand to show it.
        factor = float(np.median(scores[here]) / familiar) if here.sum() >= 50 else 1.0
        factors[str(level)] = round(max(factor, factors[str(level - 1)] * 1.2), 4)
    adjusted = scores / np.array([factors[str(k)] for k in novelty])
    groups: dict[str, list[int]] = {}
    for i, name in enumerate(environments):
        for each in _chain(name, nucleus):
            groups.setdefault(each, []).append(i)
    classes = {}
    for name, members in sorted(groups.items()):
        members = np.array(members)
        own = molecules[members]
        count = len(np.unique(own))
        if count < _FEWEST_MOLECULES and name != nucleus:
            continue
        _, place, sites = np.unique(own, return_inverse=True, return_counts=True)
        weights = 1.0 / np.maximum(sites[place], 1) * np.minimum(sites[place], 5)
        s = adjusted[members]
        quantiles = compute_weighted_quantiles(s, weights, LEVELS)
        t_scale, t_degrees = _fit_student(s, weights)
        classes[name] = dict(
            sites=len(members), molecules=int(count),
            quantiles=[round(float(q), 4) if np.isfinite(q) else None for q in quantiles],
            t_scale=round(t_scale, 4), t_degrees=round(t_degrees, 2),
        )
    return dict(classes=classes, novelty=factors)


def _chain(environment: str, nucleus: str):
    """Yield a class, then ever coarser ones, at last the nucleus itself."""
    name = environment
    while name and name != nucleus:
        yield name
        name = coarser_environment(name)
    yield nucleus


def _fit_student(scores: np.ndarray, weights: np.ndarray) -> tuple[float, float]:
    """Fit scale and degrees of freedom of a Student t distribution to absolute scores by weighted likelihood on a grid."""
    best = (-np.inf, 1.0, 4.0)
    centre = max(1e-6, float(np.median(scores)) / 0.6745)
    for degrees in (1.2, 1.5, 1.8, 2.2, 2.7, 3.3, 4.0, 5.0, 7.0, 10.0, 20.0):
        constant = math.lgamma((degrees + 1) / 2) - math.lgamma(degrees / 2) - 0.5 * math.log(degrees * math.pi)
        for scale in centre * np.exp(np.linspace(-0.6, 0.4, 26)):
            density = constant - math.log(scale) - (degrees + 1) / 2 * np.log1p((scores / scale) ** 2 / degrees)
            value = float((weights * density).sum())
            if value > best[0]:
                best = (value, float(scale), degrees)
    return best[1], best[2]


class IntervalTable:
    """Looks up interval half-widths and error distributions.

    Parameters
    ----------
    tables : dict
        Nucleus → what `fit_interval_table` returned.
    """

    def __init__(self, tables: dict):
        self.tables = tables
        self._found: dict[tuple[str, str], dict] = {}
        self._factor: dict[tuple[str, str, float], float] = {}

    def find_class(self, nucleus: str, environment: str) -> tuple[str, dict]:
        """Return the name and the entry of the class itself, or of the first coarser one that has enough molecules."""
        key = (nucleus, environment)
        if key not in self._found:
            classes = self.tables[nucleus]["classes"]
            name = next(name for name in _chain(environment, nucleus) if name in classes)
            self._found[key] = (name, classes[name])
        return self._found[key]

    def compute_factor(self, nucleus: str, environment: str, coverage: float) -> float:
        """Return the half-width of the interval in units of the raw error size; inf where no table supports `coverage`."""
        key = (nucleus, environment, coverage)
        if key not in self._factor:
            classes = self.tables[nucleus]["classes"]
            supported = (
                value
                for name in _chain(environment, nucleus)
                if name in classes and math.isfinite(value := _interpolate(classes[name]["quantiles"], coverage))
            )
            self._factor[key] = next(supported, math.inf)
        return self._factor[key]

    def compute_student(self, nucleus: str, environment: str) -> tuple[float, float]:
        """Return scale (in units of the raw error size) and degrees of freedom of the error distribution."""
        entry = self.find_class(nucleus, environment)[1]
        return entry["t_scale"], entry["t_degrees"]

    def compute_novelty_factor(self, nucleus: str, level: int) -> float:
        """Return by how much an interval widens at a level of novelty."""
        return self.tables[nucleus]["novelty"][str(int(level))]


def _interpolate(quantiles, coverage: float) -> float:
    levels = np.array(LEVELS)
    upper = int(np.searchsorted(levels, coverage - 1e-9))
    if upper >= len(levels) or quantiles[upper] is None:
        return math.inf
    if upper == 0 or abs(levels[upper] - coverage) < 1e-9:
        return float(quantiles[upper])
    low, high = math.log(max(quantiles[upper - 1], 1e-6)), math.log(max(quantiles[upper], 1e-6))
    part = (coverage - levels[upper - 1]) / (levels[upper] - levels[upper - 1])
    return math.exp(low + part * (high - low))
