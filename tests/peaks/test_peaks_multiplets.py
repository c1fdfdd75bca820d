"""Multiplets picked line by line; doublets of carbons by fluorine."""

import pytest

from shiftpred.errors import PeakError
from shiftpred.peaks import group_multiplets, looks_line_by_line, pair_doublets, parse_peaks, require_grouped

# Ethyl acetate at 400 MHz, every line picked: q 4.125, s 2.045, t 1.258 with J = 7.2 Hz (from memory).
LINES = "4.152, 4.134, 4.116, 4.098; 2.045; 1.276, 1.258, 1.240"


def test_quartet_and_triplet_are_joined_and_said():
    grouped = group_multiplets(parse_peaks(LINES, "1H"), 400)
    assert [(round(p.shift_ppm, 3), p.multiplicity) for p in grouped.peaks] == [(4.125, "q"), (2.045, None), (1.258, "t")]
    assert grouped.peaks[0].couplings_hz == (7.2,) and len(grouped.notes) == 2 and "7.2 Hz" in grouped.notes[0]


def test_frequency_is_asked_for():
    with pytest.raises(PeakError, match="--frequency 400"):
        require_grouped(parse_peaks(LINES, "1H"), None)


def test_frequency_of_the_heading_is_used():
    assert len(require_grouped(parse_peaks(f"1H NMR (400 MHz, CDCl3) δ {LINES}", "1H"), None).peaks) == 3


@pytest.mark.parametrize(
    "text",
    [
        "9.65, 9.14, 7.34, 6.68, 1.98",
        "7.26, 7.28, 4.1",
        "8.04, 7.54, 7.43, 4.38, 1.39",
        "3.3 (m, 2H), 3.28 (m, 2H), 3.26 (m), 3.24 (m)",
    ],
)
def test_ordinary_lists_are_left_alone(text):
    assert not looks_line_by_line(parse_peaks(text, "1H"))


def test_fluoroacetophenone_doublets():
    """4'-Fluoroacetophenone at 101 MHz (from memory): 165.7 (254 Hz), 133.6 (3 Hz), 130.9 (9 Hz), 115.6 (22 Hz)."""
    lines = []
    for centre, j in ((165.7, 254), (133.6, 3), (130.9, 9), (115.6, 22)):
        lines += [centre + j / 202, centre - j / 202]
    found = {(round(p.centre_ppm, 1), p.bonds[0]) for p in pair_doublets(lines, 101.0)}
    assert {(165.7, 1), (133.6, 3), (130.9, 3), (115.6, 2)} <= found
