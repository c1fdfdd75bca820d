"""Figures of merit for predicted shifts and their intervals, honest about sites of one molecule not being independent."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.special import stdtr

__all__ = [
    "compute_cluster_error",
    "compute_coverage_figures",
    "compute_error_figures",
    "compute_interval_scores",
    "compute_shortfall",
    "correct_for_many",
]


def compute_error_figures(error: np.ndarray) -> dict[str, float]:
    """Summarise errors.

    Parameters
    ----------
    error : ndarray of shape (n_sites,)
        Observed minus predicted, ppm; no nan.

    Returns
    -------
    dict
        'sites', and in ppm 'mean' (of the absolute errors), 'median', 'root_mean_square', 'percentile_95'; all None but
        the count for no sites.
    """
    size = np.abs(np.asarray(error, dtype=float))
    if not len(size):
        return dict(sites=0, mean=None, median=None, root_mean_square=None, percentile_95=None)
    return dict(
        sites=len(size),
        mean=round(float(size.mean()), 4),
        median=round(float(np.median(size)), 4),
        root_mean_square=round(float(np.sqrt((size**2).mean())), 4),
        percentile_95=round(float(np.quantile(size, 0.95)), 4),
    )


def compute_interval_scores(error: np.ndarray, half_width: np.ndarray, coverage: float) -> np.ndarray:
    """Return the interval score of every site: the width, and what it misses times 2/(1 - coverage).

    Parameters
    ----------
    error, half_width : ndarray of shape (n_sites,)
        ppm, about the centre of the interval.
    coverage : float

    References
    ----------
    Gneiting & Raftery, J. Am. Statist. Assoc. 2007, 102, 359 (doi 10.1198/016214506000001437).

    Examples
    --------
    >>> compute_interval_scores(np.array([0.5, 2.0]), np.array([1.0, 1.0]), 0.9).round(6)
    array([ 2., 22.])
    """
    return 2 * half_width + 2 / (1 - coverage) * np.maximum(0, np.abs(error) - half_width)


def compute_coverage_figures(error: np.ndarray, half_width: np.ndarray, molecule: np.ndarray, coverage: float) -> dict:
    """Summarise intervals.

    Parameters
    ----------
    error, half_width : ndarray of shape (n_sites,)
        ppm.
    molecule : ndarray of shape (n_sites,)
        Which molecule each site belongs to.
    coverage : float
        What the intervals promise.

    Returns
    -------
    dict
        'coverage' over sites; 'standard_error' of it, clustered by molecule; 'coverage_by_molecule' (every molecule weighs
        the same); 'median_width' in ppm; 'interval_score' in ppm over intervals that have an end; 'unbounded', how many have
        none; None where there is nothing to compute from (a standard error from one molecule).
    """
    if not len(error):
        return dict(
            coverage=None, standard_error=None, coverage_by_molecule=None, median_width=None, interval_score=None, unbounded=0
        )
    inside = (np.abs(error) <= half_width).astype(float)
    _, place, sites = np.unique(molecule, return_inverse=True, return_counts=True)
    error_of_mean = compute_cluster_error(inside, molecule)
    bounded = np.isfinite(half_width)
    scores = compute_interval_scores(error[bounded], half_width[bounded], coverage)
    return dict(
        coverage=round(float(inside.mean()), 4),
        standard_error=round(error_of_mean, 4) if np.isfinite(error_of_mean) else None,
        coverage_by_molecule=round(float((np.bincount(place, weights=inside) / sites).mean()), 4),
        median_width=round(float(np.median(2 * half_width)), 4) if bounded.mean() > 0.5 else None,
        interval_score=round(float(scores.mean()), 4) if len(scores) else None,
        unbounded=int((~bounded).sum()),
    )


def compute_cluster_error(values: np.ndarray, cluster: np.ndarray) -> float:
    """Return the standard error of the mean of `values` when values of one cluster are not independent.

    Parameters
    ----------
    values, cluster : ndarray of shape (n,)

    Returns
    -------
    float
        inf for a single cluster: nothing is known about the spread between clusters then.

    References
    ----------
    Liang & Zeger, Biometrika 1986, 73, 13 (doi 10.1093/biomet/73.1.13).
    """
    _, place = np.unique(cluster, return_inverse=True)
    n_clusters = place.max() + 1 if len(place) else 0
    if n_clusters < 2:
        return float("inf")
    sums = np.bincount(place, weights=values - values.mean())
    return float(np.sqrt((sums**2).sum() * n_clusters / (n_clusters - 1)) / len(values))


def compute_shortfall(inside: np.ndarray, molecule: np.ndarray, at_least: float) -> float:
    """Test whether intervals hold less often than they should.

    Parameters
    ----------
    inside : ndarray of shape (n_sites,), bool
    molecule : ndarray of shape (n_sites,)
    at_least : float
        Coverage below which the class is called short.

    Returns
    -------
    float
        One-sided p value of "the coverage is `at_least` or better" (t test with as many degrees of freedom as there are
        molecules, less one); 1 where coverage reaches `at_least`, or where a single molecule is all there is.
    """
    inside = np.asarray(inside, dtype=float)
    if inside.mean() >= at_least:
        return 1.0
    error = compute_cluster_error(inside, molecule)
    n_molecules = len(np.unique(molecule))
    # A class in which nothing at all is inside has no spread; the binomial chance of that stands in.
    if error == 0:
        return float((1 - at_least) ** n_molecules)
    return float(stdtr(max(1, n_molecules - 1), (inside.mean() - at_least) / error))


def correct_for_many(p_values: Sequence[float]) -> np.ndarray:
    """Return p values corrected for their number (Holm, Scand. J. Statist. 1979, 6, 65).

    Examples
    --------
    >>> correct_for_many([0.01, 0.5, 0.02])
    array([0.03, 0.5 , 0.04])
    """
    p = np.asarray(p_values, dtype=float)
    order = np.argsort(p, kind="stable")
    raised = np.maximum.accumulate(p[order] * (len(p) - np.arange(len(p))))
    out = np.empty(len(p))
    out[order] = np.minimum(1.0, raised)
    return out
