"""Fixtures that every test folder may use."""

from pathlib import Path

import pytest


@pytest.fixture(scope="session")
def shared() -> Path:
    """Folder with the open shift tables and published values beside the checkout; the test is skipped without it."""
    folder = Path(__file__).resolve().parents[1].parent / "shared"
    if not (folder / "data" / "peaks.csv.gz").exists():
        pytest.skip("the open tables are not beside this checkout")
    return folder


@pytest.fixture(scope="session")
def shipped_model():
    """The model that is shipped with the package."""
    from shiftpred.bundles import load_default_bundle

    return load_default_bundle()
