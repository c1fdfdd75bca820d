"""The calibrated map from features to a probability, and the thresholds of the judgement.

The numbers come with the model bundle, where they were fitted for its predictions; without them the defaults of this room stand
in, which were fitted with the first model.
"""

from __future__ import annotations

import json
import math
from dataclasses import dataclass
from functools import lru_cache
from importlib.resources import files

import numpy as np

from shiftpred.errors import BundleError, SettingError
from shiftpred.judgement.fit_summary import FEATURES, FitSummary, compute_features

__all__ = ["JudgementMap", "build_judgement_map", "compute_candidate_probabilities", "require_prior"]

FORMAT = 1


@dataclass(frozen=True)
class JudgementMap:
    """Logistic map for each combination of lists, and the gate of the absolute fit."""

    maps: dict[str, dict]
    """'13C', '1H' or '13C+1H' → {'intercept': float, 'weights': {feature: float}}; for a prior of one half."""
    supported_from: float
    contradicted_to: float
    gate: dict[str, float]
    """Largest `misfit`, `worst`, `extra` and `missing` with which a structure may be supported."""
    cases: dict
    """What the map was fitted on, for the report."""

    def compute_probability(self, lists: str, features: np.ndarray, prior: float = 0.5) -> float:
        """Return the probability of a structure.

        Parameters
        ----------
        lists : str
            Which lists were given: '13C', '1H' or '13C+1H'.
        features : ndarray of shape (len(FEATURES),)
        prior : float
            Before the peaks are seen.
        """
        chosen = self.maps[lists]
        total = chosen["intercept"] + sum(chosen["weights"].get(n, 0.0) * float(x) for n, x in zip(FEATURES, features))
        total += math.log(prior) - math.log1p(-prior)
        return 1 / (1 + math.exp(-min(max(total, -40.0), 40.0)))


def require_prior(prior: float) -> float:
    """Return `prior` if it is a probability that evidence can still change.

    Raises
    ------
    SettingError
        Unless 0 < prior < 1.
    """
    if isinstance(prior, bool) or not isinstance(prior, (int, float)) or not 0 < prior < 1:
        raise SettingError("prior", repr(prior), "a number between 0 and 1, both left out", "prior=0.5")
    return float(prior)


def build_judgement_map(parameters: dict | None = None) -> JudgementMap:
    """Build the map from a bundle's parameters; None or empty: the defaults.

    Raises
    ------
    BundleError
        If the parameters are of another format or incomplete.
    """
    parameters = parameters or _load_defaults()
    try:
        if parameters["format"] != FORMAT:
            raise KeyError(f"format {parameters['format']}")
        maps = {k: dict(intercept=float(v["intercept"]), weights=dict(v["weights"])) for k, v in parameters["maps"].items()}
        unknown = {n for m in maps.values() for n in m["weights"]} - set(FEATURES)
        if unknown or not {"13C", "1H", "13C+1H"} <= set(maps):
            raise KeyError(f"features {sorted(unknown)}, lists {sorted(maps)}")
        thresholds = parameters["thresholds"]
        return JudgementMap(
            maps, float(thresholds["supported_from"]), float(thresholds["contradicted_to"]), dict(parameters["gate"]),
            dict(parameters.get("cases", {})),
        )  # fmt: skip
    except (KeyError, TypeError, ValueError) as error:
        raise BundleError(
            "the model's judgement parameters",
            f"{error!r}",
            f"format {FORMAT} with maps for 13C, 1H and both, thresholds and gate",
            "install the version of shiftpred that made this model, or calibrate the judgement again",
        ) from None


@lru_cache(maxsize=1)
def _load_defaults() -> dict:
    return json.loads((files("shiftpred.judgement") / "default_map.json").read_text(encoding="utf-8"))


def compute_candidate_probabilities(
    summaries: list[FitSummary], lists: str, judgement_map: JudgementMap, priors: list[float]
) -> tuple[list[float], float]:
    """Return the probability of each candidate, and of none of them.

    Each candidate is judged against all others; where the sum would exceed 1 all are scaled down, otherwise the rest belongs to
    'none of these'.

    Parameters
    ----------
    summaries : list of FitSummary
    lists : str
    judgement_map : JudgementMap
    priors : list of float
        Of each candidate, as if it alone were in question.
    """
    raw = [judgement_map.compute_probability(lists, compute_features(summaries, k), prior) for k, prior in enumerate(priors)]
    total = sum(raw)
    if total > 0.999:
        raw = [p * 0.999 / total for p in raw]
    return raw, 1.0 - sum(raw)
