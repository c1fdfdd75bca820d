"""Text output against stored texts, and the wording of numbers."""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path

import pytest
import report_builders as build

from shiftpred.errors import StructureError
from shiftpred.records import RecordFailure
from shiftpred.reporting import (
    compute_comparison_dict,
    compute_ranking_dict,
    render_comparison_text,
    render_explanation_text,
    render_prediction_table,
    render_ranking_text,
)
from shiftpred.reporting.text.layout import clean_text, render_columns, render_points
from shiftpred.reporting.wording import (
    build_setting_lines,
    format_interval,
    format_likelihood_ratio,
    format_observed,
    format_probability,
    format_shift,
    format_signed,
)

GOLDEN = Path(__file__).parent / "golden"
TOOL = {"name": "shiftpred", "version": "0", "libraries": {"python": "0", "numpy": "0", "rdkit": "0"}}


def _failure():
    return RecordFailure("3", StructureError("structure 3", "'C(('", "a SMILES", "check the brackets"))


TEXTS = {
    "supported": lambda: render_comparison_text(
        compute_comparison_dict(build.build_supported(), "EB-1", "2025-03-31", "A. Name") | {"tool": TOOL}
    ),
    "contradicted": lambda: render_comparison_text(compute_comparison_dict(build.build_contradicted()) | {"tool": TOOL}),
    "open": lambda: render_comparison_text(compute_comparison_dict(build.build_open()) | {"tool": TOOL}),
    "explanation": lambda: render_explanation_text([build.build_explanation(), build.build_explanation("1H")]),
    "prediction": lambda: render_prediction_table([build.build_prediction(), _failure()]),
    "ranking": lambda: render_ranking_text(compute_ranking_dict(build.build_ranking(), "EB-1") | {"tool": TOOL}),
}


@pytest.mark.parametrize("name", TEXTS)
def test_text_is_as_stored(name):
    """Set SHIFTPRED_STORE_TEXTS=1 to store anew what you have read and found right."""
    text, path = TEXTS[name](), GOLDEN / f"{name}.txt"
    if os.environ.get("SHIFTPRED_STORE_TEXTS"):
        path.write_text(text, encoding="utf-8")
    assert text == path.read_text(encoding="utf-8")


@pytest.mark.parametrize("name", TEXTS)
def test_sentences_are_wrapped_and_no_line_ends_in_blanks(name):
    lines = TEXTS[name]().split("\n")
    assert [line for line in lines if line != line.rstrip()] == []
    assert TEXTS[name]().endswith("\n") and not TEXTS[name]().endswith("\n\n")


def test_columns_line_up_and_empty_ones_are_left_out():
    lines = render_columns(("a", "number", "empty", "日本"), [("x", "1.5", "", "é"), ("longer", "12.25", "", "語")], "lrll")
    assert lines == ["  a       number  日本", "  x          1.5  é", "  longer   12.25  語"]


def test_a_name_cannot_command_the_terminal():
    evil = replace(build.build_supported(), structure=build.build_structure(name="a\x1b[2J\nb\u202ec"))
    text = render_comparison_text(evil)
    assert "\x1b" not in text and "\u202e" not in text
    assert "a[2J bc" in text
    assert clean_text("plain, δ 7.26") == "plain, δ 7.26"


def test_points_wrap_to_the_width():
    lines = render_points(["word " * 40], 60, numbered=True)
    assert all(len(line) <= 60 for line in lines) and lines[0].startswith("  1. word") and lines[1].startswith("     word")


@pytest.mark.parametrize(
    ("ratio", "words"),
    [
        (None, ""),
        (0.0, ""),
        (1.0, "about as well"),
        (3.25, "fits 3.2 times better"),
        (3812.4, "fits 3,800 times better than the nearest rival"),
        (1e-3, "the nearest rival fits 1,000 times better"),
        (1e30, "more than a million times better than the nearest rival"),
        (1e-30, "the nearest rival fits more than a million times better"),
    ],
)
def test_the_likelihood_ratio_reads_both_ways(ratio, words):
    assert words in format_likelihood_ratio(ratio)


def test_probabilities_are_never_rounded_to_certainty():
    assert [format_probability(p) for p in (1.0, 0.995, 0.99, 0.5, 0.01, 0.004, 0.0)] == [
        "> 0.99", "> 0.99", "0.99", "0.50", "0.01", "< 0.01", "< 0.01",
    ]  # fmt: skip


def test_numbers_carry_the_decimals_of_the_trade():
    assert (format_shift(128.349, "13C"), format_shift(7.2649, "1H"), format_shift(-0.02, "1H")) == ("128.3", "7.26", "−0.02")
    assert (format_observed(60.49, "13C"), format_observed(60.5, "13C"), format_observed(4.152, "1H")) == (
        "60.49",
        "60.5",
        "4.152",
    )
    assert (format_signed(0.04, "13C"), format_signed(-0.31, "13C"), format_signed(0.05, "1H")) == ("0.0", "−0.3", "+0.05")
    assert format_interval(None, 3.0, "1H") == "below 3.00" and format_interval(None, None, "1H") == "unbounded"


def test_every_setting_is_listed_with_its_default():
    lines = dict(build_setting_lines(compute_comparison_dict(build.build_contradicted())["settings"]))
    assert len(lines) == 8
    assert lines["1H frequency"] == "not given" and lines["mass confirmed"] == "no" and lines["prior"] == "0.5"
