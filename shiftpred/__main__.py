"""`python -m shiftpred` is the command line."""

from shiftpred.cli import main

if __name__ == "__main__":
    main()
