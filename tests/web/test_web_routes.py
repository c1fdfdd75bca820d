"""The routes answer, refuse in four parts, and describe themselves."""

import pytest

pytest.importorskip("fastapi")
from fastapi.testclient import TestClient

from shiftpred.web import create_app
from shiftpred.web.gate import LOCAL_HOSTS
from shiftpred.web.workers import InlineWorkers, OutOfTime, Refused, WorkerPool

BENZOATE = "CCOC(=O)c1ccccc1"
C13 = "166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3"


@pytest.fixture(scope="module")
def client():
    with TestClient(create_app(InlineWorkers(), (*LOCAL_HOSTS, "testserver"))) as one:
        yield one


def test_structure_is_read_and_drawn(client):
    found = client.post("/api/structure", json={"structure": BENZOATE}).json()
    assert found["structure"]["formula"] == "C9H10O2"
    assert found["picture"].count('class="site"') == 11


def test_peaks_say_what_was_understood(client):
    found = client.post("/api/peaks", json={"nucleus": "13C", "text": f"13C NMR (101 MHz, CDCl3) δ {C13}"}).json()
    assert found["error"] is None and found["understood"]["solvent"] == "CDCl3"
    assert len(found["understood"]["lines"]) == 7


def test_peaks_name_the_place_of_every_problem(client):
    found = client.post("/api/peaks", json={"nucleus": "13C", "text": "166.6, abc, 132.8, 9x9x"}).json()
    assert found["understood"] is None
    texts = [p["text"] for p in found["error"]["problems"]]
    assert any("abc" in t for t in texts) and any("9x9x" in t for t in texts)
    assert all(p["place"] and p["reason"] for p in found["error"]["problems"])


def test_predict_gives_shifts_and_pictures(client):
    found = client.post("/api/predict", json={"structure": BENZOATE, "solvent": "CDCl3"}).json()
    shifts = {n["atom"]: n["shift_ppm"] for n in found["prediction"]["molecules"][0]["nuclei"] if n["nucleus"] == "13C"}
    assert shifts[4] > 160 and shifts[1] < 20
    assert set(found["pictures"]["structure"]) == {"13C", "1H"}


def test_compare_judges_and_links_every_bar_to_its_atoms(client):
    found = client.post("/api/compare", json={"structure": BENZOATE, "c13": C13, "h1": "4.38, 1.39", "solvent": "CDCl3"}).json()
    document = found["comparison"]
    assert document["judgement"] == "supported"
    lane = found["pictures"]["lanes"]["13C"]
    for entry in document["assignments"]:
        if entry["nucleus"] == "13C":
            assert f'data-atoms="{" ".join(map(str, entry["equivalent_atoms"]))}"' in lane
    assert lane.count('class="bar"') == 7


def test_compare_is_the_pipelines_own_answer(client):
    import shiftpred

    ours = client.post("/api/compare", json={"structure": BENZOATE, "c13": C13, "solvent": "CDCl3"}).json()["comparison"]
    theirs = shiftpred.compare(BENZOATE, c13=C13, solvent="CDCl3").to_dict()
    for key in ("judgement", "probability", "assignments", "unexplained", "missing", "rivals"):
        assert ours[key] == theirs[key]


def test_rank_orders_and_lists_what_it_could_not_read(client):
    asked = {"structures": f"CCC(=O)Oc1ccccc1\nno-structure\n{BENZOATE}", "c13": C13}
    found = client.post("/api/rank", json=asked).json()["ranking"]
    assert found["candidates"][0]["structure"]["smiles"] == BENZOATE
    assert len(found["failures"]) == 1


def test_explain_adds_up(client):
    one = client.post("/api/explain", json={"structure": BENZOATE, "atom": 4}).json()["explanation"]["explanations"][0]
    assert sum(c["contribution_ppm"] for c in one["contributions"]) == pytest.approx(one["shift_ppm"], abs=1e-9)


def test_report_is_a_file_and_never_a_page(client):
    found = client.post("/api/report", json={"structure": BENZOATE, "c13": C13})
    assert found.headers["content-type"].startswith("text/plain")
    assert found.headers["content-disposition"].startswith("attachment")
    assert "<!doctype html" in found.text[:200].lower() and "http://" not in found.text.replace("http://www.w3.org", "")
    table = client.post("/api/report", json={"structure": BENZOATE, "c13": C13, "format": "csv"}).text
    assert table.startswith("molecule,atom,nucleus,")


@pytest.mark.parametrize(
    ("route", "asked"),
    [
        ("compare", {"structure": "C1CC", "c13": "20"}),
        ("compare", {"structure": BENZOATE, "c13": "twenty"}),
        ("compare", {"structure": BENZOATE}),
        ("compare", {"structure": BENZOATE, "c13": C13, "prior": 2}),
        ("compare", {"structure": BENZOATE, "c13": C13, "model": "somewhere"}),
        ("compare", {"structure": BENZOATE, "c13": C13, "expected": ["?"]}),
        ("compare", {"structure": "CCO\nCCC", "c13": C13}),
        ("predict", {"structure": BENZOATE, "solvent": "soup of the day"}),
        ("predict", {"structure": "C" * 2000}),
        ("explain", {"structure": BENZOATE, "atom": 99}),
        ("explain", {"structure": BENZOATE, "atom": 4, "nucleus": "1H"}),
        ("rank", {"structures": "CCO\n" * 101, "c13": "20"}),
        ("rank", {"structures": "CCO"}),
    ],
)
def test_refusals_have_four_parts(client, route, asked):
    found = client.post(f"/api/{route}", json=asked)
    assert found.status_code == 422
    error = found.json()["error"]
    assert all(error[part] for part in ("where", "came", "would_do", "try_next", "message"))


def test_description_has_examples_that_work(client):
    description = client.get("/api/openapi.json").json()
    for route in ("predict", "compare", "rank", "explain", "report", "structure", "peaks"):
        body = description["paths"][f"/api/{route}"]["post"]["requestBody"]["content"]["application/json"]["schema"]
        schema = description["components"]["schemas"][body["$ref"].rsplit("/", 1)[1]]
        for example in schema["examples"]:
            assert client.post(f"/api/{route}", json=example).status_code == 200, route


def test_page_and_its_parts_are_shipped(client):
    import re

    for page in (client.get("/"), client.get("/triage")):
        assert page.status_code == 200
        for address in re.findall(r'(?:src|href)="(/[^"]*)"', page.text):
            assert client.get(address).status_code == 200, address
    assert client.get("/static/shared.js").status_code == 200
    assert client.get("/static/vendor/openchemlib/openchemlib.js").status_code == 200
    assert client.get("/static/vendor/openchemlib/LICENSE").status_code == 200


def test_work_that_takes_too_long_is_ended_and_the_next_is_done():
    import asyncio

    pool = WorkerPool(1, seconds=0.0)
    pool.start()
    try:
        with pytest.raises(OutOfTime):
            asyncio.run(pool.answer("predict", {"structure": "C" * 300}))
        pool.seconds = 20.0
        with pytest.raises(Refused):
            asyncio.run(pool.answer("predict", {"structure": "C1CC"}))
        assert asyncio.run(pool.answer("structure", {"structure": "CCO"}))["structure"]["formula"] == "C2H6O"
    finally:
        pool.stop()
