"""Models and data are plain numbers: no code path reads a pickle."""

import re
from pathlib import Path

import numpy as np
import pytest

from shiftpred.bundles.model_bundle import _unpack
from shiftpred.errors import BundleError

PACKAGE = Path(__file__).resolve().parents[2] / "shiftpred"


@pytest.mark.parametrize("path", sorted(PACKAGE.rglob("*.py")), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_no_pickle_in_the_source(path):
    text = path.read_text(encoding="utf-8")
    assert not re.search(r"\b(c?pickle|joblib|dill|shelve|marshal)\b", re.sub(r"allow_pickle\s*=\s*False", "", text)), path
    assert not re.search(r"allow_pickle\s*=\s*True|weights_only\s*=\s*False", text)
    for line in text.splitlines():
        assert "np.load(" not in line or "allow_pickle=False" in line, f"{path}: {line}"


def test_a_pickled_array_is_refused(tmp_path):
    path = tmp_path / "arrays.npz"
    np.savez(path, bad=np.array([{"a": 1}], dtype=object))
    with pytest.raises(BundleError, match="plain numpy arrays"):
        _unpack(path.read_bytes(), path)
