"""NMReDATA: what a record says is read; what is malformed is named with its line and costs nothing else."""

from __future__ import annotations

import gzip
import time
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from shiftpred.errors import InputError
from shiftpred.peaks import parse_peaks
from shiftpred.peaks.nmredata import NmredataError, find_nmredata, load_nmredata_compounds, parse_nmredata

FILES = Path(__file__).resolve().parent / "nmredata_files"
BENZOATE = FILES / "ethyl_4-fluorobenzoate_1_1.nmredata.sdf"
BENZOATE_10 = FILES / "ethyl_4-fluorobenzoate_1_0_windows.nmredata.sdf"
MENTHOL = FILES / "menthol_1_1_windows.nmredata.sdf"
MENTHOL_10 = FILES / "menthol_1_0.nmredata.sdf"
ETHANOL = FILES / "ethanol_drawn_hydrogens_1_1.nmredata.sdf"


def read(source):
    (record,) = parse_nmredata(source)
    return record


def text_of(path):
    return path.read_bytes().decode().replace("\r\n", "\n")


def changed(old, new, path=BENZOATE):
    text = text_of(path)
    assert text.count(old) == 1, f"{old!r} stands {text.count(old)} times in the file"
    return text.replace(old, new)


def strip_places(record):
    """Everything but line numbers and texts."""
    return (
        record.structure.smiles,
        record.level,
        record.solvent,
        [(s.label, s.shift_ppm, s.nucleus, s.atoms, s.hydrogens) for s in record.signals],
        record.interchangeable,
        [(c.first, c.second, c.hz, c.bonds) for c in record.couplings],
        [
            (
                s.tag,
                s.frequency_mhz,
                [(x.peak.lower_ppm, x.peak.upper_ppm, x.labels, x.partners, x.attributes) for x in s.lines],
            )
            for s in record.spectra
        ],
    )


@pytest.mark.parametrize("path", sorted(FILES.glob("*.sdf")), ids=lambda p: p.name)
def test_the_example_files_have_no_problems(path):
    assert read(path).problems == ()


def test_a_record_is_read_whole():
    record = read(BENZOATE)
    by_label = {s.label: s for s in record.signals}
    assert (record.name, record.version, record.level, record.solvent) == ("ethyl 4-fluorobenzoate", "1.1", 0, "CDCl3")
    assert record.structure.smiles == "CCOC(=O)c1ccc(F)cc1"
    assert (by_label["Co,o'"].shift_ppm, by_label["Co,o'"].atoms, by_label["Co,o'"].nucleus) == (132.1, (7, 12), "13C")
    assert (by_label["H2"].atoms, by_label["H2"].nucleus) == ((2,), "1H")
    assert by_label["Cm"].atoms == (8, 11), "an item that runs over two lines"
    assert by_label["F"].nucleus == "F"
    assert [(c.first, c.second, c.hz, c.bonds) for c in record.couplings][:2] == [("Ho", "Hm", 8.9, 3), ("Ho", "F", 5.4, 4)]
    assert dict(record.other)["TEMPERATURE"] == "298.0 K"


def test_a_spectrum_gives_peaks_that_compare_takes():
    protons, carbons = (read(BENZOATE).build_peak_list(n) for n in ("1H", "13C"))
    assert (protons.frequency_mhz, protons.solvent) == (400.13, "CDCl3")
    first, _, solvent, quartet, triplet = protons.peaks
    assert (first.shift_ppm, first.multiplicity, first.couplings_hz, first.hydrogens) == (8.06, "dd", (8.9, 5.4), 2)
    assert first.assignment == (7, 12) and solvent.assignment == ()
    assert (quartet.couplings_hz, triplet.hydrogens) == ((7.1,), 3.02)
    assert [p.attached_h for p in carbons.peaks] == [0, 0, 1, 0, 1, 2, 3]
    assert parse_peaks(carbons, "13C").peaks == carbons.peaks


def test_ranges_are_read_either_way_round():
    text = changed("2.2000-2.1400", "2.1400-2.2000", MENTHOL)
    peak = read(text).build_peak_list("1H").peaks[1]
    assert (peak.lower_ppm, peak.upper_ppm, peak.hydrogens) == (2.14, 2.2, 1)


def test_both_versions_and_both_line_ends_say_the_same():
    assert strip_places(read(BENZOATE)) == strip_places(read(BENZOATE_10))
    assert strip_places(read(MENTHOL)) == strip_places(read(MENTHOL_10))


