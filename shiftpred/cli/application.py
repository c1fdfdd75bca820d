"""The command `shiftpred`: finds its subcommands lazily and guards them all."""

from __future__ import annotations

import sys
from importlib import import_module

import click

from shiftpred.cli.boundary import ReaderGone, run_guarded
from shiftpred.cli.options import traceback_option

__all__ = ["command"]

COMMANDS = ("predict", "compare", "rank", "explain", "substituent", "triage", "serve", "train", "evaluate", "guide")
"""In the order of the help page; each in the file of its name."""


class Application(click.Group):
    """A group whose commands are imported when they are called, with one boundary for all errors."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, name: str) -> click.Command | None:
        if name not in COMMANDS:
            return None
        return import_module(f"shiftpred.cli.{name}").command

    def resolve_command(self, ctx: click.Context, args: list[str]):
        if args and args[0] not in COMMANDS:
            ctx.fail(f"No command {args[0]!r}; there are {', '.join(COMMANDS)}.")
        return super().resolve_command(ctx, args)

    def invoke(self, ctx: click.Context):
        try:
            result = super().invoke(ctx)
            sys.stdout.flush()
        except BrokenPipeError as error:  # before click sees it and calls it a fault
            raise ReaderGone from error
        return result

    def main(self, args=None, prog_name=None, complete_var=None, standalone_mode=True, **extra):
        """Run, and leave the process with the exit code."""
        args = list(sys.argv[1:] if args is None else args)
        plain = super().main
        if not standalone_mode:
            return plain(args, prog_name or "shiftpred", complete_var, standalone_mode=False, **extra)
        code = run_guarded(
            lambda: plain(args, prog_name or "shiftpred", complete_var, standalone_mode=False, **extra), "--traceback" in args
        )
        sys.exit(code)


def _print_versions(ctx: click.Context, _parameter: click.Parameter, wanted: bool) -> None:
    if not wanted or ctx.resilient_parsing:
        return
    from shiftpred.cli.versions import render_versions

    click.echo(render_versions())
    ctx.exit()


@click.group("shiftpred", cls=Application, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.option(
    "--version", is_flag=True, is_eager=True, expose_value=False, callback=_print_versions, help="Print versions and leave."
)
@traceback_option
def command() -> None:
    """Do these 1H and 13C peaks bear this structure out?

    Predicts shifts with intervals, assigns measured peaks, judges a structure against its rivals, and explains why a shift
    lies where it lies. A prediction is evidence, not proof of identity.

    Exit codes: 0 fine, 2 bad usage or input, 3 some records failed, 4 the judgement that --fail-on names, 1 a fault of ours.
    """
