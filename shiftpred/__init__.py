"""shiftpred: do these 1H and 13C peaks bear this structure out?

The public door. What stands in `__all__` is what a script may build on; everything else may change.
"""

from importlib import import_module

__version__ = "0.1.0"

# Where each public name lives; imported when it is first asked for, so that starting costs nothing.
_PLACES = {
    "predict": "shiftpred.pipeline",
    "compare": "shiftpred.pipeline",
    "rank": "shiftpred.pipeline",
    "explain": "shiftpred.pipeline",
    "substituent": "shiftpred.electronics",
    "Comparison": "shiftpred.records",
    "Explanation": "shiftpred.records",
    "Peak": "shiftpred.records",
    "InputError": "shiftpred.errors",
    "NotApplicable": "shiftpred.errors",
    "ShiftpredError": "shiftpred.errors",
}

__all__ = [*_PLACES, "__version__"]


def __getattr__(name: str):
    if name in _PLACES:
        return getattr(import_module(_PLACES[name]), name)
    raise AttributeError(f"module 'shiftpred' has no attribute {name!r}")


def __dir__():
    return sorted(__all__)
