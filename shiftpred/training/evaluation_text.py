"""The dictionary of `evaluate_model` → one page of text, at most 132 columns wide."""

from __future__ import annotations

__all__ = ["render_evaluation"]

_BASELINE_TITLES = {
    "rules": "additivity rules",
    "lookup": "identical environments",
    "substituents": "substituent model alone",
    "plain": "plain message passing",
}
_SHORT_KINDS = {"13C": "13C", "1H on carbon": "1H(C)", "1H on others": "1H(X)"}
_FEWEST_SITES = 10


def render_evaluation(result: dict) -> str:
    """Render an evaluation.

    Parameters
    ----------
    result : dict
        From `shiftpred.training.evaluate.evaluate_model`.

    Returns
    -------
    str
    """
    parts = [
        _render_head(result),
        _render_overall(result),
        _render_baselines(result),
        _render_classes(result),
        _render_elements(result),
        _render_coverage(result),
        _render_certainty(result),
        _render_measured(result["measured"]),
    ]
    return "\n\n".join(part for part in parts if part) + "\n"


def _render_head(result: dict) -> str:
    lines = [
        f"Model {result['model']} on {result['compounds']:,} compounds of {result['tables']} (part: {result['split']}), "
        f"{result['seconds']:.0f} s",
        "Errors are absolute, in ppm, after the best assignment of each compound's peaks by the model itself, one row an atom;",
        "intervals are for a coverage of 90 %.",
        *(f"Note: {note}." for note in result["notes"]),
    ]
    return "\n".join(lines)


def _render_overall(result: dict) -> str:
    rows = []
    for kind, f in result["overall"].items():
        bare = result["without_hydrogen_counts"].get(kind, {})
        rows.append(
            (
                kind,
                _count(f["sites"]),
                _count(f["molecules"]),
                _ppm(f["mean"]),
                _ppm(f["median"]),
                _ppm(f["root_mean_square"]),
                _ppm(f["percentile_95"]),
                _ppm(bare.get("mean")),
                _ppm(bare.get("median")),
                _percent(f["coverage"]),
                _percent(f["coverage_by_molecule"]),
                _ppm(f["median_width"]),
                _ppm(f["interval_score"]),
                _ratio(f["score_ratio"]),
            )
        )
    head = (
        "",
        "sites",
        "molecules",
        "mean",
        "median",
        "RMS",
        "95th",
        "mean*",
        "median*",
        "covered",
        "by mol.",
        "width",
        "score",
        "of const.",
    )
    return (
        "ALL SITES\n"
        + _table(head, rows)
        + "\n* without the hydrogen counts that the peak table states"
        + "\n  of const.: interval score relative to one constant width chosen on these very sites"
    )


def _render_baselines(result: dict) -> str:
    rows = []
    for name, kinds in result["baselines"].items():
        for kind, f in kinds.items():
            if not f["sites"]:
                continue
            rows.append(
                (
                    _BASELINE_TITLES[name],
                    kind,
                    _count(f["sites"]),
                    _ppm(f["mean"]),
                    _ppm(f["model_mean"]),
                    _quotient(f["model_mean"], f["mean"]),
                    _ppm(f["median"]),
                    _ppm(f["model_median"]),
                    _ppm(f["mean_with_own_assignment"]),
                )
            )
    for nucleus, rules in result["rules"].items():
        for rule, f in rules.items():
            if f["sites"]:
                rows.append(
                    (
                        f"  rule: {rule}",
                        nucleus,
                        _count(f["sites"]),
                        _ppm(f["mean"]),
                        _ppm(f["model_mean"]),
                        _quotient(f["model_mean"], f["mean"]),
                        _ppm(f["median"]),
                        _ppm(f["model_median"]),
                        "",
                    )
                )
    if not rows:
        return ""
    head = ("", "", "sites", "mean", "model", "model/it", "median", "model", "own assignment")
    return (
        "BASELINES, ON THE SAME SITES WITH THE SAME OBSERVED VALUES (the model's assignment)\n"
        + _table(head, rows)
        + "\nown assignment: mean error after an assignment with the baseline's own values; 40 or 4 ppm where it has none"
    )


