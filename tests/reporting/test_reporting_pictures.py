"""Pictures: axis, labels, lanes, structures, waterfall."""

from __future__ import annotations

import re
from dataclasses import replace
from xml.etree import ElementTree

import pytest
import report_builders as build
from hypothesis import given, settings
from hypothesis import strategies as st

from shiftpred.records import Missing
from shiftpred.reporting import (
    compute_comparison_dict,
    compute_explanation_dict,
    render_lane_svg,
    render_structure_svg,
    render_waterfall_svg,
)
from shiftpred.reporting.pictures.axis import compute_axis_ticks, compute_rows, spread_labels
from shiftpred.reporting.pictures.lane import build_lane_entries, build_lane_key
from shiftpred.reporting.pictures.marks import render_deviation_svg, render_judgement_svg
from shiftpred.reporting.summaries.common import compute_structure_dict

SVG = "{http://www.w3.org/2000/svg}"


@given(st.lists(st.floats(0, 1000), max_size=40), st.floats(1, 30))
@settings(max_examples=200, deadline=None)
def test_spread_labels_keep_order_distance_and_bounds(wishes, gap):
    wishes = sorted(wishes)
    places = spread_labels(wishes, gap, 0.0, 1000.0)
    if (len(wishes) - 1) * gap > 1000.0:
        assert places is None
        return
    assert len(places) == len(wishes)
    assert all(-1e-6 <= p <= 1000 + 1e-6 for p in places)
    assert all(b - a >= gap - 1e-6 for a, b in zip(places, places[1:], strict=False))
    if all(b - a >= gap for a, b in zip(wishes, wishes[1:], strict=False)):
        assert places == pytest.approx(wishes)  # labels with room stay where they belong


@given(st.lists(st.tuples(st.floats(0, 500), st.floats(0, 60)), max_size=40))
@settings(max_examples=200, deadline=None)
def test_no_two_bars_of_one_row_touch(stretches):
    extents = [(begin, begin + length) for begin, length in stretches]
    rows = compute_rows(extents, 3.0)
    for i, (begin, end) in enumerate(extents):
        for j in range(i):
            if rows[i] == rows[j]:
                assert end + 3.0 <= extents[j][0] + 1e-9 or extents[j][1] + 3.0 <= begin + 1e-9


@given(st.floats(-50, 250), st.floats(0.01, 300), st.integers(2, 15))
@settings(max_examples=200, deadline=None)
def test_axis_ticks_are_inside_round_and_not_too_many(low, width, most):
    ticks = compute_axis_ticks(low, low + width, most)
    assert len(ticks) <= most + 1
    assert all(low - 1e-6 <= t <= low + width + 1e-6 for t in ticks)


@pytest.mark.parametrize("width", [340, 720, 1040])
@pytest.mark.parametrize("comparison", [build.build_supported, build.build_contradicted, build.build_open])
def test_a_lane_is_well_formed_and_stays_inside_its_frame(comparison, width):
    d = compute_comparison_dict(comparison())
    root = ElementTree.fromstring(render_lane_svg(d, "13C", width))
    assert root.get("viewBox").split()[2] == str(width) and root.get("role") == "img"
    height = float(root.get("viewBox").split()[3])
    for node in root.iter():
        for name in ("x", "x1", "x2", "cx"):
            if node.get(name) is not None:
                assert 0 <= float(node.get(name)) <= width, ElementTree.tostring(node)
        for name in ("y", "y1", "y2", "cy"):
            if node.get(name) is not None:
                assert 0 <= float(node.get(name)) <= height, ElementTree.tostring(node)


def test_a_lane_shows_every_set_of_nuclei_and_every_line():
    d = compute_comparison_dict(build.build_supported())
    bars, rail = build_lane_entries(d, "13C")
    assert [b.label for b in bars] == ["4", "9", "6", "7, 11", "8, 10", "2", "1"]
    assert [line.ppm for line in rail] == sorted(build.C13_SHIFTS, reverse=True)
    texts = {node.text for node in ElementTree.fromstring(render_lane_svg(d, "13C", 1040)).iter(f"{SVG}text")}
    assert {"7, 11", "171.4", "60.5", "13C shift, ppm"} <= texts


def test_higher_shifts_lie_to_the_left():
    d = compute_comparison_dict(build.build_supported())
    root = ElementTree.fromstring(render_lane_svg(d, "13C", 1040))
    places = {node.text: float(node.get("x")) for node in root.iter(f"{SVG}text") if node.get("text-anchor") == "middle"}
    assert places["160"] < places["80"] < places["20"]


def test_marks_tell_apart_what_fits_what_does_not_and_what_is_missing():
    key = [words for _, words in build_lane_key(compute_comparison_dict(build.build_contradicted()), "13C")]
    assert len(key) == 5 and "expected, no line" in key and "observed, outside the interval" in key
    key = [words for _, words in build_lane_key(compute_comparison_dict(build.build_open()), "13C")]
    assert "no line, excused" in key and "expected, no line" not in key
    key = [words for _, words in build_lane_key(compute_comparison_dict(build.build_supported()), "1H")]
    assert "observed as a range" in key
    assert render_lane_svg(compute_comparison_dict(build.build_contradicted()), "1H") == ""


