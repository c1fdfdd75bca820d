"""A whole comparison from hand-made predictions: reasons, rivals, cautions, ranking."""

import sys
from dataclasses import replace
from pathlib import Path

import pytest

import shiftpred

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "assignment"))
from builder_hand_made_predictions import build_ethyl_benzoate, build_peaks, build_prediction

from shiftpred.assignment import assign_structure, prepare_peaks
from shiftpred.errors import InputError, SettingError
from shiftpred.judgement import (
    build_comparison,
    build_judgement_map,
    build_ranking,
    build_settings,
    read_sample,
    require_candidates,
)
from shiftpred.judgement.ionised_forms import build_ionised_forms
from shiftpred.records import RecordFailure, Rival

LIST = (166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3)
# Phenyl propanoate, from memory.
PROPANOATE = build_prediction("CCC(=O)Oc1ccccc1", {0: 9.1, 1: 27.7, 2: 172.9, 5: 150.8, 6: 121.5, 7: 129.4, 8: 125.7})
# Methyl phenylacetate, from memory.
PHENYLACETATE = build_prediction("COC(=O)Cc1ccccc1", {0: 52.0, 2: 172.0, 4: 41.2, 5: 134.0, 6: 129.2, 7: 128.6, 8: 127.1})
MAP = build_judgement_map()


def judge(proposal, rivals, *peaks, **settings):
    asked = build_settings(solvent="CDCl3", **settings)
    ready = prepare_peaks({"13C": build_peaks("13C", *peaks)}, "CDCl3")
    fits = [assign_structure(p, ready) for p in (proposal, *rivals)]
    named = [Rival(p.structure.smiles, "another ester", "isomer") for p in rivals]
    return build_comparison(proposal.structure, asked, ready, fits, named, MAP)


def test_a_right_structure_is_supported_with_reasons():
    found = judge(build_ethyl_benzoate(), [PROPANOATE, PHENYLACETATE], *LIST)
    assert found.judgement == "supported" and found.reason_code == ""
    assert found.likelihood_ratio > 1e6
    assert "7 of 7 assigned sites" in "\n".join(found.reasons)
    assert "reference offset" in "\n".join(found.reasons)
    assert 0 <= sum(r.probability for r in found.rivals) <= 1 - found.probability + 1e-9


def test_a_wrong_structure_is_contradicted_with_the_weightiest_reason_first():
    found = judge(PROPANOATE, [build_ethyl_benzoate(), PHENYLACETATE], *LIST)
    assert found.judgement == "contradicted"
    assert found.rivals[0].smiles == "CCOC(=O)c1ccccc1", "the best rival first"
    assert "fits more than a million times better" in found.reasons[0]
    assert any("60.9" in r and "unexplained" in r for r in found.reasons)
    assert "lines that differ most" in found.rivals[0].decided_by


def test_an_open_judgement_names_rival_lines_and_experiment():
    twin = build_prediction("COC(=O)Cc1ccccc1", {0: 60.9, 2: 166.6, 4: 14.3, 5: 130.5, 6: 129.5, 7: 128.3, 8: 132.8})
    found = judge(build_ethyl_benzoate(), [twin], *LIST)
    assert (found.judgement, found.reason_code) == ("open", "rival_fits")
    assert "COC(=O)Cc1ccccc1" in found.reasons[0] and "HMBC" in found.reasons[0]


def test_offset_is_reported_and_warned_of():
    shifted = [x + 0.6 for x in (*LIST, 77.16)]
    found = judge(build_ethyl_benzoate(), [PROPANOATE], *shifted)
    assert found.reference_offset_ppm["13C"] == pytest.approx(0.6, abs=0.06)
    assert any("off its reference" in c for c in found.cautions)


def test_every_step_and_setting_is_told():
    found = judge(build_ethyl_benzoate(), [PROPANOATE], *LIST, prior=0.3)
    assert found.settings.prior == 0.3
    steps = "\n".join(found.steps)
    assert "7 lines" in steps and "1 rivals" in steps and "prior 0.3" in steps
    assert len(found.input_hash) == 64


def test_the_hash_follows_the_input():
    first = judge(build_ethyl_benzoate(), [PROPANOATE], *LIST)
    again = judge(build_ethyl_benzoate(), [PROPANOATE], *LIST)
    other = judge(build_ethyl_benzoate(), [PROPANOATE], *LIST[:-1])
    assert first.input_hash == again.input_hash != other.input_hash


