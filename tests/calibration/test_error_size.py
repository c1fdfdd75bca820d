"""Error sizes from the network's own and from what was measured alike."""

import numpy as np
import pytest

from shiftpred.calibration.error_size import ErrorSize, compute_error_evidence
from shiftpred.features.concentric_environments import RADII
from shiftpred.regression.environment_memory import Recollection
from shiftpred.training.fit_calibration import fit_error_size


def recollect(n, counts=0, spread=np.nan, correction=0.0):
    return Recollection(np.full((n, 2), correction), np.full((n, RADII, 2), counts), np.full((n, 2), spread))


def test_without_coefficients_the_networks_own():
    scales = np.array([[1.0, 0.1], [2.0, 0.2]])
    assert ErrorSize().compute(scales, recollect(2)) is scales


def test_the_formula():
    coefficients = {n: [0.1, 0.5, -0.1, 0, 0, 0, 0, 0.2, 0.3, 0.4] for n in ("13C", "1H")}
    scales = np.array([[1.0, 0.1]])
    got = ErrorSize(coefficients).compute(scales, recollect(1, counts=3, spread=0.5, correction=-0.2))
    for column, floor in enumerate((0.05, 0.005)):
        by_hand = 0.1 + 0.5 * np.log(scales[0, column]) - 0.1 * np.log(4) + 0.2
        by_hand += 0.3 * np.log(0.5 + floor) + 0.4 * np.log(0.2 + floor)
        assert got[0, column] == pytest.approx(np.exp(by_hand))


def test_never_far_from_the_networks_own():
    wild = {n: [9.0] + [0.0] * (RADII + 4) for n in ("13C", "1H")}
    assert ErrorSize(wild).compute(np.array([[1.0, 0.1]]), recollect(1)) == pytest.approx(np.array([[8.0, 0.8]]))


def test_the_fit_finds_what_the_errors_follow():
    """Errors made to fall with the atoms measured alike and to rise with the network's own size."""
    random = np.random.default_rng(5)
    n = 6000
    counts = random.integers(0, 40, (n, RADII, 2))
    scales = np.exp(random.normal(0, 0.7, (n, 2)))
    known = Recollection(random.normal(0, 1, (n, 2)), counts, np.full((n, 2), np.nan))
    true = np.exp(0.3 + 0.8 * np.log(scales[:, 0]) - 0.4 * np.log1p(counts[:, 2, 0]))
    errors = true * random.standard_t(4, n)
    found = fit_error_size(compute_error_evidence(scales, known)[:, 0], errors, np.arange(n) // 7)
    assert found[1] == pytest.approx(0.8, abs=0.06)
    assert found[4] == pytest.approx(-0.4, abs=0.06)
    assert np.abs(np.delete(found, [0, 1, 4])).max() < 0.06
