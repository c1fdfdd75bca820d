"""Which atom neighbourhoods are known: compact tables derived from the open shift data.

The neighbourhood of an atom (radius 1, hydrogens counted) is written as one short text: the atom's token, then in
brackets each bond with the neighbour's token, sorted. A token is the element symbol (lower case: aromatic), its charge,
`D` and the number of heavy neighbours, `H` and the number of hydrogens, and `R` for a ring atom that is not aromatic.
Ethanol's CH2 is ``CD2H2(-CD1H3 -OD1H1)``; with square brackets around each token it reads as SMARTS. Radius 2 repeats
this with neighbourhoods in the place of tokens.

Two tables are shipped: radius 1 with the number of compounds of each neighbourhood, and radius 2 as a sorted list of
24-bit check sums (the upper 24 bits of CRC-32 of the text), which says "known" wrongly about once in 120 times.
"""

from __future__ import annotations

import gzip
import zlib
from collections import Counter
from collections.abc import Iterable
from functools import lru_cache
from importlib.resources import files
from pathlib import Path

import numpy as np
from rdkit import Chem

from shiftpred.errors import BundleError, StructureError, quote

TABLE_NAME = "neighbourhood_counts.tsv.gz"
WIDE_TABLE_NAME = "wide_neighbourhoods.bin.gz"
"""Gaps between the sorted check sums, four bytes each, little-endian: first all lowest bytes, then all second ones, and so
on, which packs better. The origin stands in the heading of the other table. Both in `tables/` beside this file."""

_BOND_SIGNS = {
    Chem.BondType.SINGLE: "-",
    Chem.BondType.DOUBLE: "=",
    Chem.BondType.TRIPLE: "#",
    Chem.BondType.AROMATIC: ":",
    Chem.BondType.DATIVE: ">",
}
_HEADING = (
    "# Atom neighbourhoods (radius 1, hydrogens counted) and the number of compounds that hold them.",
    "# Derived statistic of {compounds} structures of the open data of nmrshiftdb2 (Kuhn and Schlörer, "
    "Magn. Reson. Chem. 2015, 53, 582; Steinbeck, Krause and Kuhn, J. Chem. Inf. Comput. Sci. 2003, 43, 1733); "
    "no structure, no peak. The file wide_neighbourhoods.bin.gz holds check sums of the radius-2 neighbourhoods of the "
    "same structures.",
    "# Notation: see shiftpred/structures/rivals/neighbourhoods.py. Columns: neighbourhood, compounds.",
)


@lru_cache(maxsize=8192)
def _token(atomic_number: int, aromatic: bool, degree: int, hydrogens: int, charge: int, in_ring: bool) -> str:
    symbol = Chem.GetPeriodicTable().GetElementSymbol(atomic_number) if atomic_number else "*"
    sign = ("+" if charge > 0 else "-") * abs(charge)
    ring = "R" if in_ring and not aromatic else ""
    return f"{symbol.lower() if aromatic else symbol}{sign}D{degree}H{hydrogens}{ring}"


def compute_neighbourhoods(mol: Chem.Mol, radius: int = 1) -> list[str]:
    """Return the neighbourhood of every atom as text.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised, hydrogens implicit.
    radius : int, default 1
        Bonds that are looked at around each atom. 0 gives the bare tokens.

    Returns
    -------
    list of str, of length n_atoms
        In the order of the atoms.

    Examples
    --------
    >>> compute_neighbourhoods(Chem.MolFromSmiles("CCO"))[1]
    'CD2H2(-CD1H3 -OD1H1)'
    """
    words = []
    # indexed access: iterating over mol.GetAtoms() costs three times as much, and this runs for every rival
    for index in range(mol.GetNumAtoms()):
        atom = mol.GetAtomWithIdx(index)
        words.append(
            _token(
                atom.GetAtomicNum(),
                atom.GetIsAromatic(),
                atom.GetDegree(),
                atom.GetTotalNumHs(),
                atom.GetFormalCharge(),
                atom.IsInRing(),
            )
        )
    for _ in range(radius):
        words = widen_neighbourhoods(mol, words)
    return words


