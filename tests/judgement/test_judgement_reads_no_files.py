"""Rivals and expected compounds are structures; a file that happens to have such a name is never opened."""

import shiftpred


def test_a_file_with_the_name_of_a_rival_or_an_expected_compound_is_not_opened(tmp_path, monkeypatch):
    asked = dict(c13=[58.0, 18.2], solvent="CDCl3", expected=["CCO", "CC(C)=O"])
    before = shiftpred.compare("OCC", **asked)
    for name in {"CCO", "CC(C)=O", *(r.smiles for r in before.rivals)}:
        if "/" not in name:
            (tmp_path / name).write_text("this is no structure\n")
    monkeypatch.chdir(tmp_path)
    after = shiftpred.compare("OCC", **asked)
    assert before.rivals, "ethanol has rivals"
    assert after.to_dict()["rivals"] == before.to_dict()["rivals"]
    assert after.probability == before.probability


def test_a_file_with_the_name_of_a_candidate_is_not_opened(tmp_path, monkeypatch):
    (tmp_path / "CCO").write_text("CCCCCC\nCCCCC\n")
    monkeypatch.chdir(tmp_path)
    order = shiftpred.rank(["CCO", "COC"], c13=[58.0, 18.2], solvent="CDCl3")
    assert list(order.candidate) == [0, 1]