def _render_classes(result: dict) -> str:
    blocks = []
    names = [n for n in _BASELINE_TITLES if any(n in row for row in result["by_class"])]
    for nucleus in ("13C", "1H"):
        rows, small = [], 0
        for row in result["by_class"]:
            if row["nucleus"] != nucleus:
                continue
            if row["sites"] < _FEWEST_SITES:
                small += 1
                continue
            cells = [
                row["environment"],
                _count(row["sites"]),
                _count(row["molecules"]),
                _ppm(row["mean"]),
                _ppm(row["median"]),
                _percent(row["coverage"]) + ("!" if row.get("short") else ""),
                _ppm(row["median_width"]),
                _ppm(row["interval_score"]),
            ]
            for name in names:
                f = row.get(name, {})
                cells.append(_ppm(f.get("mean")))
                if name == "rules":
                    cells += [_ppm(f.get("model_mean")), _count(f.get("sites"))]
            rows.append(tuple(cells))
        if not rows:
            continue
        head = ["environment", "sites", "mol.", "mean", "median", "covered", "width", "score"]
        for name in names:
            head.append({"rules": "rules", "lookup": "look-up", "substituents": "subst.", "plain": "plain"}[name])
            if name == "rules":
                head += ["model", "n"]
        text = f"BY ENVIRONMENT CLASS, {nucleus}\n" + _table(tuple(head), rows)
        if small:
            text += f"\n{small} classes with fewer than {_FEWEST_SITES} sites: in the JSON output"
        blocks.append(text)
    if blocks:
        blocks[-1] += (
            "\nrules, model, n: mean error of the published rules, of the model on those same sites, and their number"
            "\n!  covers significantly less than 88 % (200 sites or more; clustered by molecule, corrected for all classes)"
        )
    return "\n\n".join(blocks)


def _render_elements(result: dict) -> str:
    kinds = list(result["overall"])
    rows = []
    for title, group in (
        *result["by_element"].items(),
        *result["by_novelty"].items(),
        ("scaffold not in training", result["new_scaffolds"]),
    ):
        if not group:
            continue
        cells = [title]
        for kind in kinds:
            f = group.get(kind)
            cells += [_count(f["sites"]), _ppm(f["mean"]), _ppm(f["median"]), _percent(f["coverage"])] if f else [""] * 4
        rows.append(tuple(cells))
    head = ["molecules or sites"]
    for kind in kinds:
        head += [_SHORT_KINDS[kind], "mean", "median", "cov."]
    return "BY ELEMENT AND BY NOVELTY (sites, errors, coverage; 1H on carbon, on other atoms)\n" + _table(tuple(head), rows)


def _render_coverage(result: dict) -> str:
    rows = []
    for kind, levels in result["coverage"].items():
        for nominal, f in levels.items():
            error = f["standard_error"]
            rows.append(
                (
                    kind,
                    _percent(float(nominal)),
                    _percent(f["coverage"]),
                    "" if error is None else f"{100 * error:.1f}",
                    _percent(f["coverage_by_molecule"]),
                    _ppm(f["median_width"]),
                    _ppm(f["interval_score"]),
                    _count(f["unbounded"]),
                )
            )
    head = ("", "promised", "covered", "+-", "by mol.", "width", "score", "unbounded")
    return "COVERAGE (+- standard error in points, clustered by molecule)\n" + _table(head, rows)


def _render_certainty(result: dict) -> str:
    rows = [
        (kind, _count(f["sites"]), _count(f["molecules"]), _ppm(f["mean"]), _ppm(f["median"]), _percent(f["coverage"]))
        for kind, f in result["certain"].items()
    ]
    text = "SITES WHOSE ASSIGNMENT NEEDS NO PREDICTION (hydrogen count and C-H pair leave one place)\n"
    text += _table(("", "sites", "molecules", "mean", "median", "covered"), rows)
    p, g = result["pairs"], result["geminal"]
    if p["pairs"]:
        text += (
            f"\n\nC-H pairs hidden, both nuclei assigned apart: {_percent(p['same_atom'])} of {p['pairs']:,} pairs meet"
            f" on one atom\n({_percent(p['by_chance'])} by chance among carbons with as many hydrogens);"
            f" of {p['open_pairs']:,} that hydrogen counts do not settle: {_percent(p['open_same_atom'])}."
        )
    if g["groups"]:
        text += (
            f"\n\nCH2 with two measured 1H values: {g['groups']:,}; {_percent(g['said_to_differ'])} are predicted as rows a, b."
            f"\nTheir distance is {_ppm(g['mean_gap_ppm'])} ppm on average, its error {_ppm(g['gap_error_ppm'])} ppm;"
            f" single hydrogens inside their intervals: {_percent(g['coverage'])}."
        )
    return text


