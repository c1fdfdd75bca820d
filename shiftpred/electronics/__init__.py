"""Electronegativities of elements, hybrids and groups; inductive and resonance constants, each with its source."""

from importlib import import_module

_HOME = {
    "GroupVector": "shiftpred.electronics.vector",
    "group_vector": "shiftpred.electronics.vector",
}

__all__ = sorted(_HOME)


def __getattr__(name: str):
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(import_module(_HOME[name]), name)
    globals()[name] = value
    return value


def __dir__():
    return __all__
