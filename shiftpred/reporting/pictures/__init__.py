"""Dictionaries → SVG: the structure, the lane of a nucleus, the waterfall of an explanation, small marks."""

from shiftpred.reporting.pictures.lane import render_lane_svg
from shiftpred.reporting.pictures.marks import render_deviation_svg, render_judgement_svg
from shiftpred.reporting.pictures.structure import render_structure_svg
from shiftpred.reporting.pictures.waterfall import render_waterfall_svg

__all__ = [
    "render_deviation_svg",
    "render_judgement_svg",
    "render_lane_svg",
    "render_structure_svg",
    "render_waterfall_svg",
]
