"""One number of an element or a group, which says on which scale it is and where it comes from."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["SourcedConstant"]


@dataclass(frozen=True)
class SourcedConstant:
    """A constant with its scale, unit and origin."""

    name: str
    """'electronegativity', 'sigma_I', 'sigma_star', 'sigma_meta', 'sigma_para', 'F', 'R', 'sigma_R', 'partial_charge', …"""
    scale: str
    """Scale or method: 'Pauling (Allred 1961)', 'Bratsch harmonic mean', 'Taft', …"""
    value: float
    unit: str
    """'Pauling units', 'eV', 'e'; 'dimensionless' for sigma constants."""
    source: str
    """Publication of a published number; method and inputs of a computed one."""
    origin: str
    """'published' or 'computed'."""
    verified: str
    """'transcription' (seen in a page that quotes the source), 'memory' (remembered, not seen) or 'computed'."""
    note: str = ""

    def to_dict(self) -> dict[str, object]:
        """Return the fields as a plain dictionary."""
        return {field: getattr(self, field) for field in self.__dataclass_fields__}
