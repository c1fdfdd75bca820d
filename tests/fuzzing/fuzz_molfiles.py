"""Molfiles, SDF, SMILES lines and tables of structures: as drawing programs write them, then damaged.

python tests/fuzzing/fuzz_molfiles.py --minutes 10
"""

from __future__ import annotations

import gzip
import random
import tempfile
from functools import lru_cache
from pathlib import Path

from fuzz_running import run_from_command_line
from grammars import alter_text, write_text
from rdkit import Chem, rdBase

from shiftpred.errors import InputError
from shiftpred.records import RecordFailure
from shiftpred.structures import parse_structures
from shiftpred.structures.sites import compute_sites

MOLECULES = [
    "CCO", "CC(=O)Oc1ccccc1C(=O)O", "C[C@H](N)C(=O)O", "C/C=C/C", "O=[N+]([O-])c1ccccc1", "C[N+](C)(C)C.[Cl-]", "[2H]C([2H])([2H])O",
    "c1ccc2[nH]ccc2c1", "CS(=O)(=O)N", "[Na+].[O-]C(=O)C", "FC(F)(F)c1ccncc1", "C1CC2CCC1C2", "[13CH4]", "C#N",
    "CP(C)(C)=O", "OB(O)c1ccccc1",
    "C[Si](C)(C)C", "[CH3]", "Cl", "CC(C)(C)OC(=O)N1CCC[C@@H]1C(=O)O", "C1CCCCCCCCCCCCCCCCCCC1", "[Fe+2].c1cc[cH-]c1.c1cc[cH-]c1", 
    "C=C=C", "N#[N+]C",
]  # fmt: skip
FIELDS = ["  0", "  1", "  2", "  3", "  4", "  8", "  9", " -1", "999", "   ", "abc", "1e5", "1.5", " 99", "-99"]
SYMBOLS = [
    "C  ",
    "N  ",
    "H  ",
    "D  ",
    "T  ",
    "R# ",
    "R1 ",
    "A  ",
    "Q  ",
    "X  ",
    "L  ",
    "*  ",
    "Xx ",
    "   ",
    "LP ",
    "Uuo",
    "Pt ",
    "c  ",
]
PROPERTIES = [
    "M  CHG  1   1   1", "M  CHG  1  99   1", "M  CHG  8   1   1", "M  CHG  1   1  99", "M  ISO  1   1   2", "M  ISO  1   1 999",
    "M  RAD  1   1   2", "M  RAD  1   1   9", "M  RGP  1   1   1", "M  ALS   1  2 F N   O   ", "M  STY  1   1 SRU", "M  SAL   1  1   1",
    "M  SMT   1 n", "M  STY  1   1 DAT", "M  SED   1 text", "A    1", "V    1 words", "M  ZZC", "M  END", "M  V30 BEGIN CTAB", "S  SKP  3",
    "M  ZCH  1   1   1", "M  HYD  1   1   3", "G    1  2",
]  # fmt: skip
SMILES = {
    "start": ["<chain>", "<chain> <name>", "<chain>\t<name>", "<chain>.<chain>", "<chain> |<name>|", "InChI=1S/<chain>"],
    "chain": ["<atom>", "<atom><chain>", "<atom>(<chain>)<chain>", "<atom><ring><chain>", "<atom><bond><chain>",
              "<atom>(<bond><chain>)(<chain>)<chain>"],
    "atom": [
        "C", "c", "N", "n", "O", "o", "S", "s", "F", "Cl", "Br", "I", "B", "P", "[nH]", "[C@H]", "[C@@]", "[13C]", "[2H]", "[H]", "[N+]",
        "[O-]",
        "[CH2-]", "[Fe+2]", "[Se]", "*", "[R1]", "[#6]", "[C:1]", "[999C]", "[C+9]", "[Si]", "[C@TH1]", "[CH9]", "[U]", "[S@SP3]", "[$]",
    ],
    "bond": ["-", "=", "#", ":", "$", "/", "\\", "~", "->", "<-", "."],
    "ring": ["1", "2", "3", "%10", "%99", "%(100)", "=1", "0"],
    "name": ["ethanol", "1", "", "ö", "a b c", "\ud800", "'", '"', "$$$$", "M  END"],
}  # fmt: skip