def widen_neighbourhoods(mol: Chem.Mol, words: list[str]) -> list[str]:
    """Return the neighbourhoods one bond wider than those given."""
    around: list[list[str]] = [[] for _ in words]
    for index in range(mol.GetNumBonds()):
        bond = mol.GetBondWithIdx(index)
        begin, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        sign = _BOND_SIGNS.get(bond.GetBondType(), "~")
        around[begin].append(sign + words[end])
        around[end].append(sign + words[begin])
    return [f"{word}({' '.join(sorted(neighbours))})" for word, neighbours in zip(words, around, strict=True)]


def compute_check_sum(neighbourhood: str) -> int:
    """Return the 24-bit check sum under which a radius-2 neighbourhood is kept."""
    return zlib.crc32(neighbourhood.encode()) >> 8


def build_neighbourhood_table(smiles: Iterable[str]) -> tuple[dict[str, int], frozenset[int], int]:
    """Count in how many compounds each radius-1 neighbourhood occurs, and collect those of radius 2.

    Parameters
    ----------
    smiles : iterable of str
        One compound each.

    Returns
    -------
    counts : dict of str to int
        Neighbourhood and number of compounds.
    wide_sums : frozenset of int
        Check sums of the radius-2 neighbourhoods.
    n_compounds : int
        Compounds that were counted.

    Raises
    ------
    StructureError
        If a SMILES cannot be read.
    """
    counts: Counter[str] = Counter()
    wide_sums: set[int] = set()
    n_compounds = 0
    for row, text in enumerate(smiles, start=1):
        mol = Chem.MolFromSmiles(text)
        if mol is None:
            raise StructureError(f"compound {row}", quote(text), "a valid SMILES", "leave this compound out")
        counts.update(set(compute_neighbourhoods(mol)))
        wide_sums.update(compute_check_sum(text) for text in compute_neighbourhoods(mol, radius=2))
        n_compounds += 1
    return dict(counts), frozenset(wide_sums), n_compounds


def save_neighbourhood_tables(folder: Path, counts: dict[str, int], wide_sums: frozenset[int], n_compounds: int) -> None:
    """Write both tables into a folder; the same counts always give the same bytes."""
    lines = [line.format(compounds=n_compounds) for line in _HEADING]
    lines += [f"{neighbourhood}\t{number}" for neighbourhood, number in sorted(counts.items())]
    (folder / TABLE_NAME).write_bytes(gzip.compress(("\n".join(lines) + "\n").encode(), 9, mtime=0))
    gaps = np.diff(np.array(sorted(wide_sums), dtype=np.int64), prepend=0)
    planes = gaps.astype("<u4").view(np.uint8).reshape(-1, 4).T
    (folder / WIDE_TABLE_NAME).write_bytes(gzip.compress(planes.tobytes(), 9, mtime=0))


@lru_cache(maxsize=1)
def load_neighbourhood_table() -> dict[str, int]:
    """Return neighbourhood → number of compounds, read once.

    Raises
    ------
    BundleError
        If the shipped table is damaged.
    """
    source = files("shiftpred.structures.rivals") / "tables" / TABLE_NAME
    try:
        lines = gzip.decompress(source.read_bytes()).decode().splitlines()
        counts = {}
        for line in lines:
            if not line.startswith("#"):
                neighbourhood, number = line.split("\t")
                counts[neighbourhood] = int(number)
    except (OSError, EOFError, ValueError) as error:
        raise BundleError(
            f"table {TABLE_NAME}", quote(str(error)), "the table as shipped", "install shiftpred again"
        ) from error
    return counts


@lru_cache(maxsize=1)
def load_wide_sums() -> frozenset[int]:
    """Return the check sums of all known radius-2 neighbourhoods, read once.

    Raises
    ------
    BundleError
        If the shipped table is damaged.
    """
    source = files("shiftpred.structures.rivals") / "tables" / WIDE_TABLE_NAME
    try:
        planes = np.frombuffer(gzip.decompress(source.read_bytes()), dtype=np.uint8).reshape(4, -1)
    except (OSError, EOFError, ValueError) as error:
        raise BundleError(
            f"table {WIDE_TABLE_NAME}", quote(str(error)), "the table as shipped", "install shiftpred again"
        ) from error
    gaps = np.ascontiguousarray(planes.T).view("<u4").ravel()
    return frozenset(np.cumsum(gaps, dtype=np.int64).tolist())