def test_drawn_hydrogens_are_named_by_their_own_numbers():
    signals = {s.label: s for s in read(ETHANOL).signals}
    assert (signals["a"].atoms, signals["a"].hydrogens, signals["a"].nucleus) == ((1,), (4, 5, 6), "1H")
    assert (signals["Ex"].atoms, signals["Ex"].hydrogens) == ((3,), (9,))


def test_an_unknown_shift_and_interchangeable_labels():
    record = read(MENTHOL)
    assert {s.label: s.shift_ppm for s in record.signals}["Ex"] is None
    assert record.interchangeable == ((("C7",), ("C9",)),)
    grouped = read(changed("Interchangeable=C7, C9", "Interchangeable=(C7, C5), (C9, C8)", MENTHOL))
    assert grouped.interchangeable == ((("C7", "C5"), ("C9", "C8")),) and grouped.problems == ()


def test_shifts_of_the_assignment_stand_in_for_a_missing_spectrum():
    text = text_of(BENZOATE)
    start, end = text.index(">  <NMREDATA_1D_13C>"), text.index(">  <NMREDATA_2D")
    found = read(text[:start] + text[end:]).build_peak_list("13C")
    assert [p.shift_ppm for p in found.peaks] == [14.3, 61.1, 165.6, 126.7, 132.1, 115.4, 165.7]
    assert found.peaks[4].assignment == (7, 12) and "no 1D spectrum" in found.notes[0]


def test_an_edited_spectrum_gives_way_to_a_plain_one():
    dept = ">  <NMREDATA_1D_13C#2>\nLarmor=100.61\\\nSequence=DEPT135\\\n61.1, I=-2.0\\\n\n"
    text = text_of(BENZOATE)
    at = text.index(">  <NMREDATA_1D_1H>")
    assert len(read(text[:at] + dept + text[at:]).build_peak_list("13C").peaks) == 7


# old text, new text, what the complaint names
MALFORMED = [
    ("C1, 14.3000, 1\\", "C1, fourteen, 1\\", "'fourteen' as shift"),
    ("C1, 14.3000, 1\\", "C1, 14.3-14.5, 1\\", "the range 14.3-14.5"),
    ("C1, 14.3000, 1\\", "C1\\", "no shift behind the label"),
    ("C1, 14.3000, 1\\", ", 14.3, 1\\", "no label"),
    ("C1, 14.3000, 1\\", "C1, 14.3, 99\\", "atom 99, and the structure has 12 atoms"),
    ("C1, 14.3000, 1\\", "C1, 14.3, one\\", "'one' as atom"),
    ("C1, 14.3000, 1\\", "C1, 14.3, 1, 3\\", "atoms of 13C and O"),
    ("C2, 61.1000, 2 ;", "C1, 61.1000, 2 ;", "was given on line"),
    ("H2, 4.3700, H2\\", "H2, 4.3700, H4\\", "bears no hydrogen"),
    ("H1, 1.3900, H1\\", "H1, 1.39, H1\\\nInterchangeable=H1, Hx\\", "'Hx', which no row"),
    ("H1, 1.3900, H1\\", "H1, 1.39, H1\\\nInterchangeable=H1\\", "fewer than two labels"),
    ("Ho, Hm, 8.90, nb=3\\", "Ho, Hm\\", "which is no coupling"),
    ("Ho, Hm, 8.90, nb=3\\", "Ho, Hq, 8.90\\", "'Hq' not in the assignment"),
    ("Ho, Hm, 8.90, nb=3\\", "Ho, Hm, 8.90, nb=many\\", "'nb=many'"),
    ("Larmor=400.13\\\nSpectrum", "Larmor=fast\\\nSpectrum", "'fast' as Larmor frequency"),
    ("4.3700, S=q", "four, S=q", "'four' is no shift"),
    ("4.3700, S=q", "437.0, S=q", "outside any range"),
    ("4.3700, S=q", "4.37, S=zigzag", "S=zigzag is no multiplicity"),
    ("4.3700, S=q, N=2", "4.37, S=q, N=two", "N=two is no number"),
    ("4.3700, S=q, N=2", "4.37, S=q, N=2, N=3", "attribute N twice"),
    ("4.3700, S=q, N=2", "4.37, quartet, N=2", "'quartet' is no attribute"),
    ("L=H2 J=7.10(H1)", "L=H22, J=7.10(H1)", "label 'H22'"),
    ("L=H2 J=7.10(H1)", "L=H2, J=often", "'often' is no coupling"),
    ("L=H2 J=7.10(H1)", "L=H2, J=7.10(H99)", "'H99' is not in the assignment"),
    ("L=H2 J=7.10(H1)", "L=(H2,H1)", "ambiguous assignment at level 0"),
    ("E=3.02", "E=big", "E=big is no number"),
    ("CDCl3\\", "moon dust\\", "solvent 'moon dust'"),
    (">  <NMREDATA_LEVEL>\n0\\", ">  <NMREDATA_LEVEL>\nhigh\\", "level 'high'"),
    (">  <NMREDATA_LEVEL>\n0\\\n", ">  <NMREDATA_LEVEL>\n", "an empty tag"),
    ("1.1\\", "3.7\\", "version '3.7'"),
    (">  <NMREDATA_SOLVENT>", ">  <NMREDATA_LEVEL>\n1\\\n\n>  <NMREDATA_SOLVENT>", "the same tag again"),
    (">  <NMREDATA_1D_13C>", ">  <NMREDATA_1D_carbon>", "a 1D tag of no known form"),
    ("298.0 K\\\n", "298.0 K\\\n\nlost line\n", "behind a blank line"),
]


