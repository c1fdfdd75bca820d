"""Build `shiftpred/peaks/tables/impurities.csv` from the measured shifts and the additions beside this file.

    python datasets/solvents_and_impurities/build_tables.py

Rules
-----
1. Rows of `datasets/measured_shifts/assigned_shifts.csv`, without the solvents' own lines, water, and the solvents `neat` and
   `unspecified`; without rows whose note calls them suspect (two of BHT excepted: there two lines may be interchanged, which
   does not matter for a set of lines).
2. Where several sources give the same atoms: Gottlieb 1997, then Fulmer 2010, then Babij 2016, then the rest; but where two
   sources differ by more than 0.3 ppm (13C) or 0.03 ppm (1H) and the note says so, the value nearer to the median of the
   other solvents.
3. The additions, all from memory, fill lines that the measured table lacks, and add greases, tetramethylsilane, a
   plasticiser, some reagents and counter-ions.
4. `complete` is 1 where the lines of a compound, solvent and nucleus account for all its carbons, or all its hydrogens on
   carbon.
"""

from __future__ import annotations

import csv
import io
import statistics
from collections import defaultdict
from pathlib import Path

from rdkit import Chem

HERE = Path(__file__).resolve().parent
MEASURED = HERE.parent / "measured_shifts" / "assigned_shifts.csv"
TARGET = HERE.parents[1] / "shiftpred" / "peaks" / "tables" / "impurities.csv"
KEYS = {"Gottlieb": "Gottlieb 1997", "Fulmer": "Fulmer 2010", "Babij": "Babij 2016", "Sadtler": "Sadtler", "CRC": "CRC"}
PREFERENCE = list(KEYS.values())
DIFFERENT = {"13C": 0.3, "1H": 0.03}
COLUMNS = (
    "name", "smiles", "kind", "solvent", "nucleus", "shift_ppm", "nuclei", "labile", "complete", "multiplicity", "source",
    "verified",
)  # fmt: skip


def read_measured() -> list[dict]:
    """Return the measured rows that rule 1 keeps, each with its atoms and a short source."""
    rows = []
    with open(MEASURED, encoding="utf-8", newline="") as handle:
        for row in csv.DictReader(handle):
            own = "(solvent)" in row["name"] or "(residual)" in row["name"] or row["name"] == "water"
            suspect = "suspect" in row["note"] and row["name"] != "BHT"
            if own or suspect or row["solvent"] in ("neat", "unspecified"):
                continue
            row["source"] = next((key for start, key in KEYS.items() if row["source"].startswith(start)), row["source"])
            row["atoms"] = tuple(int(x) for x in (row["equivalent_atoms"] or row["atom_index"]).split(";"))
            rows.append(row)
    return rows


def choose_values(rows: list[dict]) -> list[dict]:
    """Apply rule 2: one row for each compound, nucleus, solvent and set of atoms."""
    by_atoms = defaultdict(list)
    for row in rows:
        by_atoms[row["name"], row["nucleus"], row["atoms"]].append(row)
    chosen = []
    for (_, nucleus, _), group in by_atoms.items():
        by_solvent = defaultdict(list)
        for row in group:
            by_solvent[row["solvent"]].append(row)
        for solvent, same in by_solvent.items():
            same.sort(key=lambda r: PREFERENCE.index(r["source"]) if r["source"] in PREFERENCE else 99)
            values = [float(r["shift_ppm"]) for r in same]
            elsewhere = [float(r["shift_ppm"]) for r in group if r["solvent"] != solvent]
            if max(values) - min(values) > DIFFERENT[nucleus] and " vs " in same[0]["note"] and elsewhere:
                middle = statistics.median(elsewhere)
                same.sort(key=lambda r: abs(float(r["shift_ppm"]) - middle))
            chosen.append(same[0])
    return chosen


def describe_atoms(row: dict) -> tuple[int, bool]:
    """Return (number of nuclei in the line, whether the hydrogen is labile)."""
    mol = Chem.MolFromSmiles(row["smiles"])
    atoms = [mol.GetAtomWithIdx(i) for i in row["atoms"]]
    if row["nucleus"] == "13C":
        return len(atoms), False
    return sum(a.GetTotalNumHs() for a in atoms), atoms[0].GetSymbol() != "C"


def count_expected(smiles: str, nucleus: str) -> int:
    """Return the number of carbons, or of hydrogens on carbon."""
    atoms = [a for a in Chem.MolFromSmiles(smiles).GetAtoms() if a.GetSymbol() == "C"]
    return len(atoms) if nucleus == "13C" else sum(a.GetTotalNumHs() for a in atoms)


def build_rows() -> list[dict]:
    """Return the rows of the table in their order."""
    rows = []
    for row in choose_values(read_measured()):
        nuclei, labile = describe_atoms(row)
        rows.append({**row, "kind": "impurity", "nuclei": nuclei, "labile": int(labile)})
    with open(HERE / "additions.csv", encoding="utf-8", newline="") as handle:
        for row in csv.DictReader(handle):
            rows.append({**row, "nuclei": int(row["nuclei"]), "labile": 0, "verified": "memory"})
    total = defaultdict(int)
    for row in rows:
        total[row["name"], row["solvent"], row["nucleus"]] += 0 if row["labile"] else row["nuclei"]
    for row in rows:
        complete = total[row["name"], row["solvent"], row["nucleus"]] >= count_expected(row["smiles"], row["nucleus"])
        row["complete"] = int(complete or row["kind"] in ("grease", "reference"))
    rows.sort(key=lambda r: (r["name"], r["solvent"], r["nucleus"], -float(r["shift_ppm"])))
    return rows


def build_text() -> str:
    """Return the table as CSV."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(COLUMNS)
    writer.writerows([row[c] for c in COLUMNS] for row in build_rows())
    return out.getvalue()


if __name__ == "__main__":
    TARGET.write_text(build_text(), encoding="utf-8")
    print(f"{TARGET.name}: {build_text().count(chr(10)) - 1} rows")
