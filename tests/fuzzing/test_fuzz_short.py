"""A taste of each generator in every run, and all that longer runs have found."""

import json

import pytest
from fuzz_comparisons import build_comparison_input, use_comparison_input
from fuzz_molfiles import build_structure_text, use_structure_text
from fuzz_peak_text import build_peak_text, use_peak_text
from fuzz_running import run_inputs

from shiftpred.errors import ShiftpredError

FOUND_IN_COMPARISONS = [
    dict(structure="Cl", c13="98.8, 116.4", h1="9.62, 6.87 (br s)", rivals=1, mass_confirmed=False),
]


@pytest.mark.parametrize(
    "build, use, inputs",
    [(build_peak_text, use_peak_text, 150), (build_structure_text, use_structure_text, 100),
     (build_comparison_input, use_comparison_input, 12)],
    ids=["peak-text", "molfiles", "comparisons"],
)  # fmt: skip
def test_nothing_but_answers_and_documented_errors(build, use, inputs):
    used, refused, findings = run_inputs(build, use, seed=7, inputs=inputs)
    assert not findings, findings
    assert 0 < refused < used == inputs, "the generator must hit both readable and unreadable input"


@pytest.mark.parametrize("given", FOUND_IN_COMPARISONS, ids=lambda given: given["structure"][:20])
def test_found_by_longer_runs(given):
    use_comparison_input(json.dumps(given))


def test_a_fault_is_found():
    def use(text):
        if len(text) % 2:
            raise KeyError(text)
        raise ShiftpredError("here", "this", "that", "another")

    used, refused, findings = run_inputs(build_peak_text, use, inputs=20)
    assert used == 20 and 0 < refused < 20 and len(findings) == 1 and "KeyError" in findings[0].what