@lru_cache(maxsize=256)
def build_block(smiles: str, version_3: bool, hydrogens: bool) -> str:
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles)
        mol = Chem.AddHs(mol) if hydrogens else mol
        return Chem.MolToMolBlock(mol, forceV3000=version_3)


def damage_block(block: str, chance: random.Random) -> str:
    """Alter whole lines and fixed-width fields, as other programs and editors do."""
    lines = block.split("\n")
    for _ in range(chance.randrange(5)):
        at = chance.randrange(len(lines))
        how = chance.randrange(8)
        if how == 0:
            del lines[at]
            lines = lines or [""]
        elif how == 1:
            lines.insert(at, chance.choice(lines))
        elif how == 2:
            lines.insert(at, chance.choice(PROPERTIES))
        elif how == 3 and len(lines[at]) >= 6:
            place = 3 * chance.randrange(max(1, len(lines[at]) // 3))
            lines[at] = lines[at][:place] + chance.choice(FIELDS) + lines[at][place + 3 :]
        elif how == 4 and len(lines[at]) >= 34:
            lines[at] = lines[at][:31] + chance.choice(SYMBOLS) + lines[at][34:]
        elif how == 5:
            lines[at] = lines[at][: chance.randrange(len(lines[at]) + 1)]
        elif how == 6:
            words = lines[at].split(" ")
            chance.shuffle(words)
            lines[at] = " ".join(words)
        else:
            lines[at] = alter_text(lines[at], chance, 2)
    return chance.choice(("\n", "\n", "\r\n", "\r")).join(lines)


def build_structure_text(chance: random.Random) -> str:
    kind = chance.randrange(4)
    if kind == 0:
        text = write_text(SMILES, chance)
        return alter_text(text, chance, 2) if chance.random() < 0.3 else text
    if kind == 1:
        rows = [write_text(SMILES, chance, depth=6) for _ in range(chance.randrange(1, 6))]
        heading = chance.choice(("smiles", "name,smiles", "smiles\tname", "sep=;\nsmiles;id", '"smiles"', "structure"))
        return alter_text("\n".join([heading, *rows]), chance)
    records = [
        damage_block(build_block(chance.choice(MOLECULES), chance.random() < 0.4, chance.random() < 0.2), chance)
        + chance.choice(("", "\n>  <name>\nx\n\n", "\n> <\n\n\n", "\n>  <shift>\n1;2;3\n"))
        for _ in range(chance.choice((1, 1, 2, 3)))
    ]
    return "\n$$$$\n".join(records) + chance.choice(("", "\n$$$$\n", "\n$$$$"))


def use_structure_text(text: str) -> None:
    """Read it as text and as a file of each kind; what is read must have its sites."""
    refused = None
    content = text.encode("utf-8", "surrogatepass")
    with tempfile.TemporaryDirectory() as folder:
        sources: list[object] = [text]
        for name in ("a.sdf", "a.smi", "a.csv", "a.mol.gz"):
            path = Path(folder) / name
            path.write_bytes(gzip.compress(content) if name.endswith(".gz") else content)
            sources.append(path)
        for source in sources:
            try:
                for record in parse_structures(source):
                    if isinstance(record, RecordFailure):
                        assert hasattr(record.error, "try_next"), record
                    else:
                        assert len(compute_sites(record)) == record.n_atoms
                        assert record.smiles
            except InputError as error:
                refused = error
    if refused:
        raise refused


if __name__ == "__main__":
    run_from_command_line("molfiles", build_structure_text, use_structure_text)
