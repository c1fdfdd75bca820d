"""NMReDATA out: what is written reads back to the same content; SDF out: atoms stand where the user had them."""

from __future__ import annotations

from pathlib import Path

import pytest
from click.testing import CliRunner
from rdkit import Chem

import shiftpred
from shiftpred.cli import command
from shiftpred.errors import NotApplicable, StructureError
from shiftpred.peaks.nmredata import parse_nmredata
from shiftpred.pipeline import predict_structures
from shiftpred.records import Peak, RecordFailure, Structure
from shiftpred.reporting import iterate_prediction_sdf
from shiftpred.reporting.molfiles import render_molfile
from shiftpred.structures import parse_structure, parse_structures

FILES = Path(__file__).resolve().parents[1] / "peaks" / "nmredata_files"
CINNAMATE = dict(  # (E)-ethyl cinnamate, shifts from memory
    c13="13C NMR (101 MHz, CDCl3) δ 167.0, 144.6, 134.5, 130.2, 128.9 (2C), 128.1 (2C), 118.3, 60.5, 14.3",
    h1="1H NMR (400 MHz, CDCl3) δ 7.69 (d, J = 16.0 Hz, 1H), 7.55-7.50 (m, 2H), 7.41-7.35 (m, 3.1H), 6.44 (d, J = 16.0 Hz, 1H), "
    "4.27 (q, J = 7.1 Hz, 2H), 1.34 (t, J = 7.1 Hz, 3H), 1.56 (br s, 0.4H)",
)
SAMPLES = {
    "cinnamate": ("CCOC(=O)/C=C/c1ccccc1", CINNAMATE),
    "a backslash in the SMILES": ("CCOC(=O)\\C=C/c1ccccc1", CINNAMATE),
    "hydrogen drawn first": ("[H]OCC", dict(c13=[58.3, 18.4], h1="3.71 (q, J = 7.0 Hz, 2H), 1.23 (t, J = 7.0 Hz, 3H)")),
    "two hydrogens of a CH2": ("CC(O)CC(=O)OCC", dict(c13=[172.9, 64.3, 60.7, 42.8, 22.5, 14.2], h1=[4.19, 4.17, 2.49, 2.42, 1.27, 1.23])),
    "nearly alike": ("Cc1ccc(CC)cc1", dict(c13=[141.3, 135.0, 129.1, 127.8, 28.5, 21.0, 15.8], frequency_mhz=500)),
    "file": (str(FILES / "ethyl_4-fluorobenzoate_1_1.nmredata.sdf"), {}),
    "menthol": (str(FILES / "menthol_1_0.nmredata.sdf"), {}),
    "hydrogens drawn": (str(FILES / "ethanol_drawn_hydrogens_1_1.nmredata.sdf"), {}),
}  # fmt: skip


@pytest.fixture(scope="module", params=SAMPLES, ids=list(SAMPLES))
def written(request):
    structure, peaks = SAMPLES[request.param]
    comparison = shiftpred.compare(structure, rivals=1, **peaks)
    text = comparison.to_nmredata()
    (record,) = parse_nmredata(text)
    return comparison, text, record


def test_what_is_written_is_valid(written):
    comparison, text, record = written
    assert record.problems == () and record.version == "1.1"
    assert record.level == (1 if record.interchangeable else 0)
    assert text.endswith("$$$$\n") and text.count("$$$$") == 1
    supplier = Chem.SDMolSupplier()
    supplier.SetData(text, removeHs=False)
    assert supplier[0].HasProp("NMREDATA_ASSIGNMENT") and supplier[0].HasProp("NMREDATA_VERSION")


def test_structure_and_atom_numbers_come_back(written):
    comparison, _, record = written
    before, after = comparison.structure, record.structure
    assert (after.smiles, after.atom_numbers, after.drawn_hydrogens) == (
        before.smiles,
        before.atom_numbers,
        before.drawn_hydrogens,
    )
    assert record.solvent == comparison.prediction.solvent


def test_assignments_come_back(written):
    comparison, _, record = written
    assert len(record.signals) == len(comparison.assignments)
    for a, signal in zip(comparison.assignments, record.signals):
        assert (signal.nucleus, signal.shift_ppm, signal.atoms) == (a.nucleus, a.observed_ppm, a.equivalent_atoms)
        assert signal.label.rstrip("'").endswith(f"{a.atom}{a.hydrogen}")
    labels = [s.label for s in record.signals]
    for a, label in zip(comparison.assignments, labels):
        partners = {s.label for s in record.signals for atom in a.interchangeable if s.nucleus == a.nucleus and atom in s.atoms}
        together = {one for groups in record.interchangeable if (label,) in groups for (one,) in groups}
        assert partners <= together


def test_peaks_come_back(written):
    comparison, _, record = written
    for nucleus, peaks in comparison.peaks.items():
        found = record.build_peak_list(nucleus)
        assert len(found.peaks) == len(peaks.peaks)
        for k, (before, after) in enumerate(zip(peaks.peaks, found.peaks)):
            for name in ("shift_ppm", "lower_ppm", "upper_ppm", "multiplicity", "couplings_hz", "hydrogens", "attached_h"):
                old, new = getattr(before, name), getattr(after, name)
                assert new == (pytest.approx(old, abs=1e-9) if isinstance(old, float) else old), (name, before, after)
            on_it = {n for a in comparison.assignments if a.nucleus == nucleus and a.peak == k for n in a.equivalent_atoms}
            assert set(after.assignment) == on_it
        if peaks.frequency_mhz:
            assert found.frequency_mhz == peaks.frequency_mhz


