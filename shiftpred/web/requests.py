"""What may be asked over HTTP: fields, limits, examples. Sizes are in characters."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field

__all__ = [
    "CompareRequest",
    "ExplainRequest",
    "PeaksRequest",
    "PredictRequest",
    "RankRequest",
    "ReportRequest",
    "StructureRequest",
]

LARGEST_STRUCTURE_TEXT = 200_000
LARGEST_PEAK_TEXT = 200_000
_BENZOATE = "CCOC(=O)c1ccccc1"
_C13 = "13C NMR (101 MHz, CDCl3) δ 166.6, 132.8, 130.5, 129.5 (2C), 128.3 (2C), 60.9, 14.3"
_H1 = "1H NMR (400 MHz, CDCl3) δ 8.04 (m, 2H), 7.55 (m, 1H), 7.43 (m, 2H), 4.38 (q, J = 7.1 Hz, 2H), 1.39 (t, J = 7.1 Hz, 3H)"

StructureText = Annotated[
    str, Field(min_length=1, max_length=LARGEST_STRUCTURE_TEXT, description="One SMILES, InChI or molfile, as text.")
]
PeakText = Annotated[
    str, Field(max_length=LARGEST_PEAK_TEXT, description="Journal text, plain numbers or a table. Blank: not measured.")
]
Solvent = Annotated[str, Field(max_length=60, description="Any common spelling. Blank: not given.")]
Coverage = Annotated[float, Field(ge=0.5, le=0.99, description="How often an interval is meant to hold the observed value.")]


class _Request(BaseModel):
    model_config = ConfigDict(extra="forbid")


class StructureRequest(_Request):
    """A structure alone."""

    model_config = ConfigDict(extra="forbid", json_schema_extra={"examples": [{"structure": _BENZOATE}]})
    structure: StructureText


class PeaksRequest(_Request):
    """One peak list alone."""

    model_config = ConfigDict(extra="forbid", json_schema_extra={"examples": [{"nucleus": "13C", "text": _C13}]})
    nucleus: Literal["13C", "1H"]
    text: PeakText


class PredictRequest(_Request):
    """Shifts with intervals."""

    model_config = ConfigDict(
        extra="forbid", json_schema_extra={"examples": [{"structure": _BENZOATE, "nucleus": "both", "solvent": "CDCl3"}]}
    )
    structure: StructureText
    nucleus: Literal["both", "13C", "1H"] = "both"
    solvent: Solvent = ""
    coverage: Coverage = 0.9


class ExplainRequest(_Request):
    """Why a shift lies where it lies."""

    model_config = ConfigDict(
        extra="forbid",
        json_schema_extra={"examples": [{"structure": _BENZOATE, "atom": 4, "nucleus": "13C", "solvent": "CDCl3"}]},
    )
    structure: StructureText
    atom: int = Field(ge=1, le=100_000, description="The user's 1-based number of the heavy atom.")
    nucleus: Literal["13C", "1H"] = "13C"
    solvent: Solvent = ""
    coverage: Coverage = 0.9
    width: int = Field(default=760, ge=300, le=1600, description="Width of the picture.")


class _Compared(_Request):
    c13: PeakText = ""
    h1: PeakText = ""
    solvent: Solvent = ""
    coverage: Coverage = 0.9
    frequency_mhz: float | None = Field(default=None, ge=10, le=1500, description="1H frequency of the spectrometer.")
    prior: float = Field(default=0.5, gt=0, lt=1, description="Probability of the structure before the peaks are seen.")
    expected: list[Annotated[str, Field(min_length=1, max_length=2000)]] = Field(
        default=[], max_length=10, description="SMILES of what else may be in the tube."
    )
    sample: str = Field(default="", max_length=200, description="Name of the sample, for the report.")


class CompareRequest(_Compared):
    """Do the peaks bear the structure out?"""

    model_config = ConfigDict(
        extra="forbid", json_schema_extra={"examples": [{"structure": _BENZOATE, "c13": _C13, "h1": _H1, "solvent": "CDCl3"}]}
    )
    structure: StructureText
    rivals: int = Field(default=9, ge=0, le=50, description="Most rivals to try.")
    mass_confirmed: bool = Field(default=False, description="The mass is known to be right: only isomers are rivals.")
    width: int = Field(default=760, ge=300, le=1600, description="Width of the lanes.")
    pictures: bool = Field(default=True, description="Whether structure and lanes are drawn.")


class ReportRequest(CompareRequest):
    """The same, as a file to keep."""

    format: Literal["html", "csv"] = "html"


class RankRequest(_Compared):
    """Which of these structures fits the peaks best?"""

    model_config = ConfigDict(
        extra="forbid",
        json_schema_extra={"examples": [{"structures": f"CCC(=O)Oc1ccccc1\n{_BENZOATE}", "c13": _C13, "solvent": "CDCl3"}]},
    )
    structures: StructureText = Field(description="One SMILES a line, or the text of an SDF; at most 100.")
