"""What could be in the tube instead: isomers, stereoisomers and neighbours by reaction, the nearest first."""

from shiftpred.structures.rivals.selection import build_rivals

__all__ = ["build_rivals"]
