"""`shiftpred serve`: what it says when it cannot, and that it answers where it says."""

import json
import subprocess
import sys
import urllib.request

import pytest
from click.testing import CliRunner

from shiftpred.cli import command
from shiftpred.errors import SettingError


def test_without_the_extra_the_way_out_is_named(monkeypatch):
    monkeypatch.setattr("shiftpred.cli.extras.find_spec", lambda name: None)
    found = CliRunner().invoke(command, ["serve", "--no-browser"], standalone_mode=False)
    assert isinstance(found.exception, SettingError)
    assert "pip install 'shiftpred[web]'" in str(found.exception)


def test_a_port_that_is_taken_is_named():
    pytest.importorskip("fastapi")
    import socket

    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        port = str(taken.getsockname()[1])
        found = CliRunner().invoke(command, ["serve", "--no-browser", "--port", port], standalone_mode=False)
    assert isinstance(found.exception, SettingError) and port in str(found.exception)


def test_it_answers_at_the_address_that_it_prints_and_ends_when_told():
    pytest.importorskip("fastapi")
    arguments = [sys.executable, "-m", "shiftpred", "serve", "--port", "0", "--no-browser", "--workers", "1"]
    with subprocess.Popen(arguments, stdout=subprocess.PIPE, text=True) as server:
        try:
            address = server.stdout.readline().strip()
            assert address.startswith("http://127.0.0.1:")
            body = json.dumps({"structure": "CCO"}).encode()
            request = urllib.request.Request(address + "api/structure", body, {"content-type": "application/json"})
            with urllib.request.urlopen(request, timeout=60) as answer:
                assert json.load(answer)["structure"]["formula"] == "C2H6O"
            server.terminate()
            server.wait(20)
        finally:
            server.kill()
