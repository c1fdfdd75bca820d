"""What an NMReDATA record holds."""

from __future__ import annotations

from dataclasses import dataclass

from shiftpred.errors import PeakError
from shiftpred.records import Peak, PeakList, Structure

__all__ = ["UNKNOWN_SHIFT_PPM", "Coupling", "NmredataError", "NmredataRecord", "Signal", "Spectrum", "SpectrumLine"]

UNKNOWN_SHIFT_PPM = 777.777
"""The standard's way to write that a shift is not known."""


class NmredataError(PeakError):
    """One thing that is wrong with a record; collected in `NmredataRecord.problems`, raised only where nothing is left.

    Parameters
    ----------
    where, came, would_do, try_next : str
        As for every error, see `shiftpred.errors`; `where` names file, line and tag.
    line : int
        1-based line of the file; 0: the file as a whole.
    """

    def __init__(self, where: str, came: str, would_do: str, try_next: str, line: int = 0):
        self.line = line
        super().__init__(where, came, would_do, try_next)

    def __reduce__(self):
        return type(self), (self.where, self.came, self.would_do, self.try_next, self.line)


@dataclass(frozen=True)
class Signal:
    """One row of the assignment: a label, its shift and its atoms."""

    label: str
    shift_ppm: float | None
    """None: not known (777.777 in the file)."""
    nucleus: str
    """'13C', '1H', another element's symbol, or '' where no atom is given."""
    atoms: tuple[int, ...]
    """The user's numbers; of hydrogens those of the atoms that bear them. Empty: not assigned."""
    hydrogens: tuple[int, ...] = ()
    """The user's numbers of hydrogens that are drawn and named one by one. Empty: hydrogens not told apart."""
    line: int = 0


@dataclass(frozen=True)
class Coupling:
    """One row of the coupling table."""

    first: str
    second: str
    """Labels of the two coupled signals."""
    hz: float
    bonds: int | None = None
    """Bonds between the two. None: not given."""
    line: int = 0


@dataclass(frozen=True)
class SpectrumLine:
    """One signal of a 1D spectrum."""

    peak: Peak
    """`assignment` holds the atoms of all labels."""
    labels: tuple[str, ...] = ()
    ambiguous: bool = False
    """True: the line belongs to one of `labels`, not to all."""
    partners: tuple[str, ...] = ()
    """Label of the coupling partner for each of `peak.couplings_hz`, '' where none is given."""
    attributes: tuple[tuple[str, str], ...] = ()
    """Every attribute as written, by name."""
    line: int = 0


@dataclass(frozen=True)
class Spectrum:
    """One 1D spectrum."""

    tag: str
    nucleus: str
    frequency_mhz: float | None
    """Larmor frequency of this nucleus. None: not given."""
    lines: tuple[SpectrumLine, ...]
    settings: tuple[tuple[str, str], ...] = ()
    """What the tag says about the spectrum (Decoupled, Sequence, Spectrum_Location, …), as written."""
    line: int = 0

    @property
    def is_edited(self) -> bool:
        """True for DEPT, APT and selective spectra, which need not show every nucleus."""
        return any(key.lower() == "sequence" for key, _ in self.settings) or self.tag.count("_") > 2


@dataclass(frozen=True)
class NmredataRecord:
    """One record as read; what could not be read is in `problems`, and the rest is there all the same."""

    name: str
    structure: Structure | None
    """None: the structure cannot be read; the first of `problems` says why."""
    version: str
    level: int | None
    solvent: str | None
    """Short name. None: not given."""
    signals: tuple[Signal, ...]
    interchangeable: tuple[tuple[tuple[str, ...], ...], ...]
    """Sets of labels of which any may be exchanged: ((a,), (b,)), or ((a, CA), (b, CB)) where labels move together."""
    equivalent: tuple[tuple[str, ...], ...]
    couplings: tuple[Coupling, ...]
    spectra: tuple[Spectrum, ...]
    other: tuple[tuple[str, str], ...] = ()
    """Text of every other NMReDATA tag, by name without its prefix."""
    problems: tuple[NmredataError, ...] = ()
    notes: tuple[str, ...] = ()

    def choose_spectrum(self, nucleus: str) -> Spectrum | None:
        """Return the first plain 1D spectrum of a nucleus that has lines, else an edited one, else None."""
        found = [s for s in self.spectra if s.nucleus == nucleus and s.lines]
        return next((s for s in found if not s.is_edited), found[0] if found else None)

    def build_peak_list(self, nucleus: str) -> PeakList | None:
        """Return the peaks of a nucleus: those of its 1D spectrum, else the shifts of the assignment; None: neither is there."""
        spectrum = self.choose_spectrum(nucleus)
        if spectrum is not None:
            peaks = tuple(line.peak for line in spectrum.lines)
            frequency, notes = spectrum.frequency_mhz, ()
            if spectrum.is_edited:
                notes = (f"{nucleus}: lines of an edited spectrum ({spectrum.tag}), which need not show every nucleus",)
        else:
            peaks, frequency = self._list_assigned(nucleus), None
            notes = (f"{nucleus}: no 1D spectrum in the file; its assigned shifts are taken as the lines",)
        if not peaks:
            return None
        return PeakList(nucleus, peaks, self.solvent, frequency, ", ".join(p.text for p in peaks), notes)

    def _list_assigned(self, nucleus: str) -> tuple[Peak, ...]:
        by_shift: dict[float, list[int]] = {}
        for signal in self.signals:
            if signal.nucleus == nucleus and signal.shift_ppm is not None:
                by_shift.setdefault(signal.shift_ppm, []).extend(signal.atoms)
        return tuple(
            Peak(nucleus, s, s, s, assignment=tuple(dict.fromkeys(atoms)), position=k, text=f"{s:g}")
            for k, (s, atoms) in enumerate(by_shift.items(), 1)
        )
