"""The command line: one file a command, loaded when it is called."""

from shiftpred.cli.application import command

__all__ = ["command", "main"]


def main() -> None:
    """Run `shiftpred` with the arguments of the process and leave with its exit code."""
    command()
