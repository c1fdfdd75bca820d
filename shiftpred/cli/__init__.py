"""The command line: one file a command, loaded when it is called."""

__all__ = ["main"]


def main() -> None:
    """Run `shiftpred` with the arguments of the process and leave with its exit code."""
    from shiftpred.cli.application import application

    application()
