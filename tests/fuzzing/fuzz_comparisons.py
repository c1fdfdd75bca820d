"""Structures and peaks that need not belong together through the whole of predict, explain and compare.

python tests/fuzzing/fuzz_comparisons.py --minutes 10
"""

from __future__ import annotations

import json
import random

from fuzz_molfiles import MOLECULES, SMILES
from fuzz_peak_text import build_peak_text
from fuzz_running import run_from_command_line
from grammars import write_text

import shiftpred
from shiftpred.errors import ShiftpredError
from shiftpred.reporting import render_comparison_html, render_comparison_text, render_json

_BEHIND = ("", "", "(s, 1H)", "(m, 2H)", "(d, J = 7.1 Hz, 3H)", "(t, J = 254 Hz)", "(br s)", "(dd, J = 17.0, 10.5 Hz, 1H)")
_SETTINGS = {
    "solvent": ("CDCl3", "DMSO-d6", "D2O", "CD3OD", "beer"),
    "frequency_mhz": (400, 60, 0, -1, 1e300),
    "prior": (0.01, 0.99, 0, 1, 2),
    "coverage": (0.5, 0.999, 0, 1),
    "expected": (["CCO"], ["CC(=O)O", "O"], ["?"], ["[Na+].[Cl-]"]),
}


def build_comparison_input(chance: random.Random) -> str:
    structure = chance.choice(MOLECULES) if chance.random() < 0.7 else write_text(SMILES, chance, "chain", 8)
    c13 = ", ".join(f"{chance.uniform(-5, 225):.1f}" for _ in range(chance.randrange(15)))
    h1 = ", ".join(f"{chance.uniform(-1, 13):.2f} {chance.choice(_BEHIND)}" for _ in range(chance.randrange(12)))
    given = dict(structure=structure, c13=c13, h1=h1, rivals=chance.choice((0, 1, 3, 5)), mass_confirmed=chance.random() < 0.5)
    if chance.random() < 0.2:
        given[chance.choice(("c13", "h1"))] = build_peak_text(chance)
    for name, choices in _SETTINGS.items():
        if chance.random() < 0.15:
            given[name] = chance.choice(choices)
    return json.dumps(given)


def use_comparison_input(text: str) -> None:
    given = json.loads(text)
    structure = given.pop("structure")
    try:
        table = shiftpred.predict(structure)
        carbons = table[table.nucleus == "13C"] if "nucleus" in table else table[:0]
        for atom in list(carbons.atom)[:2]:
            found = shiftpred.explain(structure, int(atom) - 1)
            assert abs(sum(c.contribution_ppm for c in found.contributions) - found.shift_ppm) < 1e-6
    except ShiftpredError:
        pass  # compare has to say so itself
    found = shiftpred.compare(structure, **{k: v or None if k in ("c13", "h1") else v for k, v in given.items()})
    assert found.judgement in ("supported", "open", "contradicted") and 0 <= found.probability <= 1
    document = found.to_dict()
    json.loads(render_json(document))
    render_comparison_text(document)
    render_comparison_html(document)


if __name__ == "__main__":
    run_from_command_line("comparisons", build_comparison_input, use_comparison_input)
