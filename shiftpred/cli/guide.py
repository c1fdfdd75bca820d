"""`shiftpred guide`: the pages of the guide in the terminal, and its example files."""

from __future__ import annotations

import re
from importlib.resources import files

import click

from shiftpred.cli.options import traceback_option
from shiftpred.errors import SettingError, quote

TOPICS = ("start", "verify", "decide", "triage", "report", "train", "commands", "files", "json", "method", "limits")
"""In the order in which somebody new would read them; each a page `shiftpred/guide/TOPIC.md`."""


@click.command("guide", short_help="Print a page of the guide, or list the pages.")
@click.argument("topic", required=False)
@click.option("--examples", metavar="FOLDER", help="Copy the example files of the guide into this new folder.")
@traceback_option
def command(topic, examples) -> int:
    """Print the page TOPIC of the guide; without one, list the pages."""
    if examples:
        _copy_examples(examples)
    if topic:
        click.echo(render_plain_text(load_page(topic)))
    elif not examples:
        for name in TOPICS:
            click.echo(f"{name:<10}{load_page(name).splitlines()[0].lstrip('# ')}")
        click.echo("\nshiftpred guide TOPIC prints a page.")
    return 0


def load_page(topic: str) -> str:
    """Return a page of the guide as it is stored (Markdown).

    Raises
    ------
    SettingError
        If there is no such page.
    """
    name = topic.strip().lower()
    if name not in TOPICS:
        raise SettingError("argument TOPIC", quote(topic), f"one of {', '.join(TOPICS)}", "shiftpred guide start")
    return (files("shiftpred") / "guide" / f"{name}.md").read_text(encoding="utf-8")


def render_plain_text(page: str) -> str:
    """Return Markdown as plain text: headings underlined, examples indented, table columns in line.

    Examples
    --------
    >>> print(render_plain_text("# Title\\n\\nSay `this`.\\n"))
    Title
    =====
    <BLANKLINE>
    Say this.
    """
    lines, table, inside = [], [], False
    for line in [*page.splitlines(), ""]:
        if not inside and line.startswith("|"):
            table.append([cell.strip().replace("\\|", "|") for cell in re.split(r"(?<!\\)\|", line)[1:-1]])
            continue
        if table:
            lines += _render_table(table)
            table = []
        if line.startswith("```"):
            inside = not inside
        elif inside:
            lines.append(f"    {line}".rstrip())
        elif heading := re.match(r"(#+) (.*)", line):
            text = _plain(heading[2])
            lines += [text, ("=" if heading[1] == "#" else "-") * len(text)]
        else:
            lines.append(_plain(line))
    return "\n".join(lines).rstrip("\n")


def _plain(text: str) -> str:
    return re.sub(r"`([^`]*)`|\*\*([^*]+)\*\*", lambda found: found[1] if found[1] is not None else found[2], text)


def _render_table(rows: list[list[str]]) -> list[str]:
    rows = [[_plain(cell) for cell in row] for row in rows if not all(re.fullmatch(r":?-+:?", cell) for cell in row)]
    widths = [max(len(row[k]) for row in rows if k < len(row)) for k in range(max(map(len, rows)))]
    return ["  " + "  ".join(cell.ljust(width) for cell, width in zip(row, widths)).rstrip() for row in rows]


def _copy_examples(target: str) -> None:
    from pathlib import Path

    from shiftpred.bundles.locations import find_datasets
    from shiftpred.cli.boundary import print_message

    folder = Path(target)
    try:
        folder.mkdir(parents=True)
        sources = [*(find_datasets() / "demo").iterdir(), *(files("shiftpred") / "guide" / "examples").iterdir()]
        for source in sources:
            if source.is_file():
                (folder / source.name).write_bytes(source.read_bytes())
    except FileExistsError:
        raise SettingError("--examples", f"{quote(target)}, which is there already", "a new folder", "another name") from None
    except OSError as error:
        raise SettingError(
            "--examples", f"{quote(target)} ({error.strerror})", "a folder that can be written to", "another name"
        ) from None
    print_message(f"{len(list(folder.iterdir()))} files in {folder}")
