"""Solvents that the environment model knows by name."""

__all__ = ["SOLVENTS"]

SOLVENTS = (
    "",
    "CDCl3",
    "DMSO-d6",
    "CD3OD",
    "acetone-d6",
    "C6D6",
    "D2O",
    "CCl4",
    "pyridine-d5",
    "THF-d8",
    "CD3CN",
    "CD2Cl2",
    "toluene-d8",
    "TFA-d",
    "CFCl3",
    "neat",
    "mixture",
    "other",
)
"""Short names; the blank one means 'not reported' and is a value of its own."""