def _render_measured(measured: dict) -> str:
    rows = []
    for kind, f in measured["nuclei"].items():
        clean = measured["without_suspects"].get(kind, {})
        rows.append(
            (
                kind,
                _count(f["sites"]),
                _ppm(f["mean"]),
                _ppm(f["median"]),
                _ppm(f["percentile_95"]),
                _percent(f["coverage"]),
                _ppm(f["median_width"]),
                _ppm(clean.get("mean")),
            )
        )
    text = (
        f"TRUE ASSIGNMENTS: {measured['rows']:,} published shifts of {measured['compounds']} compounds in their own solvents"
        f" ({measured['from_memory']} from memory)\n"
    )
    text += _table(("", "rows", "mean", "median", "95th", "covered", "width", "mean**"), rows)
    text += "\n** without rows whose note suspects a misprint or names a disagreement of sources"
    for kind, worst in measured["worst"].items():
        lines = [
            (
                w["name"],
                w["smiles"],
                str(w["atom_index"] + 1),
                w["solvent"],
                _ppm(w["observed_ppm"]),
                _ppm(w["predicted_ppm"]),
                f"{w['error_ppm']:+.2f}",
                "" if w["inside"] else "outside",
                w["note"][:40],
            )
            for w in worst
        ]
        text += f"\n\nWorst, {kind}\n" + _table(
            ("compound", "structure", "atom", "solvent", "observed", "predicted", "error", "", "note"), lines
        )
    rows = []
    for kind, parts in measured["solvent_differences"].items():
        for title, f in (("all", parts["all"]), *parts["by_solvent"].items(), *parts["by_group"].items()):
            if f["sites"] >= 5:
                rows.append(
                    (
                        kind,
                        title,
                        _count(f["sites"]),
                        f"{f['mean_published']:+.3f}",
                        f"{f['mean_predicted']:+.3f}",
                        _fine(f["error"]),
                        _fine(f["error_without_effect"]),
                        _ratio(f["correlation"]),
                    )
                )
    text += '\n\nSOLVENT EFFECT: change from CDCl3, published and predicted (mean), error, error of "no effect", correlation\n'
    text += _table(("", "", "pairs", "published", "predicted", "error", "no effect", "r"), rows)
    return text


def _table(head: tuple[str, ...], rows: list[tuple[str, ...]]) -> str:
    """Align columns: text to the left, numbers to the right."""
    widths = [max(len(r[k]) for r in [head, *rows]) for k in range(len(head))]
    numeric = [all(not r[k] or r[k][0] in "+-0123456789" for r in rows) for k in range(len(head))]

    def line(cells):
        return "  ".join(c.rjust(w) if n else c.ljust(w) for c, w, n in zip(cells, widths, numeric)).rstrip()

    return "\n".join([line(head), "  ".join("-" * w for w in widths), *(line(r) for r in rows)])


def _ppm(value: float | None) -> str:
    return (
        "" if value is None else f"{value:.1f}" if abs(value) >= 100 else f"{value:.2f}" if abs(value) >= 1 else f"{value:.3f}"
    )


def _fine(value: float | None) -> str:
    return "" if value is None else f"{value:.3f}"


def _ratio(value: float | None) -> str:
    return "" if value is None else f"{value:.2f}"


def _quotient(part: float | None, whole: float | None) -> str:
    return f"{part / whole:.2f}" if part is not None and whole else ""


def _percent(value: float | None) -> str:
    return "" if value is None else f"{100 * value:.1f} %"


def _count(value: int | None) -> str:
    return "" if not value else f"{value:,}"
