"""Nothing from a request is opened, no other site may ask, sizes are limited, names are escaped."""

import builtins
import os
from pathlib import Path

import pytest

pytest.importorskip("fastapi")
from fastapi.testclient import TestClient

from shiftpred.web import create_app
from shiftpred.web.gate import LARGEST_BODY, LOCAL_HOSTS
from shiftpred.web.workers import InlineWorkers

EVIL = "<img src=x onerror=alert(1)>"


@pytest.fixture(scope="module")
def client():
    with TestClient(create_app(InlineWorkers(), (*LOCAL_HOSTS, "testserver"))) as one:
        one.post("/api/compare", json={"structure": "CCO", "c13": "58, 18"})  # everything is loaded
        yield one


@pytest.fixture
def secret(tmp_path, monkeypatch):
    """Files in the current folder whose names could be taken for input; opening or looking for one fails the test."""
    monkeypatch.chdir(tmp_path)
    for name in ("CCC", "secret.smi", "12.5", "secret.csv", "C"):
        (tmp_path / name).write_text("CCCCCCCC stolen\n", encoding="utf-8")
    touched = []

    def watch(function):
        def watched(path, *args, **kwargs):
            if isinstance(path, str | bytes | os.PathLike) and str(path).startswith(
                (str(tmp_path), "secret", "/etc", "CCC", "12.5")
            ):
                touched.append(str(path))
            return function(path, *args, **kwargs)

        return watched

    monkeypatch.setattr(builtins, "open", watch(open))
    monkeypatch.setattr(os.path, "isfile", watch(os.path.isfile))
    monkeypatch.setattr(Path, "is_file", watch(Path.is_file))
    monkeypatch.setattr(Path, "open", watch(Path.open))
    return touched, tmp_path


@pytest.mark.parametrize(
    "structure", ["CCC", "secret.smi", "/etc/passwd", "-", "./secret.smi", "~/secret.smi", "{here}/secret.smi"]
)
def test_structures_are_never_paths(client, secret, structure):
    touched, here = secret
    text = structure.format(here=here)
    for route, field in (
        ("structure", "structure"),
        ("predict", "structure"),
        ("explain", "structure"),
        ("rank", "structures"),
    ):
        asked = {field: text} | ({"atom": 1} if route == "explain" else {}) | ({"c13": "20"} if route == "rank" else {})
        found = client.post(f"/api/{route}", json=asked)
        assert found.status_code == (200 if text == "CCC" else 422), found.text
        assert "stolen" not in found.text and "C8H18" not in found.text
    assert touched == []


@pytest.mark.parametrize("peaks", ["secret.csv", "/etc/passwd", "12.5", "{here}/secret.csv", "-"])
@pytest.mark.parametrize("nucleus", ["13C", "1H"])
def test_peaks_are_never_paths(client, secret, peaks, nucleus):
    touched, here = secret
    text = peaks.format(here=here)
    found = client.post("/api/peaks", json={"nucleus": nucleus, "text": text})
    assert (found.json()["understood"] is not None) == (peaks == "12.5")
    field = "c13" if nucleus == "13C" else "h1"
    compared = client.post("/api/compare", json={"structure": "CCO", field: text, "rivals": 0})
    assert "stolen" not in found.text + compared.text
    assert [t for t in touched if "secret" in t or "passwd" in t or t.endswith("12.5")] == []


@pytest.mark.parametrize("field", ["expected"])
@pytest.mark.parametrize("text", ["secret.smi", "/etc/passwd", "-"])
def test_what_else_may_be_in_the_tube_is_never_a_path(client, secret, field, text):
    found = client.post("/api/compare", json={"structure": "CCO", "c13": "58, 18", field: [text]})
    assert found.status_code == 422
    assert secret[0] == []


