"""Stereoisomers that NMR can see: diastereomers, ring cis/trans and E/Z; never the enantiomer."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial

from rdkit import Chem

from shiftpred.structures.rivals.graph_edits import invert_centre, is_centre
from shiftpred.structures.rivals.workspace import Candidate, Workspace

_GEOMETRIES = {
    Chem.BondStereo.STEREOCIS: Chem.BondStereo.STEREOTRANS,
    Chem.BondStereo.STEREOTRANS: Chem.BondStereo.STEREOCIS,
}


def build_inverted_centres(workspace: Workspace) -> Iterator[Candidate]:
    """Invert one stereocentre at a time where at least two are specified.

    Ring cis/trans pairs are among them. What turns out to be the enantiomer of the proposal (a meso partner, say) is
    dropped by the selection, which compares mirror images.
    """
    centres = [atom.GetIdx() for atom in workspace.mol.GetAtoms() if is_centre(atom)]
    if len(centres) < 2:
        return
    for centre in centres:
        in_ring = workspace.ring_degree[centre] > 0 and any(
            other != centre and workspace.same_ring(centre, other) for other in centres
        )
        yield Candidate(
            edit=partial(_invert, centre),
            how=partial(_describe_inversion, workspace, centre, in_ring, len(centres)),
        )


def build_turned_double_bonds(workspace: Workspace) -> Iterator[Candidate]:
    """Turn each specified double bond from E to Z or from Z to E."""
    for bond in workspace.mol.GetBonds():
        if bond.GetStereo() in _GEOMETRIES:
            label = _label(bond)
            yield Candidate(
                edit=partial(_turn, bond.GetIdx()),
                how=partial("{} instead of {} at a double bond".format, *(("Z", "E") if label == "E" else ("E", "Z"))),
            )


def _label(bond: Chem.Bond) -> str:
    """Return 'E' or 'Z'; the stated neighbours are those of higher rank, as the SMILES reader chooses them."""
    return "E" if bond.GetStereo() == Chem.BondStereo.STEREOTRANS else "Z"


def _invert(centre: int, editable: Chem.RWMol) -> None:
    invert_centre(editable.GetAtomWithIdx(centre))


def _turn(bond_index: int, editable: Chem.RWMol) -> None:
    bond = editable.GetBondWithIdx(bond_index)
    bond.SetStereo(_GEOMETRIES[bond.GetStereo()])


def _describe_inversion(workspace: Workspace, centre: int, in_ring: bool, n_centres: int) -> str:
    groups = [workspace.group_name(centre, other) for other in workspace.exocyclic(centre)]
    if in_ring and len(groups) == 1:
        words = f"{groups[0]} on the other face of the ring"
        return f"cis/trans isomer: {words}" if n_centres == 2 else f"epimer: {words}"
    return "diastereomer: one of the stereocentres inverted"
