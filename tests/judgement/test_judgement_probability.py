"""The map from fits to probabilities: directions, prior, gate, none of these."""

import json
from dataclasses import replace

import numpy as np
import pytest

from shiftpred.errors import BundleError, SettingError
from shiftpred.judgement.fit_summary import FEATURES, FitSummary, compute_features
from shiftpred.judgement.judge import decide_judgement
from shiftpred.judgement.probability import build_judgement_map, compute_candidate_probabilities, require_prior

GOOD = FitSummary(log_evidence=-10.0, misfit=-0.3, worst=1.5, extra=0, missing=0, lines=10, units=10, novel=0.0, offset=0.3)
FAR = replace(GOOD, log_evidence=-60.0, misfit=9.0, worst=9.0, extra=3, missing=3)
MAP = build_judgement_map()


def probability(own, *rivals, prior=0.5, lists="13C"):
    return MAP.compute_probability(lists, compute_features([own, *rivals], 0), prior)


@pytest.mark.parametrize("lists", ["13C", "1H", "13C+1H"])
def test_evidence_counts_the_right_way_round(lists):
    rival = replace(GOOD, log_evidence=-16.0)
    base = probability(GOOD, rival, lists=lists)
    assert base > probability(GOOD, replace(rival, log_evidence=-10.5), lists=lists)
    worse = (dict(misfit=4.0), dict(worst=8.0), dict(extra=2), dict(missing=2), dict(offset=3.0))
    for change in worse:
        assert probability(replace(GOOD, **change), rival, lists=lists) <= base
    assert any(probability(replace(GOOD, **change), rival, lists=lists) < base for change in worse)


def test_a_prior_shifts_the_odds_by_its_own_odds():
    rival = replace(GOOD, log_evidence=-12.0)
    half, tenth = probability(GOOD, rival), probability(GOOD, rival, prior=0.1)
    assert tenth / (1 - tenth) == pytest.approx(half / (1 - half) / 9)


@pytest.mark.parametrize("prior", [0, 1, -0.2, True, "0.5", float("nan")])
def test_a_prior_that_nothing_can_change_is_refused(prior):
    with pytest.raises(SettingError, match="prior"):
        require_prior(prior)


def test_supported_open_contradicted():
    far_rivals = [replace(GOOD, log_evidence=-30.0)] * 3
    assert decide_judgement([GOOD, *far_rivals], "13C", MAP, 0.5)[0] == "supported"
    assert decide_judgement([FAR, *far_rivals], "13C", MAP, 0.5)[0] == "contradicted"
    tie = decide_judgement([GOOD, replace(GOOD, log_evidence=-10.2), *far_rivals], "13C", MAP, 0.5)
    assert tie[:2] == ("open", "rival_fits")


def test_open_for_other_reasons():
    rivals = [replace(GOOD, log_evidence=-14.0)] * 3
    mixture = decide_judgement([replace(GOOD, extra=3, lines=13, log_evidence=-11.0), *rivals], "13C", MAP, 0.5)
    assert mixture[0] != "supported"
    assert mixture[1] in ("mixture_or_salt", "")
    strange = decide_judgement([replace(GOOD, novel=0.8), replace(GOOD, log_evidence=-10.2)], "13C", MAP, 0.5)
    assert strange[:2] == ("open", "outside_training_data")


def test_the_gate_of_the_absolute_fit_holds_whatever_the_rivals():
    poor = replace(GOOD, misfit=MAP.gate["misfit"] + 0.1)
    assert decide_judgement([poor, replace(FAR, log_evidence=-500.0)], "13C", MAP, 0.999)[0] != "supported"


def test_candidates_and_none_of_these_add_up():
    candidates = [GOOD, replace(GOOD, log_evidence=-13.0), FAR]
    shares, none = compute_candidate_probabilities(candidates, "13C", MAP, [0.5] * 3)
    assert sum(shares) + none == pytest.approx(1.0)
    assert shares[0] > shares[1] > shares[2]
    bad = [replace(FAR, log_evidence=FAR.log_evidence - k) for k in range(3)]
    assert compute_candidate_probabilities(bad, "13C", MAP, [0.5] * 3)[1] > 0.8, "the least bad one is not certain"


def test_features_have_names_and_are_finite():
    for own in (GOOD, FAR):
        for others in ([], [GOOD], [replace(GOOD, log_evidence=-1e6)]):
            x = compute_features([own, *others], 0)
            assert x.shape == (len(FEATURES),) and np.isfinite(x).all()


def test_damaged_parameters_are_refused():
    parameters = json.loads(json.dumps(dict(format=1, maps=MAP.maps, thresholds={}, gate={})))
    with pytest.raises(BundleError, match="judgement"):
        build_judgement_map(parameters)
    with pytest.raises(BundleError):
        build_judgement_map({"format": 99})


def test_no_structure_is_supported_beside_a_rival_that_fits_as_well():
    sure = replace(MAP, supported_from=0.0, contradicted_to=-1.0)
    for margin, judgement in ((0.0, "open"), (1.0, "open"), (1.2, "supported")):
        rival = replace(GOOD, log_evidence=GOOD.log_evidence - margin)
        assert decide_judgement([GOOD, rival], "13C", sure, 0.999)[0] == judgement
    assert decide_judgement([GOOD], "13C", sure, 0.999)[0] == "supported", "no rival at all"


def test_a_list_of_a_few_lines_is_too_little_evidence():
    few = replace(GOOD, lines=2, missing=8, log_evidence=-11.0)
    undecided = replace(MAP, supported_from=0.999999, contradicted_to=-1.0)
    assert decide_judgement([few, replace(few, log_evidence=-10.0)], "13C", undecided, 0.5)[:2] == (
        "open",
        "too_little_evidence",
    )
