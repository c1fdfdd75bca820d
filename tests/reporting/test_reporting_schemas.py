"""The dictionaries keep to their schemas, and the schemas to the contract."""

from __future__ import annotations

import copy
import json
from dataclasses import dataclass, replace

import jsonschema
import pytest
import report_builders as build
from rdkit import Chem

from shiftpred.errors import NotApplicable, SettingError, StructureError
from shiftpred.records import RecordFailure, Structure
from shiftpred.reporting import (
    compute_comparison_dict,
    compute_explanation_dict,
    compute_prediction_dict,
    compute_prediction_heading,
    compute_ranking_dict,
    compute_substituent_dict,
    iterate_prediction_json,
    load_schema,
    render_json,
)
from shiftpred.reporting.json_text import SCHEMA_NAMES

CONTRACT = [
    "schema_version", "tool", "model", "structure", "settings", "judgement", "probability", "reasons", "assignments",
    "unexplained", "missing", "reference_offset_ppm", "rivals", "cautions",
]  # fmt: skip
CONTRACT_ASSIGNMENT = [
    "nucleus", "atom", "equivalent_atoms", "attached_h", "shift_ppm", "lower_ppm", "upper_ppm", "observed_ppm",
    "deviation_ppm", "within_interval", "note",
]  # fmt: skip


@dataclass
class _Constants:
    group: str
    sigma_i: float
    sources: tuple[str, ...]


def _failure(name="3"):
    return RecordFailure(name, StructureError("structure 3", "'C(('", "a SMILES", "check the brackets"))


DOCUMENTS = {
    "supported": ("comparison-1", lambda: compute_comparison_dict(build.build_supported(), "EB-1", "2025-03-31", "A. Name")),
    "contradicted": ("comparison-1", lambda: compute_comparison_dict(build.build_contradicted())),
    "open": ("comparison-1", lambda: compute_comparison_dict(build.build_open())),
    "prediction": ("prediction-1", lambda: compute_prediction_dict([build.build_prediction(), _failure()])),
    "explanation": (
        "explanation-1",
        lambda: compute_explanation_dict([build.build_explanation(), build.build_explanation("1H")]),
    ),
    "ranking": ("ranking-1", lambda: compute_ranking_dict(replace(build.build_ranking(), failures=(_failure(),)), "EB-1")),
    "substituent": (
        "substituent-1",
        lambda: compute_substituent_dict(
            [("*OC", _Constants("*OC", 0.27, ("computed",))), ("*[O-]", NotApplicable("*[O-]", "a charge", "none", "*O"))]
        ),
    ),
}


def _close(schema):
    """Return the schema with every object closed, so that a key nobody documented shows up."""
    schema = copy.deepcopy(schema)

    def walk(node):
        if isinstance(node, dict):
            if "properties" in node:
                node.setdefault("additionalProperties", False)
            for value in node.values():
                walk(value)
        elif isinstance(node, list):
            for value in node:
                walk(value)

    walk(schema)
    return schema


@pytest.mark.parametrize("name", DOCUMENTS)
def test_a_dictionary_keeps_to_its_schema_and_every_key_is_documented(name):
    schema, compute = DOCUMENTS[name]
    schema = _close(load_schema(schema))
    jsonschema.Draft202012Validator.check_schema(schema)
    jsonschema.validate(json.loads(render_json(compute())), schema)


@pytest.mark.parametrize("name", SCHEMA_NAMES)
def test_every_key_of_a_schema_says_what_it_means(name):
    def walk(node, path):
        for key, value in node.get("properties", {}).items():
            if "$ref" not in value and "const" not in value:
                assert value.get("description"), f"{path}.{key}"
            walk(value, f"{path}.{key}")

    schema = load_schema(name)
    walk(schema, name)
    for part, definition in schema["$defs"].items():
        walk(definition, f"{name}#{part}")


def test_the_schema_refuses_a_wrong_judgement_and_a_missing_key():
    schema = load_schema("comparison-1")
    wrong = compute_comparison_dict(replace(build.build_supported(), judgement="certain"))
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(wrong, schema)
    short = compute_comparison_dict(build.build_supported())
    del short["cautions"]
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(short, schema)


def test_the_contract_s_keys_are_there():
    document = compute_comparison_dict(build.build_supported())
    assert [key for key in CONTRACT if key not in document] == []
    assert [key for key in CONTRACT_ASSIGNMENT if key not in document["assignments"][0]] == []
    assert set(document["unexplained"][0]) >= {"nucleus", "observed_ppm", "likely"}