@pytest.mark.parametrize(("old", "new", "named"), MALFORMED, ids=[m[2][:40] for m in MALFORMED])
def test_what_is_malformed_is_named_with_its_line_and_costs_no_more(old, new, named):
    text = changed(old, new)
    record, whole = read(text), read(BENZOATE)
    complaint = next((p for p in record.problems if named in p.came), None)
    assert complaint is not None, [str(p) for p in record.problems]
    # The line that is named is one of those that were changed.
    first = text[: text.index(new)].count("\n") + 1
    assert first <= complaint.line <= first + new.count("\n")
    assert f"line {complaint.line}" in complaint.where and complaint.would_do and complaint.try_next
    assert len(record.signals) >= len(whole.signals) - 1
    assert sum(len(s.lines) for s in record.spectra) >= sum(len(s.lines) for s in whole.spectra) - (7 if "carbon" in new else 1)


def test_a_hydrogen_is_not_named_by_an_h_before_its_own_number():
    record = read(changed("a, 1.1700, 4, 5, 6\\", "a, 1.17, H4\\", ETHANOL))
    assert "atom 4 is a hydrogen" in record.problems[0].came and record.problems[0].try_next == "H1"


def test_a_structure_that_cannot_be_read_keeps_the_rest():
    text = text_of(BENZOATE)
    record = read(text.replace(" 12 12  0", " 99 12  0"))
    assert record.structure is None and record.problems[0].line == 1
    assert len(record.build_peak_list("13C").peaks) == 7
    with pytest.raises(InputError):
        find_nmredata(text.replace(" 12 12  0", " 99 12  0"))


def test_the_old_name_of_the_assignment_and_a_missing_version():
    text = changed("<NMREDATA_ASSIGNMENT>", "<NMREDATA_SIGNALS>").replace(">  <NMREDATA_VERSION>\n1.1\\\n\n", "")
    record = read(text)
    assert len(record.signals) == 12 and [p.came for p in record.problems] == ["no tag NMREDATA_VERSION; read as 1.1"]


def test_gzip_byte_order_mark_and_latin_1(tmp_path):
    packed, marked, latin = tmp_path / "a.sdf.gz", tmp_path / "b.sdf", tmp_path / "c.sdf"
    packed.write_bytes(gzip.compress(BENZOATE.read_bytes()))
    marked.write_bytes(b"\xef\xbb\xbf" + BENZOATE.read_bytes())
    latin.write_bytes(changed("shifts from memory", "gemessen für").encode("latin-1"))
    for path in (packed, marked, latin):
        assert strip_places(read(path)) == strip_places(read(BENZOATE))
    assert "für" in dict(read(latin).other)["ID"]


