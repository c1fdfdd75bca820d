"""Every example of the guide runs; the reference pages are what the commands and schemas say.

A block ```console``` holds commands after `$ ` (with `# exit code N` where it is not 0); each line below must be found in the
output, in this order. A block ```python``` is a doctest. `console training` is only checked to be a command that would be accepted.
"""

import doctest
import os
import re
import shlex
from importlib import import_module
from importlib.resources import files

import pytest
from click.testing import CliRunner

from shiftpred.cli import command
from shiftpred.cli.command_reference import render_command_page, render_schema_page
from shiftpred.cli.guide import TOPICS, load_page, render_plain_text

BLOCK = re.compile(r"^```([^\n]*)\n(.*?)^```$", re.M | re.S)


def blocks(kind):
    return [
        pytest.param(body, id=f"{topic}-{number}")
        for topic in TOPICS
        for number, (name, body) in enumerate(BLOCK.findall(load_page(topic)))
        if name.strip() == kind
    ]


def commands_of(body):
    """Yield (arguments, exit code, expected lines) of each command of a block."""
    for part in re.split(r"^\$ ", body, flags=re.M)[1:]:
        first, *expected = part.splitlines()
        line, _, code = first.partition(" # exit code ")
        words = shlex.split(line)
        assert words[0] == "shiftpred"
        yield words[1:], int(code or 0), [text for text in expected if text.strip()]


@pytest.fixture(scope="module")
def examples(tmp_path_factory):
    folder = tmp_path_factory.mktemp("guide") / "demo"
    result = CliRunner().invoke(command, ["guide", "--examples", str(folder)])
    assert result.exit_code == 0, result.output
    return folder


@pytest.fixture
def workplace(examples, monkeypatch):
    monkeypatch.chdir(examples)
    return examples


@pytest.mark.parametrize("body", blocks("console"))
def test_commands_run_and_say_what_the_page_says(body, workplace):
    for words, code, expected in commands_of(body):
        result = CliRunner().invoke(command, words)
        assert result.exit_code == code, result.output
        at = 0
        for text in expected:
            found = result.stdout.find(text.strip(), at)
            assert found >= 0, f"{text!r} is not in what follows {result.stdout[:at][-80:]!r}"
            at = found + len(text.strip())


@pytest.mark.parametrize("body", blocks("python"))
def test_python_examples_are_true(body, workplace):
    test = doctest.DocTestParser().get_doctest(body, {}, "guide", None, 0)
    found = doctest.DocTestRunner(optionflags=doctest.ELLIPSIS, verbose=False)
    found.run(test)
    assert found.tries and not found.failures


@pytest.mark.parametrize("body", blocks("console training"))
def test_training_commands_would_be_accepted(body):
    for words, _, _ in commands_of(body):
        one = import_module(f"shiftpred.cli.{words[0]}").command
        one.make_context(words[0], words[1:])  # raises on an option or argument that does not exist


def test_every_page_is_a_topic_and_has_examples_of_known_kinds():
    stored = {path.name.removesuffix(".md") for path in (files("shiftpred") / "guide").iterdir() if path.name.endswith(".md")}
    assert stored == set(TOPICS)
    kinds = {name.strip() for topic in TOPICS for name, _ in BLOCK.findall(load_page(topic))}
    assert kinds == {"console", "console training", "python", "text"}
    assert len(blocks("console")) >= 12 and len(blocks("python")) >= 4


@pytest.mark.parametrize("topic, render", [("commands", render_command_page), ("json", render_schema_page)])
def test_reference_pages_are_up_to_date(topic, render):
    """`SHIFTPRED_STORE_TEXTS=1` writes them anew."""
    if os.environ.get("SHIFTPRED_STORE_TEXTS"):
        (files("shiftpred") / "guide" / f"{topic}.md").write_text(render(), encoding="utf-8")
    assert load_page(topic) == render()


def test_command_page_has_every_option():
    from shiftpred.cli.application import COMMANDS

    page = load_page("commands")
    for name in COMMANDS:
        assert f"## {name}\n" in page
        part = page.split(f"## {name}\n")[1].split("\n## ")[0]
        for option in import_module(f"shiftpred.cli.{name}").command.params:
            for word in (w for w in option.opts if w.startswith("--")):
                assert f"`{word}" in part, (name, word)


def test_columns_and_codes_on_the_pages_are_those_of_the_code():
    from shiftpred.reporting import PREDICTION_COLUMNS
    from shiftpred.triage.judging import ROW_COLUMNS

    assert ",".join(PREDICTION_COLUMNS) in load_page("files")
    named = re.search(r"columns of the summary: (.*?)\.\n", load_page("triage"), re.S)[1]
    assert tuple(re.findall(r"`(\w+)`", named)) == ROW_COLUMNS


def test_example_files_are_those_on_the_pages(examples):
    for name, topic in (("nitrobenzoates.smi", "decide"), ("peaks_german.csv", "files")):
        assert (examples / name).read_text() in [body for _, body in BLOCK.findall(load_page(topic))]


def test_guide_lists_topics_and_prints_pages():
    listed = CliRunner().invoke(command, ["guide"])
    assert listed.exit_code == 0 and all(f"\n{topic} " in f"\n{listed.stdout}" for topic in TOPICS)
    page = CliRunner().invoke(command, ["guide", "Report"])
    assert page.exit_code == 0 and page.stdout.startswith("Read the report\n===============\n")
    assert "```" not in page.stdout and "|---" not in page.stdout and "**" not in page.stdout


def test_unknown_topic_and_existing_folder_are_refused(tmp_path):
    wrong = CliRunner().invoke(command, ["guide", "nmr"])
    assert wrong.exit_code == 2 and "verify" in wrong.stderr and "Try: " in wrong.stderr
    again = CliRunner().invoke(command, ["guide", "--examples", str(tmp_path)])
    assert again.exit_code == 2 and "there already" in again.stderr


def test_plain_text_keeps_bars_inside_cells():
    assert render_plain_text("| `a\\|b` | c |\n|---|---|\n| d | e |\n") == "  a|b  c\n  d    e"
