"""Files, tables, numbers and records as peak lists; everything that cannot be one gets its own message."""

import pickle
from pathlib import Path

import numpy as np
import pytest

from shiftpred.errors import PeakError
from shiftpred.peaks import PeakListError, parse_peaks
from shiftpred.records import Peak, PeakList

# nucleus, text, what the message says
BAD = [
    ("1H", "7,26", "'7,26': decimal comma.*Try: write 7.26"),
    ("1H", "7,26 4,38", "decimal comma.*and 1 more"),
    ("13C", "166,6; 132,8", "decimal comma"),
    ("13C", "166.6, 128,4, 60.9", "character 8.*'128,4': decimal comma"),
    ("1H", "4.38 (q, J = 7,1 Hz, 2H)", "'J = 7,1' may be a decimal comma"),
    ("13C", "166.6 abc, 12.0", "character 7.*'abc': not a number"),
    ("13C", "166.6, 132.8\n60.9, x14.3", "line 2, character 7.*'x14.3': not a number"),
    ("13C", "77.2 (t, J = 32", "bracket that is not closed.*close the bracket"),
    ("13C", "128.4/7", "'/' must be followed by the number of hydrogens.*128.4/1"),
    ("1H", "7.34/2", "'/' must be followed by the 13C shift"),
    ("1H", "1.47/1.40 (2s, 9H)", "two shifts of one nucleus, or a C-H pair"),
    ("13C", "60.9/29.5", "paired 1H shift 29.5 is outside"),
    ("1H", "7.54–42 (m)", "abbreviated range"),
    ("1H", "7.54 -7.42 (m, 2H)", "a range or a negative shift"),
    ("1H", "7.26-4.12-1.26", "more than two ends"),
    ("13C", "166.6-14.3", "range wider than 40 ppm"),
    ("13C", "1.2.3, 4.0", "two decimal points"),
    ("1H", "2 × 7.26", "count before a 1H shift"),
    ("1H", "7.26 × 2", "count behind a 1H shift"),
    ("1H", "13C NMR (CDCl3) δ 7.2", "heading says 13C.*other nucleus"),
    ("13C", "19F NMR (376 MHz) δ -107.5", "heading says 19F"),
    ("13C", "13C NMR δ 166.6, 60.9; 1H NMR δ 7.2; 13C NMR δ 21.0", "second 13C heading"),
    ("13C", "", "an empty list"),
    ("13C", "  \n ", "an empty list"),
    ("13C", "13C NMR (101 MHz, CDCl3) δ", "no peak"),
    ("13C", "none", "'none': not a number"),
    ("1H", "166.6, 132.8, 60.9", "look like a 13C list.*--c13"),
    ("13C", "7.3, 3.3, 1.2, 0.9", "look like a 1H list.*--h1"),
    ("13C", "4.38 (q, J = 7.1 Hz, 2H), 1.39 (t, 3H)", "look like a 1H list"),
    ("1H", "2904.3, 1700.1", "Hz instead of ppm.*and 1 more.*frequency"),
    ("13C", "512.0", "Hz instead of ppm"),
    ("1H", "7.26, 128.4", "peak 2.*outside any 1H range"),
    ("13C", "-166.6, -132.8, -160.1", "outside any range.*hyphens"),
    ("13C", "166.6 0.45\n132.8 1.2\n60.9 0.9", "table without a heading.*shift_ppm,integral"),
    ("13C", "missing.txt", "no such file"),
    ("13C", "folder/missing.csv", "no such file"),
    ("1H", "7.2 7.2kHz", "not understood"),
    ("13C", "shift_ppm,attached_h\n166.6,4\n60.9,2\n", "line 2.*attached_h is not a whole number from 0 to 3"),
    ("13C", "shift_ppm,attached_h\n,1\n", "shift_ppm is blank"),
    ("13C", "shift_ppm,attached_h\nabc,1\n", "'abc' is not a number"),
    ("13C", "shift_ppm,attached_h\n166,6,0\n", "more cells than columns: decimal comma"),
    ("1H", 'shift_ppm,integral\n"7,26",1\n', "decimal comma in shift_ppm"),
    ("1H", "shift_ppm;integral\n7.26;-1\n", "integral is not positive"),
    ("1H", "shift_ppm;integral\nnan;1\n", "not finite"),
    ("13C", "shift,ppm\n1,2\n", "two columns for shift_ppm"),
    ("13C", "shift_ppm,attached_h\n", "no peak"),
    ("13C", "1H\n7.2\n3.3\n", "heading says 1H"),
]


@pytest.mark.parametrize("nucleus, text, message", BAD)
def test_what_cannot_be_read_is_named(nucleus, text, message):
    with pytest.raises(PeakError, match=f"(?s){message}") as caught:
        parse_peaks(text, nucleus)
    assert ": got " in str(caught.value) and "; expected " in str(caught.value) and ". Try: " in str(caught.value)
    assert caught.value.problems and all(len(p) == 3 for p in caught.value.problems)


