"""The error of this room: one message, and the list of everything that is wrong."""

from __future__ import annotations

from shiftpred.errors import PeakError

__all__ = ["PeakListError"]


class PeakListError(PeakError):
    """A peak list that cannot be read; the message names the first thing that is wrong, `problems` lists them all.

    Parameters
    ----------
    where, came, would_do, try_next : str
        As for every error, see `shiftpred.errors`.
    problems : iterable of (place, text, reason)
        Everything that is wrong, in the order of the list.
    """

    def __init__(self, where: str, came: str, would_do: str, try_next: str, problems=()):
        self.problems = tuple(problems) or ((where, "", came),)
        super().__init__(where, came, would_do, try_next)

    def __reduce__(self):
        return type(self), (self.where, self.came, self.would_do, self.try_next, self.problems)
