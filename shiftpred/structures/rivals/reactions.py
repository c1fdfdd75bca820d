"""Neighbours by reaction: starting materials, lost protecting groups, hydrolysed, oxidised, reduced, another halogen.

The reactions stand in `tables/reactions.tsv`, one a row, with the sentence that the chemist reads; `tables/further_reactions.tsv`
holds those that are tried only where there are not enough rivals.
"""

from __future__ import annotations

import csv
from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache, partial
from importlib.resources import files

from rdkit import Chem
from rdkit.Chem import rdChemReactions

from shiftpred.errors import BundleError, quote
from shiftpred.structures.rivals.workspace import Candidate, Workspace

TABLE_NAME, FURTHER_TABLE_NAME = "reactions.tsv", "further_reactions.tsv"
COLUMNS = ("reaction", "smarts", "how", "penalty")
SMALLEST_SHARE = 0.4
"""Share of the proposal's heavy atoms that a product must have (common practice, no source)."""
SMALLEST_PRODUCT = 3
"""Heavy atoms."""
_MOST_SITES = 12
"""Sites of one molecule at which one reaction is tried."""


@dataclass(frozen=True)
class Reaction:
    """One row of the reaction table."""

    name: str
    smarts: str
    how: str
    penalty: float
    transform: rdChemReactions.ChemicalReaction


@lru_cache(maxsize=2)
def load_reactions(table_name: str = TABLE_NAME) -> tuple[Reaction, ...]:
    """Return a reaction table, read once.

    Raises
    ------
    BundleError
        If a column is missing or a row cannot be read.
    """
    source = files("shiftpred.structures.rivals") / "tables" / table_name
    lines = [line for line in source.read_text(encoding="utf-8").splitlines() if line and not line.startswith("#")]
    rows = csv.DictReader(lines, delimiter="\t", quoting=csv.QUOTE_NONE)
    if tuple(rows.fieldnames or ()) != COLUMNS:
        raise BundleError(f"table {table_name}", f"columns {rows.fieldnames}", f"columns {COLUMNS}", "install shiftpred again")
    reactions = []
    for row in rows:
        try:
            transform = rdChemReactions.ReactionFromSmarts(row["smarts"])
            transform.Initialize()
            reactions.append(Reaction(row["reaction"], row["smarts"], row["how"], float(row["penalty"]), transform))
        except (ValueError, TypeError) as error:
            raise BundleError(
                f"table {table_name}, row {quote(row['reaction'])}",
                quote(row["smarts"]),
                "a reaction SMARTS and a number",
                "install shiftpred again",
            ) from error
    return tuple(reactions)


def build_reaction_neighbours(workspace: Workspace) -> Iterator[Candidate]:
    """Run every reaction of the table once at each of its sites."""
    yield from _run_reactions(workspace, load_reactions())


def build_further_neighbours(workspace: Workspace) -> Iterator[Candidate]:
    """Run the reactions that are tried only where there are not enough rivals."""
    yield from _run_reactions(workspace, load_reactions(FURTHER_TABLE_NAME))


def _run_reactions(workspace: Workspace, reactions: tuple[Reaction, ...]) -> Iterator[Candidate]:
    smallest = max(SMALLEST_PRODUCT, SMALLEST_SHARE * workspace.n_atoms)
    for reaction in reactions:
        if not workspace.mol.HasSubstructMatch(reaction.transform.GetReactantTemplate(0)):
            continue
        for product_set in reaction.transform.RunReactants((workspace.mol,), maxProducts=_MOST_SITES):
            for product in product_set:
                if product.GetNumAtoms() >= smallest:
                    yield Candidate(
                        edit=partial(_give, product),
                        how=partial(str, reaction.how),
                        penalty=reaction.penalty,
                    )


def _give(product: Chem.Mol, editable: Chem.RWMol) -> Chem.Mol:
    return product
