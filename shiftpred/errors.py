"""Every error that shiftpred raises on purpose.

Each is built from four parts: where it happened, what came, what would do, and what to try next. The class puts the
sentence together, so that all messages read alike and one test can check them all.
"""

__all__ = ["BundleError", "InputError", "NotApplicable", "PeakError", "SettingError", "ShiftpredError", "StructureError"]


class ShiftpredError(Exception):
    """Anything that shiftpred refuses knowingly.

    Parameters
    ----------
    where : str
        Argument, file, row or position that was read.
    came : str
        What was found there; quoted text is shortened to 80 characters by `quote`.
    would_do : str
        What is accepted instead.
    try_next : str
        One thing that the user can do now.

    Examples
    --------
    >>> raise ShiftpredError("argument 'nucleus'", "'13N'", "one of '13C', '1H', 'both'", "nucleus='13C'")
    Traceback (most recent call last):
    ...
    shiftpred.errors.ShiftpredError: argument 'nucleus': got '13N'; expected one of '13C', '1H', 'both'. Try: nucleus='13C'
    """

    def __init__(self, where: str, came: str, would_do: str, try_next: str):
        self.where, self.came, self.would_do, self.try_next = where, came, would_do, try_next
        super().__init__(f"{where}: got {came}; expected {would_do}. Try: {try_next}")

    def __reduce__(self):
        return type(self), (self.where, self.came, self.would_do, self.try_next)


class InputError(ShiftpredError, ValueError):
    """Input that cannot be used; stops this record, never the others."""


class StructureError(InputError):
    """A structure that cannot be read or has no place here."""


class PeakError(InputError):
    """A peak list that cannot be read; `where` gives the position."""


class SettingError(ShiftpredError, ValueError):
    """An argument or option outside what is accepted."""


class NotApplicable(ShiftpredError, LookupError):
    """Not wrong, only not defined here (an inductive constant of a charged group, say); may be caught and reported."""


class BundleError(ShiftpredError, OSError):
    """A trained model on disk that is damaged, tampered with or of another format."""


def quote(value: object, longest: int = 80) -> str:
    """Return `value` as a short quoted text for an error message."""
    text = repr(value)
    return text if len(text) <= longest else text[: longest - 1] + "…"
