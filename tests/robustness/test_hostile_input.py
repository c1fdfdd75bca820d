"""Input that is far too large, too deep or endless: an answer or a clear refusal, within seconds and bounded memory."""

import gzip
import time
import tracemalloc

import pytest

import shiftpred
from shiftpred.errors import InputError, PeakError, StructureError
from shiftpred.peaks import parse_peaks
from shiftpred.records import RecordFailure
from shiftpred.structures import parse_structures

SECONDS = 10.0
"""Processor time; a quiet machine takes a tenth of it."""
C60 = "c12c3c4c5c1c6c7c8c2c9c1c3c2c3c4c4c%10c5c5c6c6c7c7c%11c8c9c8c9c1c2c1c2c3c4c3c4c%10c5c5c6c6c7c7c%11c8c8c9c1c1c2c3c2c4c5c6c3c7c8c1c23"


@pytest.fixture(autouse=True)
def within_seconds():
    begun = time.process_time()
    yield
    assert time.process_time() - begun < SECONDS


def build_tube(rings: int, around: int = 12) -> str:
    """A molfile of stacked rings of carbons, bonded to the next ring at every second atom: 720 atoms for 60 rings."""
    n = rings * around
    atoms = [f"M  V30 {k + 1} C {k % around} {k // around} 0 0" for k in range(n)]
    pairs = [(r * around + k, r * around + (k + 1) % around) for r in range(rings) for k in range(around)]
    pairs += [(r * around + k, (r + 1) * around + k) for r in range(rings - 1) for k in range(r % 2, around, 2)]
    bonds = [f"M  V30 {k} 1 {a + 1} {b + 1}" for k, (a, b) in enumerate(pairs, 1)]
    table = [
        f"M  V30 COUNTS {n} {len(bonds)} 0 0 0",
        "M  V30 BEGIN ATOM",
        *atoms,
        "M  V30 END ATOM",
        "M  V30 BEGIN BOND",
        *bonds,
    ]
    table = ["M  V30 BEGIN CTAB", *table, "M  V30 END BOND", "M  V30 END CTAB", "M  END"]
    return "\n".join(["tube", "", "", "  0  0  0     0  0            999 V3000", *table, ""])


@pytest.mark.parametrize(
    "text, words",
    [
        ("C" * 10_000, "10,000 heavy atoms"),
        ("C(" * 9_000, "is not closed"),
        ("(" * 9_999, "is not closed"),
        ("C" + "(C" * 5_000 + ")" * 5_000, "heavy atoms"),
        ("[" * 10_000, "is not closed"),
        ("C1" * 9_000, "not a SMILES"),
        ("".join(f"C%{10 + k % 90}" for k in range(4_000)), "not a SMILES"),
        ("C1CCCCC1" * 130_000, "1,040,000 characters"),
        ("C." * 9_000 + "C", "9,001 heavy atoms"),
        ("*" * 9_000, "placeholder|heavy atoms"),
        ("InChI=1S/" + "C" * 15_000, "cannot be read"),
    ],
    ids=["chain", "open", "parentheses", "deep", "brackets", "rings", "ring-numbers", "megabyte", "dots", "stars", "inchi"],
)
def test_structures_that_are_refused(text, words):
    (found,) = parse_structures(text)
    assert isinstance(found, RecordFailure) and isinstance(found.error, StructureError)
    with pytest.raises(StructureError, match=words):
        raise found.error


@pytest.mark.parametrize(
    "text, atoms",
    [(C60, 60), ("C" + "(C" * 140 + ")" * 140, 141), ("C" * 299, 299), ("C(C)(C)" * 99 + "C", 298), ("c1ccc(cc1)-" * 49 + "c1ccccc1", 300)],
    ids=["fullerene", "deep", "chain", "branched", "polyphenyl"],
)  # fmt: skip
def test_large_structures_that_are_answered(text, atoms):
    table = shiftpred.predict(text, nucleus="13C")
    assert len(table) == atoms and (table.lower_ppm <= table.upper_ppm).all()
    assert shiftpred.compare(text, c13=[14.1, 22.7, 29.7, 31.9, 143.3], rivals=2).judgement


