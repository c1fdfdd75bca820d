"""Optional parts of the package that a command may need."""

from __future__ import annotations

from importlib.util import find_spec

from shiftpred.errors import SettingError

__all__ = ["require_extra"]


def require_extra(extra: str, *modules: str) -> None:
    """Refuse, with the way out, where an optional library is missing.

    Raises
    ------
    SettingError
        Naming the libraries and the command that installs them.
    """
    missing = [module for module in modules if find_spec(module) is None]
    if missing:
        raise SettingError(
            "this installation", f"no {' and no '.join(missing)}", f"the extra '{extra}'", f"pip install 'shiftpred[{extra}]'"
        )