def test_messages_differ():
    messages = []
    for nucleus, text, _ in BAD:
        with pytest.raises(PeakError) as caught:
            parse_peaks(text, nucleus)
        messages.append(str(caught.value))
    assert len(set(messages)) >= len(BAD) - 1  # the two empty lists read alike


def test_all_problems_are_listed_with_their_places():
    with pytest.raises(PeakListError) as caught:
        parse_peaks("166.6, foo, 132.8, bar", "13C")
    assert [p[:2] for p in caught.value.problems] == [("character 8", "foo"), ("character 20", "bar")]
    assert "and 1 more" in str(caught.value)
    assert pickle.loads(pickle.dumps(caught.value)).problems == caught.value.problems


def test_places_count_in_the_text_as_given():
    with pytest.raises(PeakError, match="character 16"):
        parse_peaks("\u200b166.6\u2009–\u00a0165, \u2009foo", "13C")


def test_numbers_and_records():
    found = parse_peaks(
        [166.6, (132.8, 1), "165.7 (d, J = 254 Hz)", {"shift_ppm": 60.9, "attached_h": 2}, np.float64(14.3)], "13C"
    )
    assert [p.shift_ppm for p in found.peaks] == [166.6, 132.8, 165.7, 60.9, 14.3]
    assert [p.attached_h for p in found.peaks] == [None, 1, None, 2, None]
    assert found.peaks[2].couplings_hz == (254,) and [p.position for p in found.peaks] == [1, 2, 3, 4, 5]
    assert len(parse_peaks(np.array([7.26, 4.38]), "1H").peaks) == 2
    peak = Peak("1H", 7.5, 7.4, 7.6, hydrogens=5)
    assert parse_peaks([peak], "1H").peaks[0].hydrogens == 5
    assert parse_peaks(found, "13C").peaks == found.peaks


@pytest.mark.parametrize(
    "nucleus, items, message",
    [
        ("1H", [1.0, "x"], "peak 2.*not a number"),
        ("1H", [float("nan")], "not a finite number"),
        ("1H", [float("inf")], "not a finite number"),
        ("1H", [True], "not a number"),
        ("1H", [None], "not a number"),
        ("1H", [(7.2, 1)], "for 13C only"),
        ("13C", [(128.4, 4)], "0, 1, 2 or 3"),
        ("13C", [(128.4, 1.5)], "0, 1, 2 or 3"),
        ("13C", [(128.4, 1, 2)], "not a pair"),
        ("13C", [Peak("1H", 7.2, 7.2, 7.2)], "a 1H peak in a 13C list"),
        ("13C", [Peak("13C", float("nan"), 1.0, 1.0)], "not a finite number"),
        ("13C", ["166.6, 60.9"], "2 peaks in one item"),
        ("13C", [], "an empty list"),
        ("13C", 166.6, "a float"),
        ("13C", b"166.6", "a bytes"),
        ("13C", PeakList("1H", ()), "a 1H peak list"),
        ("13C", [1.0] * 2001, "more than 2,000"),
        ("13N", [1.0], "'13C' or '1H'"),
    ],
)
def test_items_that_are_no_peaks(nucleus, items, message):
    with pytest.raises(PeakError, match=message) as caught:
        parse_peaks(items, nucleus)
    assert caught.value.problems


def test_limits():
    with pytest.raises(PeakError, match="at most 2,000"):
        parse_peaks(", ".join(["128.0"] * 2001), "13C")
    with pytest.raises(PeakError, match="at most 200,000"):
        parse_peaks("1" * 200_001, "13C")
    assert len(parse_peaks(", ".join(["128.0"] * 2000), "13C").peaks) == 2000


@pytest.mark.parametrize(
    "text", ["1.0 " + "(" * 190_000, "δ" * 190_000, "13C NMR " * 20_000, "1 1\n" * 45_000, "J = " * 45_000]
)
def test_hostile_texts_end_soon(text):
    """Each of these once took ten seconds or more; the limit is generous for a busy machine."""
    import time

    start = time.process_time()
    with pytest.raises(PeakError):
        parse_peaks(text, "1H")
    assert time.process_time() - start < 5


def test_unusual_shifts_and_doubles_are_noted():
    assert "listed twice" in parse_peaks("128.4, 128.4", "13C").notes[0]
    assert "unusual" in parse_peaks("-139.9", "13C").notes[0]  # triiodomethane, from memory
    assert "unusual" in parse_peaks("-12.5, 7.3", "1H").notes[0]  # a metal hydride


