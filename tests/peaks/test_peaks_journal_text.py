"""The journal-text reader on lines in the styles of many journals (styles from memory; the shifts are of common compounds)."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shiftpred.errors import PeakError
from shiftpred.peaks import PeakListError, parse_peaks, render_journal_text
from shiftpred.records import Peak, PeakList

# (nucleus, text, solvent, frequency, shifts (a range as a pair))
CARBON = [
    ("13C NMR (101 MHz, CDCl3) δ 196.5, 165.7 (d, J = 254 Hz), 130.9 (d, J = 9 Hz, 2C)", "CDCl3", 101, [196.5, 165.7, 130.9]),
    ("13C NMR (CDCl3, 100 MHz) δ: 166.6, 132.8, 130.5.", "CDCl3", 100, [166.6, 132.8, 130.5]),
    ("¹³C NMR (126 MHz, DMSO-d₆) δ 167.6, 153.1", "DMSO-d6", 126, [167.6, 153.1]),
    ("¹³C{¹H} NMR (101 MHz, CDCl₃) δ 166.6, 60.9", "CDCl3", 101, [166.6, 60.9]),
    ("13C{1H} NMR (CD3OD, 150.9 MHz): δ = 173.1; 55.2; 20.8", "CD3OD", 150.9, [173.1, 55.2, 20.8]),
    ("13C-NMR (75 MHz, acetone-d6): δ 206.1, 30.6", "acetone-d6", 75, [206.1, 30.6]),
    ("C-13 NMR (CDCl3) δ 77.0 (t), 14.1 (q)", "CDCl3", None, [77.0, 14.1]),
    ("δC (101 MHz, CDCl3) 171.4 (C=O), 60.5 (CH2), 14.2 (CH3)", "CDCl3", 101, [171.4, 60.5, 14.2]),
    ("δ 171.4 (C), 129.5 (2 × CH), 128.3 (2 CH), 60.9 (CH2)", None, None, [171.4, 129.5, 128.3, 60.9]),
    ("13C NMR (126 MHz, [D6]DMSO): δ=167.6, 115.0 (2C), 23.7 ppm.", "DMSO-d6", 126, [167.6, 115.0, 23.7]),
    ("13C NMR (101 MHz, Chloroform-d) δ 166.61, 132.84, 14.33.", "CDCl3", 101, [166.61, 132.84, 14.33]),
    ("13C NMR (151 MHz, Methanol-d4) δ 174.0, 49.9", "CD3OD", 151, [174.0, 49.9]),
    ("13C NMR (101 MHz, C6D6) δ 162.0 (d, 1JCF = 250.1 Hz), 114.9 (d, 2JCF = 21.5 Hz)", "C6D6", 101, [162.0, 114.9]),
    ("13C NMR (101 MHz, D2O) δ 176.3 and 51.0 and 16.9", "D2O", 101, [176.3, 51.0, 16.9]),
    ("166.6, 132.8, 130.5, 129.5 (2C), 128.3 (2C), 60.9, 14.3", None, None, [166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3]),
    ("166.6 132.8 130.5", None, None, [166.6, 132.8, 130.5]),
    ("166.6\n132.8\n130.5\n", None, None, [166.6, 132.8, 130.5]),
    ("166.6; 132.8; 130.5", None, None, [166.6, 132.8, 130.5]),
    ("129.5 x 2, 128.3 (x2)", None, None, [129.5, 128.3]),
    ("13C NMR (101 MHz, CDCl3) δ 136.0–135.2 (m), 77.2", "CDCl3", 101, [(135.2, 136.0), 77.2]),
    ("δ = 122.3 (q, J(C,F) = 272 Hz, CF3), 131.0 (q, 2J(C,F) = 32 Hz)", None, None, [122.3, 131.0]),
    ("13C NMR (100.6 MHz, CDCl3, 298 K): δ 155.9, 79.5, 28.4 (3 × CH3)", "CDCl3", 100.6, [155.9, 79.5, 28.4]),
    ("128.4/1, 60.9/2, 166.6/0, 14.3/3", None, None, [128.4, 60.9, 166.6, 14.3]),
    ("60.9/4.38, 14.3/1.39", None, None, [60.9, 14.3]),
]
PROTON = [
    ("δ 7.54–7.42 (m, 2H), 4.38 (q, J = 7.1 Hz, 2H)", None, None, [(7.42, 7.54), 4.38]),
    ("1H NMR (400 MHz, CDCl3) δ 8.04 (dd, J = 8.2, 1.3 Hz, 2H), 7.26 (s)", "CDCl3", 400, [8.04, 7.26]),
    ("¹H NMR (500 MHz, CDCl₃): δ 7.31 (d, ³J = 8.0 Hz, 2H, Ar-H), 3.80 (s, 3H, OCH₃).", "CDCl3", 500, [7.31, 3.80]),
    ("1H-NMR (CDCl3, 300 MHz) δ: 7.4-7.3 (m, 5H, Ph), 5.1 (s, 2H, CH2Ph)", "CDCl3", 300, [(7.3, 7.4), 5.1]),
    (
        "1H NMR (600 MHz, DMSO-d6) δ 9.65 (s, 1H, NH), 9.14 (s, 1H, OH), 7.34 (d, J=8.8 Hz, 2H)",
        "DMSO-d6",
        600,
        [9.65, 9.14, 7.34],
    ),
    ("δH (400 MHz; CD3OD) 7.02 (1 H, d, J 8.5, H-5), 3.87 (3 H, s, OMe)", "CD3OD", 400, [7.02, 3.87]),
    ("1H NMR (250 MHz, acetone-d6): 2.10 (3H, s)", "acetone-d6", 250, [2.10]),
    ("1H NMR (400 MHz, CDCl3) δ 7.3 (br. s., 1 H) 3.3 (s, 3 H)", "CDCl3", 400, [7.3, 3.3]),
    ("1H NMR (400 MHz, Chloroform-d) δ 1.39 (t, J = 7.1 Hz, 3H).", "CDCl3", 400, [1.39]),
    ("1H NMR (CDCl3) δ −0.12 (s, 9H), 0.05 (s, 6H)", "CDCl3", None, [-0.12, 0.05]),
    ("7.34 (2H), 6.68 (2H), 1.98 (3H)", None, None, [7.34, 6.68, 1.98]),
    ("2.96, 2.88, 8.02", None, None, [2.96, 2.88, 8.02]),
    (
        "1H NMR (400 MHz, CD3CN) δ 4.05 (ddd, J = 12.0, 6.1, 2.2 Hz, 1H), 1.55 (quint, J = 7.0 Hz, 2H)",
        "CD3CN",
        400,
        [4.05, 1.55],
    ),
    ("1H NMR (400 MHz, D2O) δ 3.78 (q, J(H,H) = 7.2 Hz, 1H), 1.48 (d, 3JHH = 7.2 Hz, 3H)", "D2O", 400, [3.78, 1.48]),
    ("1H NMR (400 MHz, CDCl3) δ 2.35 (s, 2 × 3H), 1.22 (d, J = 6.9 Hz, 6H, CH(CH3)2)", "CDCl3", 400, [2.35, 1.22]),
    ("1H NMR (400 MHz, pyridine-d5) δ 8.71 to 8.65 (m, 1H)", "pyridine-d5", 400, [(8.65, 8.71)]),
    ("7.26 (s); 4.12 (q); 1.26 (t)", None, None, [7.26, 4.12, 1.26]),
    ("1H NMR (400 MHz, CDCl3) δ 7.54 (tt, J = 7.4 and 1.3 Hz, 1H)", "CDCl3", 400, [7.54]),
]


@pytest.mark.parametrize("text, solvent, frequency, shifts", CARBON)
def test_carbon_line(text, solvent, frequency, shifts):
    check(parse_peaks(text, "13C"), solvent, frequency, shifts)


@pytest.mark.parametrize("text, solvent, frequency, shifts", PROTON)
def test_proton_line(text, solvent, frequency, shifts):
    check(parse_peaks(text, "1H"), solvent, frequency, shifts)


def check(found, solvent, frequency, shifts):
    assert (found.solvent, found.frequency_mhz) == (solvent, frequency)
    assert [(p.lower_ppm, p.upper_ppm) if p.is_range else p.shift_ppm for p in found.peaks] == shifts
    assert [p.position for p in found.peaks] == list(range(1, len(shifts) + 1))


def test_what_a_bracket_says():
    one, two, three = parse_peaks(
        "8.04 (dd, J = 8.2, 1.3 Hz, 2H), 2.35 (s, 2 × 3H), 7.0 (d, 3JHH = 8.0 Hz, 1H, H-3,5)", "1H"
    ).peaks
    assert (one.multiplicity, one.couplings_hz, one.hydrogens) == ("dd", (8.2, 1.3), 2)
    assert two.hydrogens == 6 and three.couplings_hz == (8.0,) and three.hydrogens == 1


def test_counts_and_kinds_of_carbons():
    peaks = parse_peaks("171.4 (C), 129.5 (2 × CH), 128.3 (2C), 60.9 (CH2), 28.4 (3 × CH3), 130.5 (C-1), 130.0/1", "13C").peaks
    assert [p.attached_h for p in peaks] == [0, 1, None, 2, 3, None, 1]
    assert [p.carbons for p in peaks] == [None, 2, 2, None, 3, None, None]


def test_pairs():
    assert [p.pair_ppm for p in parse_peaks("60.9/4.38, 14.3/1.39", "13C").peaks] == [4.38, 1.39]


@pytest.mark.parametrize(
    "nucleus, text, message",
    [
        ("1H", "7,26 4,38", "decimal comma.*Try: write 7.26"),
        ("13C", "166,6; 132,8", "decimal comma"),
        ("13C", "166.6 abc, 12.0", "character 7.*'abc': not a number"),
        ("13C", "77.2 (t, J = 32", "bracket that is not closed"),
        ("13C", "128.4/7", "number of hydrogens"),
        ("1H", "13C NMR (CDCl3) δ 7.2", "heading says 13C"),
        ("13C", "", "empty list"),
        ("13C", "  \n ", "empty list"),
        ("13C", "none", "not a number"),
        ("1H", "166.6, 132.8, 60.9", "look like a 13C list.*--c13"),
        ("13C", "7.3, 3.3, 1.2, 0.9", "look like a 1H list.*--h1"),
        ("1H", "2904.3, 1700.1", "Hz instead of ppm.*frequency"),
        ("13C", "512.0", "Hz instead of ppm"),
        ("13C", "missing.txt", "no such file"),
        ("1H", "7.2 7.2kHz", "not understood"),
    ],
)
def test_what_cannot_be_read_is_named(nucleus, text, message):
    with pytest.raises(PeakError, match=message) as caught:
        parse_peaks(text, nucleus)
    assert ": got " in str(caught.value) and "; expected " in str(caught.value) and ". Try: " in str(caught.value)


def test_all_problems_are_listed():
    with pytest.raises(PeakListError) as caught:
        parse_peaks("166.6, foo, 132.8, bar", "13C")
    assert [p[1] for p in caught.value.problems] == ["foo", "bar"]


def test_numbers_and_records():
    assert [p.shift_ppm for p in parse_peaks([166.6, (132.8, 1)], "13C").peaks] == [166.6, 132.8]
    with pytest.raises(PeakError, match="peak 2"):
        parse_peaks([1.0, "x"], "1H")
    with pytest.raises(PeakError, match="finite"):
        parse_peaks([float("nan")], "1H")


def test_limits():
    with pytest.raises(PeakError, match="at most 2,000"):
        parse_peaks(", ".join(["128.0"] * 2001), "13C")
    with pytest.raises(PeakError, match="at most 200,000"):
        parse_peaks("1" * 200_001, "13C")
    with pytest.raises(PeakError):
        parse_peaks("1.0 " + "(" * 50_000, "13C")


def test_files(tmp_path):
    path = tmp_path / "peaks.txt"
    path.write_bytes("\ufeff13C NMR δ 166.6,\r\n132.8".encode())
    assert [p.shift_ppm for p in parse_peaks(path, "13C").peaks] == [166.6, 132.8]
    path.write_bytes("δ 166.6, 60.9 (µ, 2C)".encode("latin-1", "replace"))
    with pytest.raises(PeakError):
        parse_peaks(str(path), "13C")
    table = tmp_path / "peaks.csv"
    table.write_text("assignment,Multiplicity,shift_ppm,attached_h,comment\n4;5,s,166.6,0,x\n2,t,60.9,2,y\n")
    found = parse_peaks(table, "13C")
    assert found.peaks[0].assignment == (4, 5) and found.peaks[1].attached_h == 2 and "comment" in found.notes[0]
    table.write_text('shift_ppm;integral\n"7,26";1\n')
    with pytest.raises(PeakError, match="decimal comma"):
        parse_peaks(table, "1H")


numbers = st.integers(1, 2200).map(lambda k: k / 10)


@settings(max_examples=150, deadline=None)
@given(
    st.lists(
        st.builds(
            lambda shift, width, j, c, h: Peak(
                "13C", shift, shift, shift, couplings_hz=tuple(j), carbons=c, attached_h=h, multiplicity="d" if j else None
            ),
            numbers,
            st.just(0),
            st.lists(st.integers(1, 300).map(float), max_size=2),
            st.sampled_from([None, 2, 3]),
            st.sampled_from([None, 0, 1, 2, 3]),
        ),
        min_size=1,
        max_size=8,
    )
)
def test_round_trip(peaks):
    peaks = [*peaks, Peak("13C", 150.0, 150.0, 150.0)]
    again = parse_peaks(render_journal_text(PeakList("13C", tuple(peaks), "CDCl3", 101.0)), "13C")
    assert again.solvent == "CDCl3" and again.frequency_mhz == 101.0
    for one, other in zip(peaks, again.peaks, strict=True):
        assert (one.shift_ppm, one.couplings_hz, one.carbons, one.attached_h) == (
            pytest.approx(other.shift_ppm),
            other.couplings_hz,
            other.carbons,
            other.attached_h,
        )


@settings(max_examples=300, deadline=None)
@given(st.text(alphabet="0123456789.,;()[]/ -–xδJ=HzCdtqm\n'", max_size=60), st.sampled_from(["13C", "1H"]))
def test_any_text_gives_peaks_or_a_peak_error(text, nucleus):
    try:
        found = parse_peaks(text, nucleus)
    except PeakError:
        return
    assert found.peaks and all(p.lower_ppm <= p.shift_ppm <= p.upper_ppm for p in found.peaks)
