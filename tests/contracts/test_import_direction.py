"""Rooms import along the way of a value, never against it; prediction stays free of what only training needs."""

import ast
import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parents[2] / "shiftpred"
ORDER = [
    "lazy_names",
    "structures",
    "substituents",
    "electronics",
    "features",
    "regression",
    "calibration",
    "bundles",
    "predicting",
    "peaks",
    "assignment",
    "judgement",
    "pipeline",
    "reporting",
    "exit_codes",
    "triage",
    "web",
    "training",
    "cli",
]
# Rooms that stand beside the way: a table of trade names and constants that both neighbours read.
ALLOWED_BACK = {("substituents", "electronics"), ("structures", "substituents"), ("pipeline", "reporting")}


def room(path: Path) -> str:
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def imported_rooms(path: Path):
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.ImportFrom) and node.module and node.module.startswith("shiftpred."):
            yield node.module.split(".")[1], node.lineno
        elif isinstance(node, ast.Import):
            for alias in node.names:
                if alias.name.startswith("shiftpred."):
                    yield alias.name.split(".")[1], node.lineno


def test_every_room_is_in_the_order():
    rooms = {room(p) for p in PACKAGE.rglob("*.py")} - {"__init__", "__main__", "errors", "records"}
    assert rooms <= set(ORDER), f"put {rooms - set(ORDER)} into ORDER"


@pytest.mark.parametrize("path", sorted(PACKAGE.rglob("*.py")), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_imports_point_one_way(path):
    own = room(path)
    for other, line in imported_rooms(path):
        if (
            other in ("errors", "records")
            or other == own
            or (own, other) in ALLOWED_BACK
            or own in ("__init__", "__main__", "records")
        ):
            continue
        assert own in ORDER, f"{path.name}:{line}: {own} must not import {other}"
        assert ORDER.index(other) < ORDER.index(own), f"{path.name}:{line}: {own} imports {other}, against the order"


def test_prediction_loads_nothing_heavy():
    code = (
        "import sys, shiftpred.cli\n"
        "from click.testing import CliRunner\n"
        "result = CliRunner().invoke(shiftpred.cli.command, ['predict', 'CCO', '--format', 'csv'])\n"
        "assert result.exit_code == 0, result.output\n"
        "heavy = {'sklearn', 'torch', 'matplotlib', 'pickle5', 'dask'} & set(sys.modules)\n"
        "assert not heavy, heavy\n"
    )
    subprocess.run([sys.executable, "-c", code], check=True)
