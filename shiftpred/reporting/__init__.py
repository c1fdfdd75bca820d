"""Results → one dictionary → text, CSV, JSON, HTML, SVG (see README.md in this folder).

Nothing is imported before it is asked for: `predict --format csv` loads neither templates nor pictures.
"""

from shiftpred.lazy_names import build_lazy_names

_HOME = {
    "PREDICTION_COLUMNS": "shiftpred.reporting.prediction_rows",
    "build_failure_entry": "shiftpred.reporting.summaries",
    "build_failure_row": "shiftpred.reporting.prediction_rows",
    "build_prediction_entry": "shiftpred.reporting.summaries",
    "build_prediction_frame": "shiftpred.reporting.data_frames",
    "build_prediction_rows": "shiftpred.reporting.prediction_rows",
    "build_refusal": "shiftpred.reporting.saving",
    "compute_comparison_dict": "shiftpred.reporting.summaries",
    "compute_explanation_dict": "shiftpred.reporting.summaries",
    "compute_prediction_dict": "shiftpred.reporting.summaries",
    "compute_prediction_heading": "shiftpred.reporting.summaries",
    "compute_ranking_dict": "shiftpred.reporting.summaries",
    "compute_substituent_dict": "shiftpred.reporting.summaries.substituent",
    "iterate_prediction_csv": "shiftpred.reporting.prediction_rows",
    "iterate_prediction_html": "shiftpred.reporting.pages",
    "iterate_prediction_json": "shiftpred.reporting.json_text",
    "iterate_prediction_sdf": "shiftpred.reporting.prediction_sdf",
    "load_schema": "shiftpred.reporting.json_text",
    "open_for_saving": "shiftpred.reporting.saving",
    "render_comparison_html": "shiftpred.reporting.pages",
    "render_comparison_nmredata": "shiftpred.reporting.nmredata",
    "render_comparison_text": "shiftpred.reporting.text.comparison",
    "render_explanation_html": "shiftpred.reporting.pages",
    "render_explanation_text": "shiftpred.reporting.text.explanation",
    "render_json": "shiftpred.reporting.json_text",
    "render_lane_svg": "shiftpred.reporting.pictures",
    "render_notebook_frame": "shiftpred.reporting.notebooks",
    "render_prediction_csv": "shiftpred.reporting.prediction_rows",
    "render_prediction_html": "shiftpred.reporting.pages",
    "render_prediction_table": "shiftpred.reporting.text.prediction",
    "render_ranking_html": "shiftpred.reporting.pages",
    "render_ranking_text": "shiftpred.reporting.text.ranking",
    "render_structure_svg": "shiftpred.reporting.pictures",
    "render_verdict_line": "shiftpred.reporting.text.comparison",
    "render_waterfall_svg": "shiftpred.reporting.pictures",
    "save_text": "shiftpred.reporting.saving",
}

__all__, __getattr__, __dir__ = build_lazy_names(globals(), _HOME)
