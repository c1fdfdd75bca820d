"""shiftpred: do these 1H and 13C peaks bear this structure out?"""

__version__ = "0.1.0"
