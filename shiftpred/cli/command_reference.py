"""The guide's pages `commands` and `json`, written from the commands and the schemas themselves."""

from __future__ import annotations

from importlib import import_module

import click

__all__ = ["render_command_page", "render_schema_page"]

_KINDS = ("comparison", "ranking", "prediction", "explanation", "substituent")


def render_command_page() -> str:
    """Return the page of every command with every option, as click knows them."""
    from shiftpred.cli.application import COMMANDS, command

    lines = [
        "# Commands",
        "",
        "Written from the commands themselves. `shiftpred COMMAND --help` (or `-h`) prints the same.",
        "",
    ]
    for name in COMMANDS:
        one = import_module(f"shiftpred.cli.{name}").command
        with (
            click.Context(command, info_name="shiftpred", **command.context_settings) as parent,
            click.Context(one, info_name=name, parent=parent) as ctx,
        ):
            lines += [f"## {name}", "", f"`{' '.join(one.get_usage(ctx).removeprefix('Usage:').split())}`", ""]
            lines += [" ".join(part.split()) + "\n" for part in (one.help or "").split("\n\n")]
            records = [
                (p, p.get_help_record(ctx))
                for p in one.get_params(ctx)
                if isinstance(p, click.Option) and "--help" not in p.opts
            ]
            lines += ["| option | meaning |", "|---|---|"]
            lines += [f"| `{_escape(record[0])}` | {_escape(record[1])} |" for p, record in records if record and not p.hidden]
            lines.append("")
    return "\n".join(lines).rstrip("\n") + "\n"


def render_schema_page() -> str:
    """Return the page of the keys of every JSON document, as the schemas describe them."""
    from shiftpred.reporting import load_schema

    lines = [
        "# JSON",
        "",
        "Written from the schemas, which are in `shiftpred/reporting/schemas/` with every deeper key. `schema_version` rises when a",
        "key goes or changes its meaning; pass over keys that you do not know.",
        "",
    ]
    for kind in _KINDS:
        schema = load_schema(f"{kind}-1")
        lines += [f"## {kind}", "", "| key | meaning |", "|---|---|"]
        for key, value in schema["properties"].items():
            lines.append(f"| `{key}` | {_escape(_find_description(value, schema))} |")
        lines.append("")
    return "\n".join(lines).rstrip("\n") + "\n"


def _find_description(value: dict, schema: dict) -> str:
    if "description" in value:
        return value["description"]
    if "const" in value:
        return f"Always `{value['const']}`."
    if "$ref" in value:
        target = schema
        for step in value["$ref"].removeprefix("#/").split("/"):
            target = target[step]
        return target.get("description", "")
    return ""


def _escape(text: str) -> str:
    return " ".join(text.split()).replace("|", "\\|")