def test_ranking_puts_the_best_first_and_keeps_positions():
    ready = prepare_peaks({"13C": build_peaks("13C", *LIST)}, "CDCl3")
    predictions = [PROPANOATE, build_ethyl_benzoate(), PHENYLACETATE]
    fits = [assign_structure(p, ready) for p in predictions]
    failure = RecordFailure("4", InputError("row 4", "'x('", "a SMILES", "check it"))
    found = build_ranking(build_settings(), ready, fits, [0, 1, 2], MAP, "made by hand", [failure])
    assert found.candidates[0].candidate == 1
    misfits = [c.misfit for c in found.candidates]
    assert misfits == sorted(misfits)
    assert sum(c.probability for c in found.candidates) + found.none_of_these == pytest.approx(1)
    assert found.candidates[0].decided_by == "" and found.candidates[1].decided_by
    assert found.failures == (failure,)


@pytest.mark.parametrize(
    "wrong", [dict(rivals=-1), dict(rivals=2.5), dict(prior=1.0), dict(frequency_mhz=3), dict(frequency_mhz="400"),
              dict(solvent="soup")],
)  # fmt: skip
def test_wrong_settings_are_refused(wrong):
    with pytest.raises(SettingError):
        build_settings(**wrong)


def test_a_sample_without_peaks_is_refused():
    with pytest.raises(InputError, match="no peaks"):
        read_sample(None, [], build_settings())


def test_no_readable_candidate_is_refused():
    failure = RecordFailure("1", InputError("row 1", "'x('", "a SMILES", "check it"))
    with pytest.raises(InputError, match="none can be read"):
        require_candidates([failure])


def test_ionised_forms():
    from rdkit import Chem

    def forms(smiles):
        return [Chem.MolToSmiles(m) for m, _ in build_ionised_forms(Chem.MolFromSmiles(smiles))]

    assert forms("CCN(CC)CC") == ["CC[NH+](CC)CC"]
    assert forms("c1ccncc1") == ["c1cc[nH+]cc1"]
    assert forms("NCC(=O)O") == ["[NH3+]CC(=O)O", "NCC(=O)[O-]", "[NH3+]CC(=O)[O-]"]
    assert forms("CC(=O)NC") == [] and forms("Nc1ccccc1") == []


def test_the_ionised_form_is_mentioned_where_it_fits_better():
    carbons = {0: 13.5, 1: 51.5}
    base = build_prediction("CCN(CC)CC", carbons)
    salt = replace(build_prediction("CC[NH+](CC)CC", {0: 8.6, 1: 46.0}), structure=base.structure)
    ready = prepare_peaks({"13C": build_peaks("13C", 46.0, 8.6)}, "CDCl3")
    fits = [assign_structure(base, ready)]
    found = build_comparison(
        base.structure,
        build_settings(solvent="CDCl3"),
        ready,
        fits,
        [],
        MAP,
        [(assign_structure(salt, ready), "amine protonated")],
    )
    assert any("ionised form (amine protonated)" in c for c in found.cautions)


def test_an_open_judgement_never_says_as_well_of_a_rival_that_fits_much_better():
    better = build_prediction("COC(=O)Cc1ccccc1", {0: 60.9, 2: 166.6, 4: 14.3, 5: 130.5, 6: 129.5, 7: 128.3, 8: 132.8})
    own = build_prediction("CCOC(=O)c1ccccc1", {0: 14.3, 1: 60.9, 3: 166.6, 5: 128.3, 6: 129.5, 7: 130.5, 8: 136.5})
    ready = prepare_peaks({"13C": build_peaks("13C", *LIST)}, "CDCl3")
    fits = [assign_structure(p, ready) for p in (own, better)]
    undecided = replace(MAP, supported_from=1.0, contradicted_to=-1.0)
    rivals = [Rival(better.structure.smiles, "another ester", "isomer")]
    found = build_comparison(own.structure, build_settings(), ready, fits, rivals, undecided)
    assert 1 / 3000 < found.likelihood_ratio < 1 / 3
    assert (found.judgement, found.reason_code) == ("open", "rival_fits")
    assert "a rival fits better" in found.reasons[0]


def test_lines_of_solvents_alone_support_nothing():
    """Heptane's and benzene's lines beside cubane, whose one line lies at 47 ppm."""
    found = shiftpred.compare("C12C3C4C1C5C2C3C45", c13=[14.1, 22.7, 29.7, 31.9, 128.3])
    assert found.judgement != "supported"
    assert all(a.observed_ppm is None for a in found.assignments)