def test_a_second_round_changes_nothing(written):
    _, text, record = written
    again = shiftpred.compare(record, rivals=0)
    (back,) = parse_nmredata(again.to_nmredata())
    assert sorted((s.nucleus, s.shift_ppm) for s in back.signals) == sorted((s.nucleus, s.shift_ppm) for s in record.signals)
    assert back.structure.smiles == record.structure.smiles


def test_the_command_writes_the_file_by_its_ending(tmp_path):
    path = tmp_path / "out.nmredata.sdf"
    done = CliRunner().invoke(command, ["compare", "CCO", "--c13", "58.3, 18.4", "--rivals", "1", "--output", str(path)])
    assert done.exit_code == 0, done.output
    (record,) = parse_nmredata(path)
    assert [(s.shift_ppm, s.atoms) for s in record.signals if s.nucleus == "13C"] == [(18.4, (1,)), (58.3, (2,))]


HOSTILE = "a;b\\c\n$$$$\n>  <X>"


def test_a_hostile_name_breaks_nothing():
    structure = parse_structure("CCO", name=HOSTILE)
    (record,) = parse_nmredata(shiftpred.compare(structure, c13=[58.3, 18.4], rivals=0).to_nmredata())
    assert record.problems == () and len(record.signals) == 2
    odd = parse_structure("CCO", name="$$$$")
    (record,) = parse_nmredata(shiftpred.compare(odd, c13=[58.3, 18.4], rivals=0).to_nmredata())
    assert len(record.signals) == 2


@pytest.mark.parametrize(
    "smiles",
    ["[H]OCC", "CC[H]", "[H]C([H])([H])C", "[2H]C([2H])([2H])O[H]", "[H][C@](F)(Cl)Br", "[C@]([H])(F)(Cl)Br", "[H]/C(C)=C/C",
     "C[N+](=O)[O-]", "c1cc[nH]c1", "[H]n1cccc1", "C/C=C\\C", "C[C@@H]1CC[C@@H](C(C)C)[C@H](O)C1", "[Na+].CC(=O)[O-]", "[H][H].C"],
)  # fmt: skip
def test_a_molfile_keeps_structure_and_numbers(smiles):
    before = parse_structure(smiles)
    after = parse_structure(render_molfile(before))
    assert (after.smiles, after.atom_numbers, after.drawn_hydrogens) == (
        before.smiles,
        before.atom_numbers,
        before.drawn_hydrogens,
    )
    assert after.deuterium == before.deuterium


def test_large_structures_are_written_as_v3000():
    chain = parse_structure("".join(["C([H])([H])"] * 340))
    block = render_molfile(chain)
    assert "V3000" in block and parse_structure(block).atom_numbers == chain.atom_numbers
    assert "V2000" in render_molfile(parse_structure("CCO"))


def test_numbers_with_unexplained_gaps_are_refused():
    with pytest.raises(NotApplicable):
        render_molfile(Structure("odd", Chem.MolFromSmiles("CO"), (2, 5), "odd"))


def test_prediction_sdf_holds_every_row_and_names_what_failed():
    good = predict_structures([parse_structure("[H]OCC", name="ethanol")], solvent="CDCl3")[0]
    bad = RecordFailure("bad", StructureError("line 2", "nothing", "a SMILES", "write one"))
    text = "".join(iterate_prediction_sdf([good, bad]))
    first, second = text.split("$$$$\n")[:2]
    rows = [line.split() for line in first.splitlines() if line[:2] in ("2 ", "3 ", "4 ") and len(line.split()) == 6]
    assert sorted((int(r[0]), float(r[2])) for r in rows) == sorted(
        (n.atom, round(n.shift_ppm, 2 if n.nucleus == "13C" else 3)) for n in good.nuclei
    )
    assert "expected a SMILES" in second and second.startswith("bad\n")
    supplier = Chem.SDMolSupplier()
    supplier.SetData(text, removeHs=False)
    assert [m.GetProp("_Name") for m in supplier] == ["ethanol", "bad"]
    assert supplier[0].GetAtomWithIdx(0).GetSymbol() == "H"


def test_predict_writes_sdf_and_reads_it_again(tmp_path):
    out = tmp_path / "out.sdf"
    done = CliRunner().invoke(command, ["predict", "-", "--output", str(out)], input="[H]OCC ethanol\nC1CC wrong\nCC(=O)OC\n")
    assert done.exit_code == 3, done.output
    records = list(parse_structures(out))
    assert [getattr(r, "atom_numbers", None) for r in records] == [(2, 3, 4), None, (1, 2, 3, 4, 5)]


def test_cxsmiles_is_noted_and_costs_nothing():
    structure = parse_structure("CCO |$a;b;c$| ethanol")
    assert (structure.name, structure.smiles) == ("ethanol", "CCO") and "CXSMILES" in structure.notes[0]
    assert parse_structure("CCO ethanol").notes == ()


def test_peak_attributes_without_a_place_stand_in_comments():
    peaks = [Peak("13C", 58.3, 58.3, 58.3, carbons=2, pair_ppm=3.7), Peak("13C", 18.4, 18.4, 18.4)]
    text = shiftpred.compare("CCO", c13=peaks, rivals=0).to_nmredata()
    assert "; 2C, C-H pair with 3.7000" in text
