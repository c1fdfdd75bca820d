"""The tutorial notebooks run from top to bottom, and results show themselves in them."""

import re
from importlib.resources import files

import pytest

import shiftpred

NOTEBOOKS = sorted(p.name for p in (files("shiftpred") / "guide" / "notebooks").iterdir() if p.name.endswith(".ipynb"))
SHOWN = {"verify_a_structure.ipynb": 3, "decide_between_regioisomers.ipynb": 1}
"""How many of our own records each notebook shows."""
JUDGED = {
    "verify_a_structure.ipynb": ["'supported'", "('contradicted'"],
    "decide_between_regioisomers.ipynb": ["'COC(=O)c1ccc([N+](=O)[O-])cc1'", "('contradicted'"],
}
C13 = [166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3]


def load(name):
    nbformat = pytest.importorskip("nbformat")
    return nbformat.reads((files("shiftpred") / "guide" / "notebooks" / name).read_text(encoding="utf-8"), 4)


def test_there_are_two_notebooks_without_stored_outputs():
    assert NOTEBOOKS == sorted(SHOWN)
    for name in NOTEBOOKS:
        assert all(not cell.get("outputs") and cell.get("execution_count") is None for cell in load(name).cells)


@pytest.mark.slow
@pytest.mark.parametrize("name", NOTEBOOKS)
def test_notebook_runs_from_top_to_bottom(name, tmp_path):
    nbclient = pytest.importorskip("nbclient")
    pytest.importorskip("ipykernel")
    notebook = load(name)
    # A cell that raises stops the run with its message.
    nbclient.NotebookClient(
        notebook, timeout=120, kernel_name="python3", resources={"metadata": {"path": str(tmp_path)}}
    ).execute()
    data = [output.data for cell in notebook.cells for output in cell.get("outputs", ()) if "data" in output]
    shown = [d["text/html"] for d in data if "srcdoc=" in d.get("text/html", "") or "<caption>" in d.get("text/html", "")]
    assert len(shown) == SHOWN[name]
    said = [d["text/plain"] for d in data]
    for text in JUDGED[name]:
        assert any(line.startswith(text) for line in said), (text, said)


@pytest.fixture(scope="module")
def frames():
    from shiftpred.pipeline import rank_structures

    evil = 'CCOC(=O)c1ccccc1 <img src=x onerror="alert(1)">'
    return {
        "comparison": shiftpred.compare(evil, c13=C13)._repr_html_(),
        "ranking": rank_structures([evil, "CCC(=O)Oc1ccccc1"], c13=C13)._repr_html_(),
        "explanation": shiftpred.explain(evil, 1)._repr_html_(),
    }


@pytest.mark.parametrize("kind", ["comparison", "ranking", "explanation"])
def test_reports_show_themselves_in_a_frame_that_loads_nothing(frames, kind):
    import html

    frame = frames[kind]
    assert re.fullmatch(r'<iframe sandbox="" title="[^"<>]*" style="[^"<>]*" srcdoc="[^"<>]*"></iframe>', frame)
    page = html.unescape(re.search(r'srcdoc="([^"]*)"', frame)[1])
    assert page.lstrip().lower().startswith("<!doctype html>") and "<script" not in page and "<img" not in page
    assert not re.search(r'(?:src|href)="?https?:', page) and "evidence, not proof" in page


def test_substituents_show_themselves_as_an_escaped_table():
    shown = shiftpred.substituent("*[N+](=O)[O-]")
    table = shown._repr_html_()
    assert table.count("<tr>") == 1 + len(shown.values) + len(shown.undefined)
    assert "<td style='text-align:left'>0.780</td>" in table and "Hansch, Leo &amp; Taft" in table and "<script" not in table
