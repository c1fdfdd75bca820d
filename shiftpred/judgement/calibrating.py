"""Fit the map from features to a probability on cases whose answer is known, and count how often the judgement is right.

Offline only. A case is a proposal, its own rivals and a peak list; the proposal is right, a near relative of the right
structure, or far off. Rivals are always made from the proposal, never from the right structure.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.optimize import minimize
from scipy.special import expit

from shiftpred.judgement.fit_summary import FEATURES, FitSummary, compute_features
from shiftpred.judgement.judge import decide_judgement
from shiftpred.judgement.probability import FORMAT, JudgementMap

__all__ = [
    "KINDS",
    "JudgementCase",
    "compute_rates",
    "compute_reliability",
    "compute_wilson_interval",
    "fit_logistic_map",
    "fit_thresholds_and_gate",
    "render_rates",
    "render_reliability",
]

KINDS = ("right", "near", "far")
_SHARE = {"right": 0.5, "near": 0.35, "far": 0.15}
"""What the probability is calibrated for: half of the proposals right, most wrong ones close relatives."""
# Sign that each weight must have: +1, -1, or 0 for either. Evidence must never count the wrong way round.
_SIGN = dict(margin=1, misfit=-1, worst=-1, extra=-1, missing=-1, lines=0, novel=-1, offset=-1, rivals=0, close_rivals=-1)
_RIDGE = 0.02


@dataclass(frozen=True)
class JudgementCase:
    """One proposal with its rivals against one sample."""

    compound: int
    """The sample; cases of one compound are not independent."""
    kind: str
    """'right', 'near' or 'far'."""
    lists: str
    """'13C', '1H' or '13C+1H'."""
    corruption: str
    """'' for the list as it was measured, otherwise what was done to it."""
    summaries: tuple[FitSummary, ...]
    """The proposal, then its rivals."""
    rank: int = 0
    """'right' only: 1-based rank of the right structure among itself and its rivals."""
    rank_of_constitution: int = 0
    """The same among those rivals that differ in constitution, stereoisomers left out."""

    @property
    def features(self) -> np.ndarray:
        return compute_features(list(self.summaries), 0)


def fit_logistic_map(cases: Sequence[JudgementCase]) -> dict:
    """Fit one logistic map by weighted, slightly shrunk likelihood with fixed signs.

    Parameters
    ----------
    cases : sequence of JudgementCase
        All with the same lists.

    Returns
    -------
    dict
        'intercept' and 'weights' by feature, for a prior of one half.
    """
    x = np.array([c.features for c in cases])
    right = np.array([c.kind == "right" for c in cases])
    weight = _compute_weights(cases)
    centre, spread = np.average(x, axis=0, weights=weight), x.std(axis=0) + 1e-9
    z = (x - centre) / spread
    bounds = [(None, None)] + [(0, None) if _SIGN[n] > 0 else (None, 0) if _SIGN[n] < 0 else (None, None) for n in FEATURES]

    def loss(p):
        logit = p[0] + z @ p[1:]
        value = (weight * np.logaddexp(0, np.where(right, -logit, logit))).sum() + _RIDGE * (p[1:] ** 2).sum() / 2
        slope = weight * (expit(logit) - right)
        return value, np.concatenate([[slope.sum()], z.T @ slope + _RIDGE * p[1:]])

    found = minimize(loss, np.zeros(1 + len(FEATURES)), jac=True, bounds=bounds, method="L-BFGS-B").x
    weights = found[1:] / spread
    return dict(
        intercept=round(float(found[0] - weights @ centre), 5),
        weights={n: round(float(w), 5) for n, w in zip(FEATURES, weights) if abs(w) > 1e-6},
    )


def _compute_weights(cases) -> np.ndarray:
    """Weight every kind by its share; the weights add up to the number of cases."""
    kinds = np.array([c.kind for c in cases])
    weight = np.zeros(len(cases))
    present = [k for k in KINDS if (kinds == k).any()]
    total = sum(_SHARE[k] for k in present)
    for kind in present:
        weight[kinds == kind] = _SHARE[kind] / total / (kinds == kind).mean()
    return weight


def fit_thresholds_and_gate(cases: Sequence[JudgementCase], maps: dict, most_wrong: float, most_right: float) -> dict:
    """Choose gate and thresholds.

    Parameters
    ----------
    cases : sequence of JudgementCase
    maps : dict
        Lists → map.
    most_wrong : float
        Largest share of near relatives that may be called supported.
    most_right : float
        Largest share of right structures that may be called contradicted.

    Returns
    -------
    dict
        Parameters as `build_judgement_map` reads them.
    """
    right = [c.summaries[0] for c in cases if c.kind == "right"]
    gate = {
        "misfit": max(2.0, _quantile([s.misfit for s in right], 0.98)),
        "worst": max(4.0, _quantile([s.worst for s in right], 0.98)),
        "extra": max(1.0, _quantile([s.extra for s in right], 0.98)),
        "missing": max(1.0, _quantile([s.missing for s in right], 0.98)),
    }
    gate = {k: round(float(v), 2) for k, v in gate.items()}
    trial = JudgementMap(maps, 0.5, 0.5, gate, {})
    p = {k: np.array([trial.compute_probability(c.lists, c.features) for c in cases if c.kind == k]) for k in KINDS}
    supported = next((t for t in np.arange(0.80, 0.99, 0.01) if (p["near"] >= t).mean() <= most_wrong), 0.99)
    contradicted = next((t for t in np.arange(0.20, 0.005, -0.01) if (p["right"] <= t).mean() <= most_right), 0.005)
    return dict(
        format=FORMAT, maps=maps, gate=gate,
        thresholds=dict(supported_from=round(float(supported), 3), contradicted_to=round(float(contradicted), 3)),
    )  # fmt: skip


def _quantile(values, level: float) -> float:
    return float(np.quantile(np.array(values, dtype=float), level)) if values else 0.0


def compute_wilson_interval(successes: int, cases: int, z: float = 1.96) -> tuple[float, float]:
    """Return the Wilson score interval of a rate (Wilson, J. Am. Stat. Assoc. 1927, 22, 209).

    Examples
    --------
    >>> [round(x, 3) for x in compute_wilson_interval(90, 100)]
    [0.826, 0.945]
    """
    if cases == 0:
        return 0.0, 1.0
    rate, square = successes / cases, z * z / cases
    middle = (rate + square / 2) / (1 + square)
    half = z / (1 + square) * math.sqrt(rate * (1 - rate) / cases + square / (4 * cases))
    return max(0.0, middle - half), min(1.0, middle + half)


def compute_rates(cases: Sequence[JudgementCase], judgement_map: JudgementMap, prior: float = 0.5) -> list[dict]:
    """Count judgements by lists, corruption and kind of proposal.

    Returns
    -------
    list of dict
        lists, corruption, what, successes, cases, rate, low, high (Wilson, 95 %).
    """
    out = []
    groups: dict[tuple, list[JudgementCase]] = {}
    for case in cases:
        groups.setdefault((case.lists, case.corruption), []).append(case)
    for (lists, corruption), members in sorted(groups.items()):
        verdicts = {k: [] for k in KINDS}
        for case in members:
            verdicts[case.kind].append(decide_judgement(case.summaries, case.lists, judgement_map, prior)[0])
        ranked = [c for c in members if c.kind == "right" and len(c.summaries) > 1]
        rows = [
            ("right structure first among its rivals", sum(c.rank == 1 for c in ranked), len(ranked)),
            ("the same, rivals of another constitution", sum(c.rank_of_constitution == 1 for c in ranked), len(ranked)),
            ("right structure among the first three", sum(c.rank <= 3 for c in ranked), len(ranked)),
            *(
                (f"{kind} called {verdict}", verdicts[kind].count(verdict), len(verdicts[kind]))
                for kind in KINDS
                for verdict in ("supported", "open", "contradicted")
            ),
        ]
        for what, successes, number in rows:
            if number:
                low, high = compute_wilson_interval(successes, number)
                out.append(
                    dict(lists=lists, corruption=corruption, what=what, successes=successes, cases=number,
                         rate=round(successes / number, 4), low=round(low, 4), high=round(high, 4))
                )  # fmt: skip
    return out


def compute_reliability(cases: Sequence[JudgementCase], judgement_map: JudgementMap, bins: int = 10) -> list[dict]:
    """Return the reliability curve for the mix of proposals that the map was calibrated for: called, right, number of cases."""
    weight = _compute_weights(cases)
    p = np.array([judgement_map.compute_probability(c.lists, c.features) for c in cases])
    right = np.array([c.kind == "right" for c in cases], dtype=float)
    out = []
    for low in np.arange(bins) / bins:
        here = (p >= low) & ((p < low + 1 / bins) | (low + 1 / bins >= 1))
        if here.any():
            share = float(np.average(right[here], weights=weight[here]))
            effective = float(weight[here].sum() ** 2 / (weight[here] ** 2).sum())
            interval = compute_wilson_interval(round(share * effective), round(effective))
            out.append(
                dict(low=round(float(low), 2), high=round(float(low) + 1 / bins, 2), cases=int(here.sum()),
                     called=round(float(np.average(p[here], weights=weight[here])), 4), right=round(share, 4),
                     interval=[round(x, 4) for x in interval])
            )  # fmt: skip
    return out


def render_rates(rates: Sequence[dict]) -> str:
    """Return the rates as a table for a terminal."""
    lines, before = [], None
    for row in rates:
        key = (row["lists"], row["corruption"])
        if key != before:
            lines.append(f"\n{row['lists']}, {row['corruption'] or 'lists as measured'}")
            before = key
        lines.append(
            f"  {row['what']:<42} {row['rate']:7.1%}  ({row['low']:.1%} to {row['high']:.1%}; "
            f"{row['successes']} of {row['cases']})"
        )
    return "\n".join(lines)


def render_reliability(curve: Sequence[dict]) -> str:
    """Return the reliability curve as a table for a terminal."""
    lines = ["called          mean called   right    95 % interval       cases"]
    for row in curve:
        lines.append(
            f"{row['low']:.1f} to {row['high']:.1f}      {row['called']:8.1%}   {row['right']:7.1%}   "
            f"{row['interval'][0]:.1%} to {row['interval'][1]:.1%}   {row['cases']:6d}"
        )
    return "\n".join(lines)
