"""The journal-text reader on lines in the styles of many journals (styles from memory; the shifts are of common compounds)."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shiftpred.errors import PeakError
from shiftpred.peaks import parse_peaks, render_journal_text
from shiftpred.records import Peak, PeakList

# One peak: (shift or (low, high), multiplicity, couplings, hydrogens of 1H or carbons of 13C, attached hydrogens of 13C)
N = None


def carbon(shift, count=N, attached=N, mult=N, j=()):
    return shift, mult, j, count, attached


def proton(shift, mult=N, j=(), count=N):
    return shift, mult, j, count, N


ETHYL_BENZOATE = [carbon(166.6), carbon(132.8), carbon(130.5), carbon(129.5, 2), carbon(128.3, 2), carbon(60.9), carbon(14.3)]
CARBON = [
    (
        "13C NMR (101 MHz, CDCl3) δ 196.5, 165.7 (d, J = 254 Hz), 130.9 (d, J = 9 Hz, 2C)",
        ("CDCl3", 101),
        [carbon(196.5), carbon(165.7, mult="d", j=(254,)), carbon(130.9, 2, mult="d", j=(9,))],
    ),
    ("13C NMR (CDCl3, 100 MHz) δ: 166.6, 132.8, 130.5.", ("CDCl3", 100), [carbon(166.6), carbon(132.8), carbon(130.5)]),
    ("¹³C NMR (126 MHz, DMSO-d₆) δ 167.6, 153.1", ("DMSO-d6", 126), [carbon(167.6), carbon(153.1)]),
    ("¹³C{¹H} NMR (DMSO-d6, 100 MHz): δ = 167.6, 23.7 (CH3).", ("DMSO-d6", 100), [carbon(167.6), carbon(23.7, attached=3)]),
    ("13C{1H} NMR (CD3OD, 150.9 MHz): δ = 173.1; 55.2; 20.8", ("CD3OD", 150.9), [carbon(173.1), carbon(55.2), carbon(20.8)]),
    ("13C-NMR (75 MHz, acetone-d₆): δ 206.1, 30.6", ("acetone-d6", 75), [carbon(206.1), carbon(30.6)]),
    ("C-13 NMR (CDCl3) δ 77.0 (t), 14.1 (q)", ("CDCl3", N), [carbon(77.0, mult="t"), carbon(14.1, mult="q")]),
    (
        "δC (101 MHz, CDCl3) 171.4 (C=O), 60.5 (CH2), 14.2 (CH3)",
        ("CDCl3", 101),
        [carbon(171.4, attached=0), carbon(60.5, attached=2), carbon(14.2, attached=3)],
    ),
    (
        "δ 171.4 (C), 129.5 (2 × CH), 128.3 (2 CH), 60.9 (OCH2)",
        (N, N),
        [carbon(171.4, attached=0), carbon(129.5, 2, 1), carbon(128.3, 2, 1), carbon(60.9, attached=2)],
    ),
    (
        "13C NMR (126 MHz, [D6]DMSO): δ=167.6, 115.0 (2C), 23.7 ppm.",
        ("DMSO-d6", 126),
        [carbon(167.6), carbon(115.0, 2), carbon(23.7)],
    ),
    (
        "13C NMR (101 MHz, Chloroform-d) δ 166.61, 132.84, 14.33.",
        ("CDCl3", 101),
        [carbon(166.61), carbon(132.84), carbon(14.33)],
    ),
    ("13C NMR (151 MHz, Methanol-d4) δ 174.0, 49.9", ("CD3OD", 151), [carbon(174.0), carbon(49.9)]),
    ("13C NMR (101 MHz, MeOD) δ 174.0", ("CD3OD", 101), [carbon(174.0)]),
    ("13C NMR ((CD3)2CO, 101 MHz) δ 174.0", ("acetone-d6", 101), [carbon(174.0)]),
    ("13C NMR (101 MHz, d6-DMSO) δ 174.0", ("DMSO-d6", 101), [carbon(174.0)]),
    (
        "13C NMR (101 MHz, C6D6) δ 162.0 (d, 1JCF = 250.1 Hz), 114.9 (d, 2JCF = 21.5 Hz)",
        ("C6D6", 101),
        [carbon(162.0, mult="d", j=(250.1,)), carbon(114.9, mult="d", j=(21.5,))],
    ),
    ("13C NMR (101 MHz, D2O) δ 176.3, 51.0 and 16.9", ("D2O", 101), [carbon(176.3), carbon(51.0), carbon(16.9)]),
    ("166.6, 132.8, 130.5, 129.5 (2C), 128.3 (2C), 60.9, 14.3", (N, N), ETHYL_BENZOATE),
    ("166.6, 132.8, 130.5,\n129.5 (2 C), 128.3 (2 × C),\n60.9 and 14.3.", (N, N), ETHYL_BENZOATE),
    ("166.6 132.8 130.5", (N, N), [carbon(166.6), carbon(132.8), carbon(130.5)]),
    ("166.6\n132.8\n130.5\n", (N, N), [carbon(166.6), carbon(132.8), carbon(130.5)]),
    (
        "129.5 x 2, 128.3 (x2), 127 (2x), 126.0 (2xC), 2 × 125.0",
        (N, N),
        [carbon(x, 2) for x in (129.5, 128.3, 127, 126.0, 125.0)],
    ),
    ("13C NMR (101 MHz, CDCl3) δ 136.0–135.2 (m), 77.2", ("CDCl3", 101), [carbon((135.2, 136.0), mult="m"), carbon(77.2)]),
    (
        "δ = 122.3 (q, J(C,F) = 272 Hz, CF3), 131.0 (q, 2J(C,F) = 32 Hz)",
        (N, N),
        [carbon(122.3, attached=0, mult="q", j=(272,)), carbon(131.0, mult="q", j=(32,))],
    ),
    (
        "13C NMR (100.6 MHz, CDCl3, 298 K): δ 155.9, 79.5, 28.4 (3 × CH3)",
        ("CDCl3", 100.6),
        [carbon(155.9), carbon(79.5), carbon(28.4, 3, 3)],
    ),
    ("13C NMR (CDCl3, 100 MHz, APT): 55.3 (OCH3), 113.9 (C-3, C-5)", ("CDCl3", 100), [carbon(55.3, attached=3), carbon(113.9)]),
    ("NMR (13C, CDCl3): 166.6", ("CDCl3", N), [carbon(166.6)]),
    ("CDCl3, 101 MHz: 166.6, 60.9", ("CDCl3", 101), [carbon(166.6), carbon(60.9)]),
    ("13C NMR (CDCl3/CD3OD 9:1, 101 MHz) δ 166.6", ("mixture", 101), [carbon(166.6)]),
    ("<sup>13</sup>C NMR (101 MHz, CDCl<sub>3</sub>) &delta; 166.6, 60.9", ("CDCl3", 101), [carbon(166.6), carbon(60.9)]),
    (r"$^{13}$C NMR (101 MHz, CDCl$_3$) $\delta$ 166.6, 60.9", ("CDCl3", 101), [carbon(166.6), carbon(60.9)]),
    ("C-1: 166.6; C-2: 132.8 (d, J = 7 Hz)", (N, N), [carbon(166.6), carbon(132.8, mult="d", j=(7,))]),
    ("166.6 C, 132.8, CH, 60.9 CH2", (N, N), [carbon(166.6, attached=0), carbon(132.8, attached=1), carbon(60.9, attached=2)]),
    ("128.4*, 128.6a, 128.8²", (N, N), [carbon(128.4), carbon(128.6), carbon(128.8)]),
    ("- 166.6\n- 132.8\n- 60.9", (N, N), [carbon(166.6), carbon(132.8), carbon(60.9)]),
    ("1. 166.6\n2. 132.8\n3. 60.9", (N, N), [carbon(166.6), carbon(132.8), carbon(60.9)]),
    (
        "128.4/1, 60.9/2, 166.6/0, 14.3/3",
        (N, N),
        [carbon(128.4, attached=1), carbon(60.9, attached=2), carbon(166.6, attached=0), carbon(14.3, attached=3)],
    ),
]
PROTON = [
    ("δ 7.54–7.42 (m, 2H), 4.38 (q, J = 7.1 Hz, 2H)", (N, N), [proton((7.42, 7.54), "m", (), 2), proton(4.38, "q", (7.1,), 2)]),
    (
        "1H NMR (400 MHz, CDCl3) δ 8.04 (dd, J = 8.2, 1.3 Hz, 2H), 7.26 (s)",
        ("CDCl3", 400),
        [proton(8.04, "dd", (8.2, 1.3), 2), proton(7.26, "s")],
    ),
    (
        "¹H NMR (500 MHz, CDCl₃): δ 7.31 (d, ³J = 8.0 Hz, 2H, Ar-H), 3.80 (s, 3H, OCH₃).",
        ("CDCl3", 500),
        [proton(7.31, "d", (8.0,), 2), proton(3.80, "s", (), 3)],
    ),
    (
        "1H-NMR (CDCl3, 300 MHz) δ: 7.4-7.3 (m, 5H, Ph), 5.1 (s, 2H, CH2Ph)",
        ("CDCl3", 300),
        [proton((7.3, 7.4), "m", (), 5), proton(5.1, "s", (), 2)],
    ),
    (
        "1H NMR (600 MHz, DMSO-d6) δ 9.65 (s, 1H, NH), 9.14 (bs, 1H, OH), 7.34 (d, J=8.8 Hz, 2H)",
        ("DMSO-d6", 600),
        [proton(9.65, "s", (), 1), proton(9.14, "br s", (), 1), proton(7.34, "d", (8.8,), 2)],
    ),
    (
        "δH (400 MHz; CD3OD) 7.02 (1 H, d, J 8.5, H-5), 3.87 (3 H, s, OMe)",
        ("CD3OD", 400),
        [proton(7.02, "d", (8.5,), 1), proton(3.87, "s", (), 3)],
    ),
    (
        "δH(400 MHz, CDCl3) 8.05 (2 H, dd, J 8.3 and 1.4, 2-H and 6-H), 4.38 (2 H, q, J 7.1, OCH2)",
        ("CDCl3", 400),
        [proton(8.05, "dd", (8.3, 1.4), 2), proton(4.38, "q", (7.1,), 2)],
    ),
    ("1H NMR (250 MHz, acetone-d6): 2.10 (3H, s)", ("acetone-d6", 250), [proton(2.10, "s", (), 3)]),
    (
        "(300 MHz, methanol-d4) δ ppm 7.3 (br. s., 1 H) 3.3 (s, 3 H)",
        ("CD3OD", 300),
        [proton(7.3, "br s", (), 1), proton(3.3, "s", (), 3)],
    ),
    ("1H NMR (400 MHz, Chloroform-d) δ 1.39 (t, J = 7.1 Hz, 3H).", ("CDCl3", 400), [proton(1.39, "t", (7.1,), 3)]),
    ("1H NMR (CDCl3) δ −0.12 (s, 9H), 0.05 (s, 6H)", ("CDCl3", N), [proton(-0.12, "s", (), 9), proton(0.05, "s", (), 6)]),
    ("7.34 (2H), 6.68 (2H), 1.98 (3H)", (N, N), [proton(7.34, count=2), proton(6.68, count=2), proton(1.98, count=3)]),
    (
        "1H NMR (400 MHz, CD3CN) δ 4.05 (ddd, J1 = 12.0 Hz, J2 = 6.1 Hz, J3 = 2.2 Hz, 1H), 1.55 (quint, J = 7.0 Hz, 2H)",
        ("CD3CN", 400),
        [proton(4.05, "ddd", (12.0, 6.1, 2.2), 1), proton(1.55, "quint", (7.0,), 2)],
    ),
    (
        "1H NMR (400 MHz, D2O) δ 3.78 (q, J(H,H) = 7.2 Hz, 1H), 1.48 (d, 3JHH = 7.2 Hz, 3H)",
        ("D2O", 400),
        [proton(3.78, "q", (7.2,), 1), proton(1.48, "d", (7.2,), 3)],
    ),
    (
        "1H NMR (500 MHz, CDCl3): δ 7.45 (dd, 3J(H,H) = 8.0 Hz, 4J(H,H) = 1.5 Hz, 1H; Ar-H), "
        "1.24 (d, 3J(H,H)=6.8 Hz, 6H; 2×CH3)",
        ("CDCl3", 500),
        [proton(7.45, "dd", (8.0, 1.5), 1), proton(1.24, "d", (6.8,), 6)],
    ),
    (
        "1H NMR (400 MHz, CDCl3) δ 2.35 (s, 2 × 3H), 2.30 (s, 2 × CH3), 1.22 (d, J = 6.9 Hz, 6H, CH(CH3)2)",
        ("CDCl3", 400),
        [proton(2.35, "s", (), 6), proton(2.30, "s", (), 6), proton(1.22, "d", (6.9,), 6)],
    ),
    ("1H NMR (400 MHz, pyridine-d5) δ 8.71 to 8.65 (m, 1H)", ("pyridine-d5", 400), [proton((8.65, 8.71), "m", (), 1)]),
    (
        "(400 MHz, CD3OD) δ 7.26 – 7.18 (m, 3H), 7.1 —7.0 (m, 1H)",
        ("CD3OD", 400),
        [proton((7.18, 7.26), "m", (), 3), proton((7.0, 7.1), "m", (), 1)],
    ),
    ("7.26 (s); 4.12 (q); 1.26 (t)", (N, N), [proton(7.26, "s"), proton(4.12, "q"), proton(1.26, "t")]),
    ("1H NMR (400 MHz, CDCl3) δ 7.54 (tt, J = 7.4 and 1.3 Hz, 1H)", ("CDCl3", 400), [proton(7.54, "tt", (7.4, 1.3), 1)]),
    (
        "2.30 and 2.28 (2 s, 6H), 2.15, 2.10 (each s, 3H)",
        (N, N),
        [proton(2.30, "s", (), 3), proton(2.28, "s", (), 3), proton(2.15, "s", (), 3), proton(2.10, "s", (), 3)],
    ),
    (
        "7.26 d (8.0), 6.85 s 1H, 3.80, s, 3H",
        (N, N),
        [proton(7.26, "d", (8.0,)), proton(6.85, "s", (), 1), proton(3.80, "s", (), 3)],
    ),
    (
        "δ 4.05 (doublet of doublets, 1H), 3.9 (app t, 7.1 Hz, 2H), 3.1 (t, 7.1, 2H)",
        (N, N),
        [proton(4.05, "dd", (), 1), proton(3.9, "app t", (7.1,), 2), proton(3.1, "t", (7.1,), 2)],
    ),
    ("5.10, 5.00 (AB q, J = 12.1 Hz, 2H)", (N, N), [proton(5.10), proton(5.00, "AB q", (12.1,), 2)]),
    ("0.12 -0.05", (N, N), [proton(0.12), proton(-0.05)]),
    (
        "4.87 (d, J5,6 = 8.5 Hz, 1H, H-5), 4.2 (dt, J = 2 × 7.1, 1.2 Hz, 1H)",
        (N, N),
        [proton(4.87, "d", (8.5,), 1), proton(4.2, "dt", (7.1, 7.1, 1.2), 1)],
    ),
]


@pytest.mark.parametrize("text, heading, peaks", CARBON)
def test_carbon_line(text, heading, peaks):
    check(parse_peaks(text, "13C"), heading, peaks)


@pytest.mark.parametrize("text, heading, peaks", PROTON)
def test_proton_line(text, heading, peaks):
    check(parse_peaks(text, "1H"), heading, peaks)


def check(found, heading, peaks):
    assert (found.solvent, found.frequency_mhz) == heading
    got = [
        (
            (p.lower_ppm, p.upper_ppm) if p.is_range else p.shift_ppm,
            p.multiplicity,
            p.couplings_hz,
            p.hydrogens if found.nucleus == "1H" else p.carbons,
            p.attached_h,
        )
        for p in found.peaks
    ]
    assert got == peaks
    assert [p.position for p in found.peaks] == list(range(1, len(peaks) + 1))


PARAGRAPH = (
    "Ethyl benzoate (2a): colourless oil. 1H NMR (400 MHz, CDCl3) δ 8.04 (dd, J = 8.2, 1.3 Hz, 2H), 4.38 (q, J = 7.1 Hz, 2H); "
    "13C NMR (101 MHz, CDCl3) δ 166.6, 132.8, 60.9; 19F NMR (376 MHz, CDCl3) δ -107.5; "
    "HRMS (ESI) m/z calcd for C9H10O2 150.0681."
)


def test_whole_paragraph_gives_each_nucleus_its_own_list():
    carbons, protons = parse_peaks(PARAGRAPH, "13C"), parse_peaks(PARAGRAPH, "1H")
    assert [p.shift_ppm for p in carbons.peaks] == [166.6, 132.8, 60.9] and carbons.frequency_mhz == 101
    assert [p.shift_ppm for p in protons.peaks] == [8.04, 4.38] and protons.frequency_mhz == 400
    assert any("not read" in n and "19F" in n for n in carbons.notes) and any("Ethyl benzoate" in n for n in protons.notes)


def test_masses_after_the_list_are_left_unread_and_said():
    found = parse_peaks("13C NMR δ 166.6, 60.9; IR (film) ν 1720 cm-1", "13C")
    assert len(found.peaks) == 2 and any("IR (film)" in n for n in found.notes)


def test_frequency_of_the_other_nucleus_is_converted_and_said():
    found = parse_peaks("13C NMR (400 MHz, CDCl3) δ 77.0", "13C")
    assert found.frequency_mhz == pytest.approx(100.58, abs=0.01) and "1H frequency" in found.notes[0]
    found = parse_peaks("1H NMR (101 MHz, CDCl3) δ 7.0", "1H")
    assert found.frequency_mhz == pytest.approx(401.7, abs=0.1)


def test_unknown_solvent_is_noted():
    assert "brine-d9" in parse_peaks("1H NMR (400 MHz, brine-d9) δ 8.0 (s)", "1H").notes[0]


def test_labels_are_kept_as_text_only():
    peaks = parse_peaks("130.5 (C-1), 60.9 (OCH2CH3), C-7: 21.0", "13C").peaks
    assert [p.text for p in peaks] == ["130.5 (C-1)", "60.9 (OCH2CH3)", "C-7: 21.0"]
    assert all(p.attached_h is None and not p.assignment for p in peaks)


def test_off_resonance_letters_are_hydrogen_counts_only_if_every_line_has_one():
    found = parse_peaks("166.6 (s), 128.4 (d), 60.9 (t), 14.3 (q)", "13C")
    assert [p.attached_h for p in found.peaks] == [0, 1, 2, 3] and "read as C, CH, CH2, CH3" in found.notes[0]
    doubtful = parse_peaks("166.6 (s), 165.7 (d), 60.9", "13C")
    assert all(p.attached_h is None for p in doubtful.peaks)
    assert all(p.attached_h is None for p in parse_peaks("166.6 (s), 128.4 (d, J = 9 Hz), 60.9 (t), 14.3 (q)", "13C").peaks)


def test_pairs_in_both_directions():
    straight = parse_peaks("60.9/4.38, 14.3/1.39", "13C")
    assert [(p.shift_ppm, p.pair_ppm) for p in straight.peaks] == [(60.9, 4.38), (14.3, 1.39)] and not straight.notes
    turned = parse_peaks("4.38/60.9, 1.39/14.3", "13C")
    assert [(p.shift_ppm, p.pair_ppm) for p in turned.peaks] == [(60.9, 4.38), (14.3, 1.39)] and "1H/13C" in turned.notes[0]
    protons = parse_peaks("60.9/4.38, 14.3/1.39", "1H")
    assert [(p.shift_ppm, p.pair_ppm) for p in protons.peaks] == [(4.38, 60.9), (1.39, 14.3)]


def test_a_whole_number_behind_the_stroke_is_a_hydrogen_count_and_a_decimal_a_shift():
    one, other = parse_peaks("128.4/1, 30.2/1.0", "13C").peaks
    assert (one.attached_h, one.pair_ppm) == (1, None) and (other.attached_h, other.pair_ppm) == (None, 1.0)


@pytest.mark.parametrize(
    "nucleus, text, lines, nuclei",
    [
        ("13C", "166.6, 132.8, 130.5, 129.5 (2C), 128.3 (2C), 60.9, 14.3, 171.36, 60.49, 21.04, 14.19", 11, 13),
        (
            "13C",
            "196.5, 165.7 (d, J = 254 Hz), 133.6 (d, J = 3 Hz), 130.9 (d, J = 9 Hz, 2C), 115.6 (d, J = 22 Hz, 2C), 26.5",
            6,
            8,
        ),
        ("13C", "167.6, 153.1, 131.0, 120.8 (2C), 115.0 (2C), 23.7", 6, 8),
        ("1H", "9.65, 9.14, 7.34 (2H), 6.68 (2H), 1.98 (3H), 2.50, 3.33", 7, 11),
        ("13C", "162.5, 139.6, 138.5, 120.2, 105.9, 37.4", 6, 6),
        ("13C", "146.3, 143.4, 129.6, 121.5, 114.1, 111.6, 55.8, 21.0", 8, 8),
        ("13C", "162.6, 36.5, 31.4", 3, 3),
        ("1H", "2.96, 2.88, 8.02", 3, 3),
        ("1H", "4.152, 4.134, 4.116, 4.098; 2.045; 1.276, 1.258, 1.240", 8, 8),
    ],
)
def test_lists_of_the_bench_cases(nucleus, text, lines, nuclei):
    """Shifts of common compounds, from memory."""
    found = parse_peaks(text, nucleus)
    assert len(found.peaks) == lines and not found.notes
    assert sum((p.hydrogens if nucleus == "1H" else p.carbons) or 1 for p in found.peaks) == nuclei


# Round trip.

decimals = st.integers(1, 2200).map(lambda k: k / 10)
CARBONS = st.builds(
    lambda shift, width, j, c, h, pair: Peak(
        "13C",
        shift + width / 2,
        shift,
        shift + width,
        couplings_hz=tuple(j),
        carbons=c,
        attached_h=h,
        multiplicity="d" if j else None,
        pair_ppm=pair,
    ),
    decimals,
    st.sampled_from([0, 0, 0.8]),
    st.lists(st.integers(1, 300).map(float), max_size=2),
    st.sampled_from([None, 2, 3]),
    st.sampled_from([None, 0, 1, 2, 3]),
    st.sampled_from([None, None, None, 7.26, 12.0]),
)
PROTONS = st.builds(
    lambda shift, width, j, n, mult: Peak(
        "1H", shift + width / 2, shift, shift + width, couplings_hz=tuple(j), hydrogens=n, multiplicity=mult
    ),
    st.integers(-300, 1300).map(lambda k: k / 100),
    st.sampled_from([0, 0, 0.12]),
    st.lists(st.integers(10, 180).map(lambda k: k / 10), max_size=3),
    st.sampled_from([None, 1.0, 2.0, 0.5, 12.0]),
    st.sampled_from([None, "s", "m", "br s", "dd", "quint", "sept", "app t", "ddd", "AB q", "br"]),
)


def check_round_trip(nucleus, peaks, solvent, frequency):
    again = parse_peaks(render_journal_text(PeakList(nucleus, tuple(peaks), solvent, frequency)), nucleus)
    assert again.solvent == solvent and again.frequency_mhz == frequency
    for one, other in zip(peaks, again.peaks, strict=True):
        assert (one.shift_ppm, one.lower_ppm, one.upper_ppm) == pytest.approx(
            (other.shift_ppm, other.lower_ppm, other.upper_ppm)
        )
        for name in ("couplings_hz", "carbons", "attached_h", "hydrogens", "multiplicity", "pair_ppm"):
            assert getattr(one, name) == getattr(other, name), name


@settings(max_examples=150, deadline=None)
@given(st.lists(CARBONS, min_size=1, max_size=8))
def test_round_trip_of_carbons(peaks):
    check_round_trip(
        "13C", [*(p for p in peaks if p.pair_ppm is None or p.shift_ppm > 20), Peak("13C", 150.0, 150.0, 150.0)], "CDCl3", 101.0
    )


@settings(max_examples=150, deadline=None)
@given(st.lists(PROTONS, min_size=1, max_size=8))
def test_round_trip_of_protons(peaks):
    check_round_trip("1H", peaks, "DMSO-d6", 400.13)


@settings(max_examples=300, deadline=None)
@given(st.text(alphabet="0123456789.,;()[]{}/ -–xδJ=HzCdtqm\n'<>&$_^²", max_size=60), st.sampled_from(["13C", "1H"]))
def test_any_text_gives_peaks_or_a_peak_error(text, nucleus):
    try:
        found = parse_peaks(text, nucleus)
    except PeakError as error:
        assert error.problems
        return
    assert found.peaks and all(p.lower_ppm <= p.shift_ppm <= p.upper_ppm for p in found.peaks)
