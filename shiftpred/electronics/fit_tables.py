"""Write the fitted parameter tables anew: `python -m shiftpred.electronics.fit_tables [folder]`."""

from __future__ import annotations

import csv
import sys
from pathlib import Path

from shiftpred.electronics.fitting import fit_inductive, fit_resonance

__all__ = ["save_fitted_tables"]

_SOURCE = "fitted here to {} of substituent_constants.csv (python -m shiftpred.electronics.fit_tables)"
_UNITS = {"constant": "dimensionless", "prior": "1/Pauling unit"}


def save_fitted_tables(folder: Path) -> None:
    """Fit both models and save `inductive_parameters.csv` and `resonance_parameters.csv`.

    Parameters
    ----------
    folder : Path
        Must exist.
    """
    inductive, _ = fit_inductive()
    source = _SOURCE.format("sigma_I, sigma* and F")
    rows = [
        (quantity, kind, f"{value:.4f}", _UNITS.get(kind, "angstrom^2"), source, "computed")
        for quantity, values in inductive.items()
        for kind, value in values.items()
    ]
    _save(folder / "inductive_parameters.csv", ("quantity", "kind", "value", "unit", "source", "verified"), rows)
    resonance, _ = fit_resonance()
    rows = [(term, f"{value:.4f}", "dimensionless", _SOURCE.format("R"), "computed") for term, value in resonance.items()]
    _save(folder / "resonance_parameters.csv", ("term", "value", "unit", "source", "verified"), rows)


def _save(path: Path, header: tuple[str, ...], rows: list[tuple[str, ...]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerows([header, *rows])


if __name__ == "__main__":
    save_fitted_tables(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent / "tables")
