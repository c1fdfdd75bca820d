"""Wheel and source archive in clean environments: oldest and newest Python, lowest and highest versions of what is needed.

Needs a package index; each environment takes a minute or two.
"""

import os
import re
import shutil
import subprocess
import sys
import tarfile
import tomllib
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
CHECK = Path(__file__).with_name("check_installed.py")
OLDEST, NEWEST = (3, 11), (3, 14)

pytestmark = pytest.mark.slow


def run(*words, cwd) -> str:
    outside = {k: v for k, v in os.environ.items() if not k.startswith(("PYTHON", "VIRTUAL_ENV", "SHIFTPRED"))}
    done = subprocess.run(list(map(str, words)), cwd=cwd, env=outside, capture_output=True, encoding="utf-8")
    assert done.returncode == 0, (words, done.stdout[-3000:], done.stderr[-3000:])
    return done.stdout


def build_environment(python, folder: Path) -> Path:
    run(python, "-m", "venv", folder, cwd=folder.parent)
    return folder / ("Scripts/python.exe" if sys.platform == "win32" else "bin/python")


@pytest.fixture(scope="module")
def archives(tmp_path_factory) -> Path:
    """Folder with the source archive and the wheel that was built from it."""
    folder = tmp_path_factory.mktemp("archives")
    python = build_environment(sys.executable, folder / "builder")
    run(python, "-m", "pip", "install", "-q", "build", cwd=folder)
    run(python, "-m", "build", "--outdir", folder / "dist", ROOT, cwd=folder)
    return folder / "dist"


def find_python(version) -> str | None:
    """Return an interpreter of that version that starts (a shim need not)."""
    name = "python" + ".".join(map(str, version))
    places = [sys.executable, shutil.which(name), *map(str, Path.home().glob(f".pyenv/versions/{name[6:]}.*/bin/python"))]
    for place in filter(None, places):
        done = subprocess.run([place, "-c", "import sys; print(*sys.version_info[:2])"], capture_output=True, encoding="utf-8")
        if done.returncode == 0 and done.stdout.split() == list(map(str, version)):
            return place
    return None


def find_newest() -> str:
    """Return the newest interpreter on this machine for which the project states support."""
    versions = [(3, minor) for minor in range(NEWEST[1], OLDEST[1] - 1, -1)]
    return next(place for v in versions if (place := find_python(v)))


def parse_lowest_versions() -> list[str]:
    """Return the lower bounds of pyproject.toml as pins."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    needed = project["dependencies"] + project["optional-dependencies"]["tables"]
    bounds = [re.fullmatch(r"([\w-]+)>=([\d.]+)", text) for text in needed]
    assert all(bounds), "every dependency has a lower bound and nothing else"
    return [f"{found[1]}=={found[2]}" for found in bounds]


def test_source_archive_and_wheel_hold_what_they_must(archives):
    (wheel,), (source,) = archives.glob("*.whl"), archives.glob("*.tar.gz")
    packed = zipfile.ZipFile(wheel).namelist()
    assert any(re.fullmatch(r"shiftpred/_models/[^/]+/manifest\.json", n) for n in packed)
    for path in (ROOT / "shiftpred").rglob("*"):
        if path.is_file() and "__pycache__" not in path.parts:
            assert path.relative_to(ROOT).as_posix() in packed
    assert not [n for n in packed if "__pycache__" in n or n.startswith("tests/")]
    unpacked = {n.split("/", 1)[-1] for n in tarfile.open(source).getnames()}
    assert {"README.md", "pyproject.toml", "tests/conftest.py", "shiftpred/__init__.py"} <= unpacked
    assert wheel.stat().st_size < 30_000_000


@pytest.mark.parametrize(
    "which, lowest", [("oldest", True), ("oldest", False), ("newest", False)], ids=["oldest-lowest", "oldest", "newest"]
)
def test_wheel_does_the_main_jobs(archives, tmp_path, which, lowest):
    python = find_python(OLDEST) if which == "oldest" else find_newest()
    if python is None:
        pytest.skip(f"no Python {OLDEST} on this machine")
    inside = build_environment(python, tmp_path / "environment")
    (wheel,) = archives.glob("*.whl")
    pins = parse_lowest_versions() if lowest else []
    run(inside, "-m", "pip", "install", "-q", "--only-binary", ":all:", f"{wheel}[tables]", *pins, cwd=tmp_path)
    assert "fine" in run(inside, "-I", CHECK, tmp_path, cwd=tmp_path)


def test_source_archive_does_the_main_jobs(archives, tmp_path):
    inside = build_environment(sys.executable, tmp_path / "environment")
    (source,) = archives.glob("*.tar.gz")
    run(inside, "-m", "pip", "install", "-q", f"{source}[tables]", cwd=tmp_path)
    assert "fine" in run(inside, "-I", CHECK, tmp_path, cwd=tmp_path)
