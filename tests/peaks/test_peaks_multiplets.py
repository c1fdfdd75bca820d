"""Multiplets picked line by line; doublets of carbons by fluorine."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shiftpred.errors import PeakError
from shiftpred.peaks import group_multiplets, looks_line_by_line, pair_doublets, parse_peaks, require_grouped

# Ethyl acetate at 400 MHz, every line picked: q 4.125, s 2.045, t 1.258 with J = 7.2 Hz (from memory).
LINES = "4.152, 4.134, 4.116, 4.098; 2.045; 1.276, 1.258, 1.240"


def split(places, coupling, times):
    """Return the places (Hz) of a multiplet's lines after coupling to `times` equal spin-half nuclei."""
    return [x + (k - times / 2) * coupling for x in places for k in range(times + 1)]


def test_quartet_and_triplet_are_joined_and_said():
    grouped = group_multiplets(parse_peaks(LINES, "1H"), 400)
    assert [(round(p.shift_ppm, 3), p.multiplicity) for p in grouped.peaks] == [(4.125, "q"), (2.045, None), (1.258, "t")]
    assert grouped.peaks[0].couplings_hz == (7.2,) and len(grouped.notes) == 2 and "7.2 Hz" in grouped.notes[0]
    assert [p.position for p in grouped.peaks] == [1, 2, 3] and grouped.peaks[2].text == "1.276, 1.258, 1.240"


def test_frequency_is_asked_for():
    with pytest.raises(PeakError, match="--frequency 400") as caught:
        require_grouped(parse_peaks(LINES, "1H"), None)
    assert caught.value.problems


def test_frequency_of_the_heading_is_used():
    assert len(require_grouped(parse_peaks(f"1H NMR (400 MHz, CDCl3) δ {LINES}", "1H"), None).peaks) == 3


def test_carbon_frequency_of_the_magnet_will_do():
    grouped = require_grouped(parse_peaks(LINES, "1H"), 100.6)
    assert grouped.peaks[0].couplings_hz == pytest.approx((7.2,), abs=0.1)


def test_two_decimals():
    found = parse_peaks("4.15, 4.13, 4.12, 4.10; 2.05; 1.28, 1.26, 1.24", "1H")
    assert looks_line_by_line(found)
    assert [p.multiplicity for p in group_multiplets(found, 400).peaks] == ["q", None, "t"]


def test_doublet_of_doublets_and_close_neighbours():
    lines = split(split([8.04 * 400], 8.2, 1), 1.4, 1) + split([7.0 * 400], 8.0, 1) + split([1.4 * 400], 7.1, 2)
    grouped = group_multiplets(parse_peaks([round(x / 400, 4) for x in lines], "1H"), 400)
    assert [(round(p.shift_ppm, 2), p.multiplicity) for p in grouped.peaks] == [(8.04, "dd"), (7.0, "d"), (1.4, "t")]
    assert grouped.peaks[0].couplings_hz == pytest.approx((8.2, 1.4), abs=0.15)


def test_lines_without_a_pattern_become_a_range():
    lines = [7.512, 7.498, 7.495, 7.471, 7.468, 7.44, 1.276, 1.258, 1.240]
    crowd, triplet = group_multiplets(parse_peaks(lines, "1H"), 400).peaks
    assert (crowd.lower_ppm, crowd.upper_ppm, crowd.multiplicity) == (7.44, 7.512, "m") and triplet.multiplicity == "t"


@pytest.mark.parametrize(
    "text",
    [
        "9.65, 9.14, 7.34, 6.68, 1.98",
        "7.26, 7.28, 4.1",
        "8.04, 7.54, 7.43, 4.38, 1.39",
        "3.3 (m, 2H), 3.28 (m, 2H), 3.26 (m), 3.24 (m)",
        "7.249, 7.297, 7.338, 7.379, 7.398",
    ],
)
def test_ordinary_lists_are_left_alone(text):
    found = parse_peaks(text, "1H")
    assert not looks_line_by_line(found)
    assert require_grouped(found, 400) is found


@settings(max_examples=60, deadline=None)
@given(
    st.lists(st.tuples(st.integers(1, 16), st.sampled_from([0, 1, 2, 3])), min_size=2, max_size=8, unique_by=lambda x: x[0]),
    st.sampled_from([300, 400, 500, 600]),
    st.floats(6.5, 7.5),
)
def test_made_up_multiplets_are_found_again(sites, frequency, coupling):
    """Sites half a ppm apart, coupled to none to three neighbours, printed with four decimals."""
    lines = [x / frequency for place, times in sites for x in split([place / 2 * frequency], coupling, times)]
    grouped = group_multiplets(parse_peaks([round(x, 4) for x in lines], "1H"), frequency)
    assert len(grouped.peaks) == len(sites)
    for place, times in sites:
        peak = min(grouped.peaks, key=lambda p: abs(p.shift_ppm - place / 2))
        assert peak.shift_ppm == pytest.approx(place / 2, abs=2e-4) and peak.multiplicity == (None, "d", "t", "q")[times]


def test_fluoroacetophenone_doublets():
    """4'-Fluoroacetophenone at 101 MHz (from memory): 165.7 (254 Hz), 133.6 (3 Hz), 130.9 (9 Hz), 115.6 (22 Hz)."""
    lines = []
    for centre, j in ((165.7, 254), (133.6, 3), (130.9, 9), (115.6, 22)):
        lines += [centre + j / 202, centre - j / 202]
    found = {(round(p.centre_ppm, 1), p.bonds[0]) for p in pair_doublets(lines, 101.0)}
    assert {(165.7, 1), (133.6, 3), (130.9, 3), (115.6, 2)} <= found


def test_allowed_couplings_can_be_given():
    assert not pair_doublets([166.96, 164.44], 101.0, allowed_j_hz=((160.0, 200.0),))
    pair = pair_doublets([164.44, 166.96], 101.0, allowed_j_hz=((160.0, 300.0),))[0]
    assert (pair.first, pair.second, pair.bonds) == (1, 0, (1,)) and pair.coupling_hz == pytest.approx(254.5, abs=0.1)


@pytest.mark.shared
def test_few_ordinary_lists_are_suspected(shared):
    import pandas as pd

    peaks = pd.read_csv(shared / "data" / "peaks.csv.gz", usecols=["compound", "spectrum", "nucleus", "shift_ppm"])
    peaks = peaks[(peaks.nucleus == "1H") & peaks.shift_ppm.between(-20, 25)].head(40_000)
    lists = [sorted(set(g)) for _, g in peaks.groupby(["compound", "spectrum"]).shift_ppm]
    lists = [x for x in lists if len(x) > 1]
    suspected = 0
    for shifts in lists:
        try:
            suspected += looks_line_by_line(parse_peaks(shifts, "1H"))
        except PeakError:
            continue
    assert suspected / len(lists) < 0.005