@pytest.mark.slow
def test_cage_of_720_atoms():
    (found,) = parse_structures(build_tube(60))
    assert found.n_atoms == 720
    assert len(shiftpred.predict(found, nucleus="13C")) == 720
    assert shiftpred.compare(found, c13=[143.3], rivals=2).judgement in ("open", "contradicted")


@pytest.mark.parametrize("nucleus", ["13C", "1H"])
@pytest.mark.parametrize("as_text", [True, False])
def test_ten_thousand_peaks(nucleus, as_text):
    numbers = [round(0.01 * k, 2) for k in range(10_000)]
    with pytest.raises(PeakError, match="more than"):
        parse_peaks(", ".join(map(str, numbers)) if as_text else numbers, nucleus)


@pytest.mark.parametrize(
    "text",
    [
        "(" * 100_000, "7.1 (" * 20_000, "7.1 (" + "(" * 5_000 + ")" * 5_000 + ")", "1" * 199_000, "-" * 199_000, "," * 199_000,
        "7–" * 60_000, "δ " * 60_000, "13C NMR " * 20_000, "1H NMR (400 MHz, CDCl3) δ " * 7_000, "7.1" + " " * 190_000 + "x",
        "<sub>" * 30_000,
        "<" * 199_000, "&" * 199_000, "7.1 (" + "d" * 190_000 + ")", "_{" * 90_000, "7." * 90_000, "J = " * 40_000, "2 × " * 40_000,
        'shift,integral\n"' + "1,2\n" * 40_000, "7.1 (d, J = " + "7.1, " * 20_000 + "Hz)", "1" * 1_000_000,
    ],
    ids=lambda t: repr(t[:12]),
)  # fmt: skip
def test_peak_texts_without_end(text):
    try:
        assert parse_peaks(text, "1H").peaks
    except PeakError as error:
        assert len(str(error)) < 2_000


@pytest.mark.parametrize("name", ["m.smi", "m.sdf", "m.csv", "m.txt"])
@pytest.mark.parametrize("line", ["\n", "x\n", "$$$$\n", '"\n'], ids=repr)
def test_files_of_many_lines(tmp_path, name, line):
    path = tmp_path / name
    path.write_text(("smiles\n" if name == "m.csv" else "") + line * 20_000, encoding="utf-8")
    try:
        for record in parse_structures(path):
            assert isinstance(record, RecordFailure)
    except InputError:
        pass


@pytest.mark.parametrize("name", ["m.smi.gz", "m.sdf.gz", "m.csv.gz", "m.gz"])
def test_archive_of_one_endless_line(tmp_path, name):
    path = tmp_path / name
    with gzip.open(path, "wb", compresslevel=1) as stream:
        if name == "m.csv.gz":
            stream.write(b"smiles\n")
        for _ in range(60):
            stream.write(b"C" * 1_000_000)
    tracemalloc.start()
    try:
        assert all(isinstance(record, RecordFailure) for record in parse_structures(path))
        assert tracemalloc.get_traced_memory()[1] < 30_000_000
    finally:
        tracemalloc.stop()


def test_counts_that_lie():
    table = (
        "\n  x\n\n  0  0  0     0  0            999 V3000\nM  V30 BEGIN CTAB\nM  V30 COUNTS 999999999 999999999 0 0 0\nM  END\n"
    )
    assert all(isinstance(record, RecordFailure) for record in parse_structures(table))


@pytest.mark.slow
def test_a_million_lines(tmp_path):
    path = tmp_path / "m.smi"
    path.write_text("\n" * 500_000 + "C" * 30_000 + "\n" + "\n" * 500_000 + "CCO\n", encoding="utf-8")
    failed, read = parse_structures(path)
    assert isinstance(failed, RecordFailure) and read.n_atoms == 3
