"""Would a chemist believe it: known atom neighbourhoods, and no functional group that does not survive."""

from __future__ import annotations

from functools import lru_cache

from rdkit import Chem

from shiftpred.structures.rivals.neighbourhoods import (
    compute_check_sum,
    compute_neighbourhoods,
    load_neighbourhood_table,
    load_wide_sums,
    widen_neighbourhoods,
)

FEWEST_COMPOUNDS = 3
"""Compounds of the open table in which a neighbourhood must occur before a rival may bring it in (own choice: what was
seen once or twice may come from a wrong structure)."""

UNLIKELY_GROUPS = (
    # what it is, SMARTS; general chemical knowledge, no single source
    ("peroxide", "[OX2,OX1-]~[OX2]"),
    ("N-N bond outside an aromatic ring", "[NX3,NX2;!$([N+])]-[NX3,NX2;!$([N+])]"),
    ("N-O bond outside an aromatic ring", "[NX3,NX2;+0]-[OX2]"),
    ("N-S, S-S or S-O bond", "[SX2]-[SX2,NX3,NX2,OX2]"),
    ("heteroatom-halogen bond", "[#7,#8,#16X2]-[F,Cl,Br,I]"),
    ("hemiacetal, hemiaminal, halohydrin on one carbon", "[CX4]([OX2H1,SX2H1])[OX2,NX3,SX2,F,Cl,Br,I]"),
    ("aminal or N,O-acetal", "[CX4]([NX3;!$(N-[C,S]=[O,S])])[NX3,OX2,SX2,F,Cl,Br,I]"),
    ("amido acetal", "[CX4]([NX3;$(N-[C,S]=[O,S])])[NX3,OX2,SX2,F,Cl,Br,I]"),
    ("alpha-halo ether or thioether", "[CX4]([F,Cl,Br,I])[OX2,SX2]"),
    ("two halogens on one carbon", "[CX4]([F,Cl,Br,I])[F,Cl,Br,I]"),
    ("dithio- or oxathioacetal", "[CX4]([SX2])[SX2,OX2]"),
    ("acetal", "[CX4]([OX2])[OX2]"),
    ("heteroatom on the carbon that an azole nitrogen carries", "[CX4](n)[OX2,NX3,SX2,F,Cl,Br,I]"),
    ("orthoester", "[CX4]([OX2])([OX2])[OX2]"),
    ("carbamic or carbonic half acid", "[NX3,OX2][CX3](=O)[OX2H1]"),
    ("acyl halide", "[CX3](=[O,S,N])[F,Cl,Br,I]"),
    ("acid anhydride", "[CX3](=O)[OX2][CX3]=O"),
    ("enol or imidic acid", "[OX2H1,SX2H1][CX3]=[C,N]"),
    ("enamine with N-H", "[NX3;H1,H2][CX3;!$(C=[O,N,S])]=[CX3;!$(C[C,N,S]=[O,N])]"),
    ("ynol, ynamine", "[CX2]#[CX2][O,N,S]"),
    ("alkynyl halide", "[CX2]#[CX2][F,Cl,Br,I]"),
    ("cumulated double bonds", "[#6,#7]=[#6]=[#6,#7,#8,#16]"),
    ("imine with N-H", "[NX2H1]=[#6]"),
    ("imine of formaldehyde", "[CX3H2]=[NX2]"),
    ("isobenzofuran, isobenzothiophene, 2H-isoindole", "[o,s,n;r5]1cc2aaaac2c1"),
    ("nitrosamine, nitrite", "[N,O]-N=O"),
    ("N-acyl-O bond", "[OX2][NX3][CX3]=O"),
    ("isocyanide", "[C-]#[N+]"),
    ("small ring with a double bond", "[CX3;r3,r4]=[CX3;r3,r4]"),
    ("double bond on a three-membered ring", "[CX3;r3]=*"),
    ("thioaldehyde or thioketone", "[CX3;!$(C[N,O,S])]=[SX1]"),
    ("thiocarboxylic acid", "[CX3](=O)[SX2H1]"),
    ("1,2-dione or N,N pair within one aromatic ring", "[$([#6;a](=O)[#6;a]=O),$([#7X3;a]:[#7X3;a])]"),
    ("alpha-halo amine", "[CX4]([F,Cl,Br,I])[#7]"),
)


@lru_cache(maxsize=1)
def _unlikely_queries() -> tuple[Chem.Mol, ...]:
    return tuple(Chem.MolFromSmarts(smarts) for _, smarts in UNLIKELY_GROUPS)


class PlausibilityFilter:
    """Judges rivals beside one proposal: what the proposal itself has is taken as given.

    Parameters
    ----------
    proposal : rdkit.Chem.Mol
        Sanitised, hydrogens implicit.
    """

    def __init__(self, proposal: Chem.Mol):
        words = compute_neighbourhoods(proposal)
        self._own = frozenset(words)
        self._own_wide = frozenset(widen_neighbourhoods(proposal, words))
        self._table = load_neighbourhood_table()
        self._wide_sums = load_wide_sums()
        self._unlikely = [(query, len(proposal.GetSubstructMatches(query, maxMatches=50))) for query in _unlikely_queries()]

    def compute_unknown_share(self, rival: Chem.Mol) -> float | None:
        """Return the share of atoms in a radius-2 neighbourhood that is neither known nor the proposal's own.

        None: some radius-1 neighbourhood is neither known nor the proposal's own, so the rival has no place on a list.
        """
        words = compute_neighbourhoods(rival)
        for word in words:
            if word not in self._own and self._table.get(word, 0) < FEWEST_COMPOUNDS:
                return None
        unknown = sum(
            wide not in self._own_wide and compute_check_sum(wide) not in self._wide_sums
            for wide in widen_neighbourhoods(rival, words)
        )
        return unknown / len(words)

    def has_unlikely_group(self, rival: Chem.Mol) -> bool:
        """Tell whether a group that does not survive occurs more often than in the proposal."""
        for query, before in self._unlikely:
            if before:
                if len(rival.GetSubstructMatches(query, maxMatches=50)) > before:
                    return True
            elif rival.HasSubstructMatch(query):
                return True
        return False