def test_an_unbounded_interval_reaches_the_edge_and_a_lone_line_has_a_lane():
    d = compute_comparison_dict(build.build_open())
    assert 'x="14"' in render_lane_svg(d, "1H", 1040)
    lone = replace(
        build.build_supported(), assignments=(), missing=(Missing("1H", 1, (1,), "", 3, 1.4, 1.2, 1.6, ""),), unexplained=()
    )
    assert "svg" in render_lane_svg(compute_comparison_dict(lone), "1H")


def test_a_crowd_of_lines_drops_the_figures_rather_than_piling_them_up():
    lines = [round(20 + 0.5 * i, 1) for i in range(120)]
    d = compute_comparison_dict(build.build_supported(peaks={"13C": build.build_peak_list("13C", "", lines)}))
    d["assignments"] = []
    d["unexplained"] = [{"nucleus": "13C", "observed_ppm": x, "likely": None, "note": ""} for x in lines]
    narrow, wide = (ElementTree.fromstring(render_lane_svg(d, "13C", w)) for w in (340, 1040))
    assert not [n for n in narrow.iter(f"{SVG}text") if n.get("transform")]
    assert not [n for n in wide.iter(f"{SVG}text") if n.get("transform")]
    assert len(list(wide.iter(f"{SVG}polygon"))) == 120


def test_a_structure_shows_the_user_s_numbers_and_marks():
    structure = compute_structure_dict(build.build_structure())
    plain = render_structure_svg(structure, numbers=False)
    numbered = render_structure_svg(structure)
    assert len(numbered) > len(plain)  # figures are drawn as outlines
    marked = ElementTree.fromstring(render_structure_svg(structure, {2: "outside", 6: "missing", 99: "missing"}))
    assert len(list(marked.iter(f"{SVG}polygon"))) == 1
    assert sum(node.get("stroke-dasharray") is not None for node in marked.iter(f"{SVG}circle")) == 1


def test_a_structure_is_drawn_the_same_every_time_and_follows_the_page_s_colours():
    structure = compute_structure_dict(build.build_structure("CC(=O)Nc1ccc(O)cc1", "paracetamol"))
    assert render_structure_svg(structure) == render_structure_svg(structure)
    assert "#000000" not in render_structure_svg(structure) and "var(--ink" in render_structure_svg(structure)
    assert not re.search(r"\sid=|class='", render_structure_svg(structure))


@pytest.mark.parametrize(
    "smiles", ["CCO", "[Na+].[O-]C(C)=O", "C[N+](=O)[O-]", "F[P-](F)(F)(F)(F)F", "[2H]C", "C", "c1cc[nH]c1"]
)
def test_odd_structures_are_drawn(smiles):
    ElementTree.fromstring(render_structure_svg(compute_structure_dict(build.build_structure(smiles, "x"))))


def test_what_cannot_be_drawn_is_written():
    for smiles, numbers in (("not a SMILES <&>", []), ("C" * 400, list(range(1, 401))), ("", [])):
        svg = render_structure_svg({"smiles": smiles, "smiles_atoms": numbers, "coordinates": None, "name": "<x>"})
        root = ElementTree.fromstring(svg)
        assert "not drawn" in root.find(f"{SVG}title").text


def test_a_gauge_puts_lines_where_they_lie():
    def tick(svg):
        line = [
            n
            for n in ElementTree.fromstring(svg.replace("<svg", '<svg xmlns="http://www.w3.org/2000/svg"', 1))
            if "stroke-width" in n.attrib
        ]
        return line[-1]

    inside = tick(render_deviation_svg(100.0, 98.0, 102.0, 1.0))
    assert inside.tag.endswith("line") and float(inside.get("x1")) == 45.0  # higher shift: to the left
    assert float(tick(render_deviation_svg(100.0, 98.0, 104.0, 2.0)).get("x1")) == 45.0  # in units of its own side
    assert tick(render_deviation_svg(100.0, 98.0, 102.0, 50.0)).tag.endswith("polygon")
    assert tick(render_deviation_svg(100.0, None, None, 5.0)).get("x1") == "60"


def test_judgement_signs_are_known():
    for judgement in ("supported", "open", "contradicted"):
        assert "<svg" in render_judgement_svg(judgement)
    with pytest.raises(KeyError):
        render_judgement_svg("maybe")


@pytest.mark.parametrize("width", [340, 720, 1040])
@pytest.mark.parametrize("nucleus", ["13C", "1H"])
def test_a_waterfall_ends_at_the_shift(nucleus, width):
    entry = compute_explanation_dict(build.build_explanation(nucleus))["explanations"][0]
    root = ElementTree.fromstring(render_waterfall_svg(entry, width))
    texts = [node.text for node in root.iter(f"{SVG}text")]
    assert "predicted shift, with its interval" in texts and "alpha benzoyloxy" in texts
    assert f"{entry['shift_ppm']:.{2 if nucleus == '13C' else 3}f}" in texts
    dashed = [n for n in root.iter(f"{SVG}rect") if n.get("stroke-dasharray")]
    assert len(dashed) == 1  # the remainder stands out
    for node in root.iter(f"{SVG}rect"):
        assert 0 <= float(node.get("x")) and float(node.get("x")) + float(node.get("width")) <= width