def test_a_list_that_was_read_before_is_checked_and_notes_stay_single():
    once = parse_peaks("128.4, 128.4", "13C")
    assert parse_peaks(once, "13C") == once
    by_hand = PeakList("1H", (Peak("1H", 7.2, 7.2, 7.2), Peak("1H", 128.4, 128.4, 128.4)), notes=("by hand",))
    with pytest.raises(PeakError, match="peak 2"):
        parse_peaks(by_hand, "1H")


def test_where_names_the_argument():
    with pytest.raises(PeakError, match="^sample 7, c13, character 1: "):
        parse_peaks("x", "13C", where="sample 7, c13")


# Files.


def test_file_with_journal_text(tmp_path):
    path = tmp_path / "peaks.txt"
    path.write_bytes("\ufeff13C NMR δ 166.6,\r\n132.8".encode())
    assert [p.shift_ppm for p in parse_peaks(path, "13C").peaks] == [166.6, 132.8]
    path.write_bytes("1H NMR δ 7.54–7.42 (m, 2H)".encode("utf-16"))
    assert parse_peaks(str(path), "1H").peaks[0].is_range
    path.write_bytes(b"7.54\x967.42 (m, 2H)")  # the en dash of an old Windows code page
    assert parse_peaks(path, "1H").peaks[0].is_range


@pytest.mark.parametrize(
    "content, message",
    [
        (b"", "empty list"),
        (b"PK\x03\x04\0\0\0\0", "binary file"),
        (b"##TITLE= spectrum\n##JCAMP-DX= 5.0\n", "JCAMP-DX"),
        (b"1" * 900_000, "900,000 bytes"),
    ],
)
def test_files_that_are_no_lists(tmp_path, content, message):
    path = tmp_path / "peaks.dat"
    path.write_bytes(content)
    with pytest.raises(PeakError, match=message):
        parse_peaks(path, "13C")


def test_damaged_archive_and_folder(tmp_path):
    path = tmp_path / "peaks.txt.gz"
    path.write_bytes(b"no gzip")
    with pytest.raises(PeakError, match="cannot be read"):
        parse_peaks(path, "13C")
    with pytest.raises(PeakError, match="folder"):
        parse_peaks(str(tmp_path), "13C")
    with pytest.raises(PeakError, match="no such file"):
        parse_peaks(Path("nowhere"), "13C")


# Tables.


def test_columns_in_any_order_and_unknown_ones_noted():
    found = parse_peaks("assignment,Multiplicity,shift_ppm,attached_h,comment\n4;5,s,166.6,0,x\n2,t,60.9,2,y\n", "13C")
    assert found.peaks[0].assignment == (4, 5) and found.peaks[1].attached_h == 2 and found.peaks[1].multiplicity == "t"
    assert "comment" in found.notes[0]


def test_only_numbers_are_atom_numbers():
    found = parse_peaks("shift,assignment\n166.6,C-4\n60.9,2\n", "13C")
    assert [p.assignment for p in found.peaks] == [(), (2,)] and "label" in found.notes[0]


@pytest.mark.parametrize(
    "heading", ["δ (ppm)\tIntegral\tMult.\tJ (Hz)", "ppm\tintegral\tmultiplicity\tj_hz", "1H\tnH\tmult\tJ"]
)
def test_headings_in_many_spellings(heading):
    found = parse_peaks(f"{heading}\n7.54-7.42\t2H\tm\t\n4.38\t2\tquartet\t7.1\n", "1H")
    one, other = found.peaks
    assert (one.lower_ppm, one.upper_ppm, one.hydrogens) == (7.42, 7.54, 2)
    assert (other.multiplicity, other.couplings_hz) == ("q", (7.1,)) and not found.notes


@pytest.mark.parametrize("nucleus, shift, pair", [("13C", 60.9, 4.38), ("1H", 4.38, 60.9)])
def test_table_of_pairs(nucleus, shift, pair):
    peak = parse_peaks("13C,1H\n60.9,4.38\n14.3,1.39\n", nucleus).peaks[0]
    assert (peak.shift_ppm, peak.pair_ppm) == (shift, pair)


def test_comments_carry_the_conditions():
    found = parse_peaks("# CDCl3, 101 MHz\nshift_ppm carbons\n166.6 1\n129.5 2\n", "13C")
    assert (found.solvent, found.frequency_mhz) == ("CDCl3", 101) and found.peaks[1].carbons == 2


def test_delta_above_a_list_is_no_table():
    assert parse_peaks("δ\n7.5 (m, 2H)\n4.3 (q, 2H)", "1H").peaks[0].hydrogens == 2
    assert len(parse_peaks("ppm\n166.6\n60.9", "13C").peaks) == 2


def test_all_bad_rows_are_listed():
    with pytest.raises(PeakListError) as caught:
        parse_peaks("shift_ppm,attached_h\n166.6,4\n60.9,2\nabc,2\n", "13C")
    assert [p[0] for p in caught.value.problems] == ["line 2", "line 4"]