def test_sources_that_are_no_nmredata_are_told_apart(tmp_path):
    plain = tmp_path / "plain.sdf"
    plain.write_text(text_of(BENZOATE).split(">  <")[0] + "$$$$\n", encoding="utf-8")
    assert find_nmredata("CCO") is None and find_nmredata(plain) is None and find_nmredata(str(tmp_path)) is None
    with pytest.raises(NmredataError, match="without NMReDATA tags"):
        list(parse_nmredata(plain))
    with pytest.raises(NmredataError, match="No such file"):
        list(parse_nmredata(tmp_path / "none.sdf"))
    with pytest.raises(NmredataError, match="several records"):
        find_nmredata(text_of(BENZOATE) + text_of(MENTHOL))
    assert find_nmredata(str(BENZOATE)).name == "ethyl 4-fluorobenzoate"


def test_a_folder_gives_compounds_for_training(tmp_path):
    (tmp_path / "sub").mkdir()
    (tmp_path / "sub" / "one.nmredata.sdf").write_bytes(MENTHOL.read_bytes())
    (tmp_path / "two.sdf").write_text(changed("C1, 14.3000, 1\\", "C1, nothing, 1\\"), encoding="utf-8")
    (tmp_path / "wrong.sdf").write_bytes(b"\x00\x01")
    complaints = []
    menthol, benzoate = load_nmredata_compounds(tmp_path, complaints.append)
    assert sorted({c.where.split(",")[0].rsplit("/", 1)[-1] for c in complaints}) == ["two.sdf", "wrong.sdf"]
    from rdkit import Chem

    for compound, expected in ((menthol, {9: 71.5}), (benzoate, {3: 165.6})):
        mol = Chem.MolFromSmiles(compound.smiles)
        for ppm in expected.values():
            (atom,) = [a for a, nucleus, shift in compound.shifts if nucleus == "13C" and shift == ppm]
            assert any(n.GetSymbol() == "O" for n in mol.GetAtomWithIdx(atom).GetNeighbors())
    assert not {22.2, 21.0} & {shift for _, _, shift in menthol.shifts}, "interchangeable shifts are no training data"
    assert menthol.left_out == 3 and benzoate.left_out == 1
    with pytest.raises(NmredataError, match="no such file"):
        list(load_nmredata_compounds(tmp_path / "none"))


@pytest.mark.parametrize(
    "content",
    ["\\\n" + "a, 1.0, 1,\n" * 30_000, "\\" + '<"' * 9000 + "\\\n" + ('<"\\;' * 4000 + "\n") * 20, "a, 1, 1\\" + "(" * 19_000],
    ids=["an item without end", "labels without end", "brackets without end"],
)
def test_hostile_length_is_named_and_costs_little(content):
    start = text_of(BENZOATE).split(">  <")[0] + ">  <NMREDATA_VERSION>\n1.1\n\n"
    begun = time.perf_counter()
    (record,) = parse_nmredata(f"{start}>  <NMREDATA_ASSIGNMENT>\n{content}\n\n$$$$\n")
    assert record.problems and time.perf_counter() - begun < 8


PIECES = st.sampled_from(
    [*'\\;,()<>"=-/#.\t\n ', "\r\n", "H3", "777.777", "L=", "J=", "1e999", "nan", '<"', '">', "Interchangeable=", "\n\n"]
    + [">  <NMREDATA_J>\n", "$$$$\n", "Larmor=", "9" * 30, "²", "\x00", "ä", "(a,b)"]
)


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(
    path=st.sampled_from([BENZOATE, MENTHOL, ETHANOL, MENTHOL_10]),
    edits=st.lists(st.tuples(st.floats(0, 1), st.integers(0, 30), st.lists(PIECES, max_size=4)), min_size=1, max_size=6),
)
def test_nothing_but_documented_errors_comes_from_a_damaged_file(path, edits):
    text = text_of(path)
    for place, cut, pieces in edits:
        at = int(place * len(text))
        text = text[:at] + "".join(pieces) + text[at + cut :]
    try:
        for record in parse_nmredata(text + "\n"):
            assert all(isinstance(p, NmredataError) and p.line >= 1 for p in record.problems)
            for nucleus in ("13C", "1H"):
                record.build_peak_list(nucleus)
    except InputError:
        pass


@settings(max_examples=100, deadline=None)
@given(tag=st.sampled_from(["ASSIGNMENT", "J", "1D_1H", "1D_13C", "LEVEL", "VERSION"]), content=st.text(max_size=200))
def test_any_text_may_stand_in_a_tag(tag, content):
    start = text_of(BENZOATE).split(">  <")[0]
    try:
        list(parse_nmredata(f"{start}>  <NMREDATA_{tag}>\n{content}\n\n$$$$\n"))
    except InputError:
        pass
