"""Public names of a package that are imported when they are first asked for, so that starting costs nothing."""

from __future__ import annotations

from collections.abc import Callable
from importlib import import_module

__all__ = ["build_lazy_names"]


def build_lazy_names(namespace: dict, places: dict[str, str]) -> tuple[list[str], Callable, Callable]:
    """Return `__all__`, `__getattr__` and `__dir__` for a package.

    Parameters
    ----------
    namespace : dict
        The package's `globals()`; a name is kept there once it is imported.
    places : dict of str to str
        Public name → module that has it.

    Examples
    --------
    >>> names = {"__name__": "measures"}
    >>> public, get, _ = build_lazy_names(names, {"sqrt": "math"})
    >>> public, get("sqrt")(9.0), "sqrt" in names
    (['sqrt'], 3.0, True)
    """
    public = sorted(places)

    def get(name: str):
        if name not in places:
            raise AttributeError(f"module {namespace['__name__']!r} has no attribute {name!r}")
        value = getattr(import_module(places[name]), name)
        namespace[name] = value
        return value

    def list_names() -> list[str]:
        return public

    return public, get, list_names