@pytest.mark.parametrize("host", ["evil.example", "evil.example:8317", "127.0.0.1.evil.example", "", "localhost.evil.example"])
def test_other_hosts_are_refused(client, host):
    assert client.get("/", headers={"host": host}).status_code == 400
    assert client.post("/api/structure", json={"structure": "C"}, headers={"host": host}).status_code == 400


@pytest.mark.parametrize("host", ["127.0.0.1", "127.0.0.1:8317", "localhost:9", "[::1]:8317", "[::1]", "LOCALHOST"])
def test_this_computer_is_let_in(client, host):
    assert client.get("/", headers={"host": host}).status_code == 200


@pytest.mark.parametrize("origin", ["https://evil.example", "null", "http://localhost:1", "http://testserver.evil.example", ""])
def test_other_origins_are_refused(client, origin):
    found = client.post("/api/structure", json={"structure": "C"}, headers={"origin": origin})
    assert found.status_code == 403
    assert "access-control-allow-origin" not in found.headers


def test_own_origin_is_let_in(client):
    assert client.post("/api/structure", json={"structure": "C"}, headers={"origin": "http://testserver"}).status_code == 200


def test_requests_from_another_site_without_origin_are_refused(client):
    assert client.post("/api/structure", json={"structure": "C"}, headers={"sec-fetch-site": "cross-site"}).status_code == 403


def test_only_json_is_read(client):
    assert (
        client.post("/api/structure", content='{"structure": "C"}', headers={"content-type": "text/plain"}).status_code == 415
    )


def test_large_bodies_are_refused_announced_or_not(client):
    large = b'{"structure": "' + b"C" * (LARGEST_BODY + 1) + b'"}'
    kind = {"content-type": "application/json"}
    assert client.post("/api/structure", content=large, headers=kind).status_code == 413
    pieces = (large[i : i + 65536] for i in range(0, len(large), 65536))
    found = client.post("/api/structure", content=pieces, headers=kind)
    assert found.status_code == 413 and found.json()["error"]["would_do"]


def test_a_list_that_is_too_long_is_refused(client):
    found = client.post("/api/peaks", json={"nucleus": "13C", "text": "12.5, " * 30_000})
    assert found.json().get("understood") is None and "at most" in found.text


def test_static_files_end_at_their_folder(client):
    for path in (
        "/static/../application.py",
        "/static/%2e%2e/application.py",
        "/static/..%2fapplication.py",
        "/static//etc/passwd",
    ):
        assert client.get(path).status_code == 404


@pytest.mark.parametrize("path", ["/", "/static/page.js", "/api/openapi.json"])
def test_nothing_from_outside_may_be_loaded(client, path):
    policy = client.get(path).headers["content-security-policy"]
    assert "default-src 'none'" in policy and "script-src 'self';" in policy and "http" not in policy
    assert "unsafe-eval" not in policy and "style-src 'self';" in policy


def test_page_names_no_outside_address():
    import shiftpred.web

    folder = Path(shiftpred.web.__file__).parent / "static"
    for name in ("page.html", "page.js", "page.css", "shared.js", "triage.html", "triage.js"):
        text = (folder / name).read_text(encoding="utf-8")
        assert "//" not in text.replace("// ", "").replace('"//', ""), name
        assert "innerHTML" not in text and "insertAdjacentHTML" not in text and "eval(" not in text


def test_names_are_escaped_wherever_they_turn_up(client):
    asked = {"structure": f"CCO {EVIL}", "c13": "58.0, 18.2", "sample": EVIL}
    report = client.post("/api/report", json=asked).text
    assert EVIL not in report and "&lt;img src=x" in report
    pictures = client.post("/api/compare", json=asked).json()["pictures"]
    assert "<img" not in str(pictures)
    assert "<img" not in client.post("/api/structure", json={"structure": f"CCO {EVIL}"}).json()["picture"]


def test_error_names_no_folder_of_this_computer(client):
    found = client.post("/api/predict", json={"structure": "nothing.smi"})
    assert os.getcwd() not in found.text
