"""The gate of the list of rivals: each compound once, never the proposal, nothing that would not survive."""

from __future__ import annotations

from dataclasses import dataclass

from rdkit import Chem
from rdkit.Chem import rdMolDescriptors

from shiftpred.structures.rivals.graph_edits import mirror
from shiftpred.structures.rivals.plausibility import PlausibilityFilter
from shiftpred.structures.rivals.tautomers import compute_tautomer_key


def compute_mirror_key(mol: Chem.Mol) -> str:
    """Return a SMILES that mirror images share: NMR in an achiral solvent cannot tell them apart."""
    smiles = Chem.MolToSmiles(mol)
    if "@" in smiles:
        return min(smiles, Chem.MolToSmiles(mirror(mol)))
    return smiles


@dataclass(frozen=True)
class Examined:
    """A rival that passed everything that does not depend on the list so far."""

    smiles: str
    """Canonical isomeric SMILES, all components."""
    main: str
    """The varied component alone."""
    mirror_key: str
    constitution_key: str
    """Shared by stereoisomers and fast tautomers; '' for a stereoisomer of the proposal, which may share it."""
    unknown_share: float
    """Share of atoms whose environment out to two bonds is neither in the open table nor in the proposal."""


class Gate:
    """Examines and admits rivals of one proposal.

    Parameters
    ----------
    main : str
        SMILES of the component that is varied.
    others : str
        SMILES of all other components; '' for none.
    taken : set of str
        Mirror keys of what must not come again: the proposal and what is on the list; grows with every admission.
    """

    def __init__(self, main: str, others: str, taken: set[str]):
        proposal = Chem.MolFromSmiles(main)
        self._others = others
        self._taken = taken
        self._formula = rdMolDescriptors.CalcMolFormula(proposal)
        self._plausible = PlausibilityFilter(proposal)
        self._constitutions = {compute_tautomer_key(proposal)}

    def examine(self, smiles: str, kind: str) -> Examined | None:
        """Return the rival as it would go on the list; None: it is the proposal, no isomer, or not plausible."""
        main = Chem.MolFromSmiles(smiles)
        if main is None or "." in smiles:
            return None
        if kind != "reaction" and rdMolDescriptors.CalcMolFormula(main) != self._formula:
            return None
        unknown_share = self._plausible.compute_unknown_share(main)
        if unknown_share is None:
            return None
        whole = join_components(smiles, self._others) if self._others else main
        mirror_key = compute_mirror_key(whole)
        if mirror_key in self._taken or self._plausible.has_unlikely_group(main):
            return None
        return Examined(
            smiles=Chem.MolToSmiles(whole),
            main=smiles,
            mirror_key=mirror_key,
            constitution_key="" if kind == "stereoisomer" else compute_tautomer_key(main),
            unknown_share=unknown_share,
        )

    def admit(self, rival: Examined) -> bool:
        """Take the rival on the list, unless it is there already, also as a fast tautomer or without configuration."""
        if rival.mirror_key in self._taken or rival.constitution_key in self._constitutions:
            return False
        self._taken.add(rival.mirror_key)
        if rival.constitution_key:
            self._constitutions.add(rival.constitution_key)
        return True


def join_components(main: str, others: str) -> Chem.Mol:
    """Return one molecule of all components, in canonical order."""
    mol = Chem.MolFromSmiles(f"{main}.{others}" if others else main)
    return Chem.MolFromSmiles(Chem.MolToSmiles(mol))
