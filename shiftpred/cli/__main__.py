"""`python -m shiftpred.cli` does what `shiftpred` does."""

from shiftpred.cli import main

if __name__ == "__main__":
    main()
