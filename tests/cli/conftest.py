"""The command line's tests borrow the reporting room's hand-made records and replace the pipeline by them."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path
from types import SimpleNamespace

import pytest
from click.testing import CliRunner

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "reporting"))


@pytest.fixture
def run():
    """Call the command line in this process; gives exit code, standard output and standard error."""
    from shiftpred.cli import command

    def call(*words, stdin=None):
        return CliRunner().invoke(command, list(words), input=stdin)

    return call


@pytest.fixture
def made_up_model(monkeypatch):
    """Replace model and prediction: every molecule gets one row an atom with the atom's number as its shift."""
    import shiftpred.pipeline
    from shiftpred.records import MoleculePrediction, NucleusPrediction

    def predict_one(structure, nucleus, solvent, coverage):
        rows = [
            NucleusPrediction(
                "13C",
                i,
                number,
                "",
                3,
                (number,),
                float(number),
                number - 1.0,
                number + 1.0,
                coverage,
                1.0,
                4.0,
                "sp3",
                False,
                "",
            )
            for i, number in enumerate(structure.atom_numbers)
            if structure.mol.GetAtomWithIdx(i).GetAtomicNum() == 6
        ]
        return MoleculePrediction(structure, (), tuple(rows), solvent, "made up 1", structure.notes)

    calls = []

    def predict_structures(structures, nucleus="both", solvent=None, coverage=0.9, model=None):
        structures = list(structures)
        calls.append(len(structures))
        return [predict_one(s, nucleus, solvent, coverage) for s in structures]

    monkeypatch.setattr(shiftpred.pipeline, "load_model", lambda model=None: SimpleNamespace(edition="made up 1"))
    monkeypatch.setattr(shiftpred.pipeline, "predict_structures", predict_structures)
    return SimpleNamespace(calls=calls, predict_structures=predict_structures)


@pytest.fixture
def made_up_comparison(monkeypatch):
    """Replace the comparison by a hand-made one; what it was called with is kept."""
    import report_builders as build

    import shiftpred.pipeline

    seen = SimpleNamespace(comparison=build.build_supported(), called=[])

    def compare(structure, c13=None, h1=None, **settings):
        seen.called.append(SimpleNamespace(structure=structure, c13=c13, h1=h1, **settings))
        return replace(seen.comparison, structure=structure)

    monkeypatch.setattr(shiftpred.pipeline, "compare", compare, raising=False)
    return seen