def test_an_unbounded_end_is_null_and_the_text_is_strict_json():
    document = compute_comparison_dict(build.build_open())
    ends = {a["atom"]: a["upper_ppm"] for a in document["assignments"] if a["nucleus"] == "1H"}
    assert ends[2] is None and ends[1] == pytest.approx(1.55)
    assert "Infinity" not in render_json(document) and "NaN" not in render_json(document)
    with pytest.raises(ValueError):
        render_json({"value": float("nan")})


def test_probabilities_keep_their_size_near_the_ends():
    certain = replace(build.build_supported(), probability=1 - 1.23456e-9, likelihood_ratio=1.2345678e9)
    document = compute_comparison_dict(certain)
    assert document["probability"] == pytest.approx(1 - 1.23456e-9, abs=1e-12) and document["probability"] < 1
    assert document["likelihood_ratio"] == pytest.approx(1.23457e9)
    assert compute_comparison_dict(replace(build.build_supported(), probability=1.23456e-9))["probability"] == 1.23456e-9


def test_the_same_input_gives_the_same_document_and_the_date_only_when_asked():
    first, second = (render_json(compute_comparison_dict(build.build_supported())) for _ in range(2))
    assert first == second
    assert json.loads(first)["date"] == ""
    assert compute_comparison_dict(build.build_supported(), date="2025-03-31")["date"] == "2025-03-31"


def test_an_unnamed_structure_lends_its_text_as_the_sample_name():
    unnamed = replace(build.build_supported(), structure=build.build_structure(name="1"))
    assert compute_comparison_dict(unnamed)["sample"] == build.ETHYL_BENZOATE
    assert compute_comparison_dict(unnamed, "EB-1")["sample"] == "EB-1"
    assert compute_comparison_dict(build.build_supported())["sample"] == "ethyl benzoate"


def test_the_caution_is_in_every_document_once():
    for name, (_, compute) in DOCUMENTS.items():
        cautions = compute().get("cautions")
        if name != "substituent":
            assert sum("evidence, not proof of identity" in c for c in cautions) == 1


def test_atom_numbers_of_the_smiles_are_the_user_s_own():
    mol = Chem.MolFromSmiles("OCC")  # oxygen is the user's atom 1; canonical SMILES begins with a carbon
    document = compute_prediction_dict([build.build_prediction(Structure("x", mol, (10, 20, 30), "OCC"), nuclei=())])
    structure = document["molecules"][0]["structure"]
    assert structure["smiles"] == "CCO" and structure["smiles_atoms"] == [30, 20, 10]
    assert structure["coordinates"] is None


def test_the_user_s_own_drawing_is_kept():
    mol = Chem.MolFromMolBlock(Chem.MolToMolBlock(Chem.MolFromSmiles("OCC")))
    flat = compute_prediction_dict([build.build_prediction(Structure("x", mol, (1, 2, 3), "x.mol"), nuclei=())])
    points = flat["molecules"][0]["structure"]["coordinates"]
    assert len(points) == 3 and len({tuple(p) for p in points}) == 3
    for atom in range(3):
        mol.GetConformer().SetAtomPosition(atom, (0.0, 0.0, 0.0))
    empty = compute_prediction_dict([build.build_prediction(Structure("x", mol, (1, 2, 3), "x.mol"), nuclei=())])
    assert empty["molecules"][0]["structure"]["coordinates"] is None


def test_streamed_json_is_the_same_document():
    records = [build.build_prediction(), _failure(), build.build_prediction()]
    heading = compute_prediction_heading("2025-edition-1")
    assert json.loads("".join(iterate_prediction_json(heading, records))) == compute_prediction_dict(records)
    empty = json.loads("".join(iterate_prediction_json(heading, [])))
    assert empty["molecules"] == []


def test_contributions_add_up_to_the_shift_in_the_document_too():
    entry = compute_explanation_dict(build.build_explanation())["explanations"][0]
    assert sum(c["contribution_ppm"] for c in entry["contributions"]) == entry["shift_ppm"]


def test_an_unknown_schema_is_refused_with_the_names():
    with pytest.raises(SettingError, match="comparison-1, explanation-1"):
        load_schema("../../secrets")
