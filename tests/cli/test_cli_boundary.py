"""Errors become one line and an exit code; help, versions, pipes and start-up behave."""

from __future__ import annotations

import os
import subprocess
import sys

import click
import pytest

from shiftpred.cli.application import COMMANDS
from shiftpred.cli.boundary import run_guarded
from shiftpred.errors import BundleError, InputError, SettingError


def _shiftpred(*words, **keywords):
    return subprocess.run(
        [sys.executable, "-m", "shiftpred.cli", *words],
        capture_output=True,
        text=True,
        encoding="utf-8",
        timeout=120,
        **keywords,
    )


def _raise(error):
    def run():
        raise error

    return run


@pytest.mark.parametrize(
    ("error", "code", "message"),
    [
        (InputError("row 3", "'x'", "a number", "7.26"), 2, "row 3: got 'x'; expected a number. Try: 7.26"),
        (SettingError("coverage", "2", "less than 1", "0.9"), 2, "coverage: got 2"),
        (BundleError("model", "damaged", "a whole one", "fetch it again"), 2, "model: got damaged"),
        (click.UsageError("No such option."), 2, "No such option. Try: shiftpred --help"),
        (click.ClickException("refused"), 2, "refused"),
        (KeyError("lost"), 1, "KeyError: 'lost'. This is a fault of ours; run again with --traceback."),
        (OSError(5, "disk on fire"), 1, "OSError: [Errno 5] disk on fire"),
        (OSError(28, "No space left on device"), 2, "standard output: got a full disk"),
        (KeyboardInterrupt(), 130, "interrupted"),
        (ValueError("two\nlines\tand tabs"), 1, "ValueError: two lines and tabs."),
    ],
)
def test_an_error_becomes_one_line_and_a_code(capfd, error, code, message):
    assert run_guarded(_raise(error), show_traceback=False) == code
    out, err = capfd.readouterr()
    assert out == "" and message in err and err.startswith("shiftpred: ") and err.count("\n") == 1
    assert "Traceback" not in err


@pytest.mark.parametrize("error", [InputError("a", "b", "c", "d"), KeyError("lost")])
def test_the_trace_is_shown_on_request(capfd, error):
    run_guarded(_raise(error), show_traceback=True)
    err = capfd.readouterr().err
    assert "Traceback (most recent call last)" in err and err.rstrip().splitlines()[-1].startswith("shiftpred: ")


def test_codes_pass_through_and_anything_else_is_fine():
    assert run_guarded(lambda: 4, False) == 4
    assert run_guarded(lambda: None, False) == 0


def test_help_lists_every_command_and_every_command_has_help(run):
    text = run("--help").stdout
    assert [name for name in COMMANDS if name not in text] == []
    for name in COMMANDS:
        result = run(name, "--help")
        assert result.exit_code == 0 and "Usage:" in result.stdout and "--traceback" in result.stdout


def test_no_arguments_show_the_help(run):
    result = run()
    assert result.exit_code == 2 and "Usage:" in result.stderr


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (["predikt", "CCO"], "No command 'predikt'; there are predict, compare"),
        (["predict"], "Missing argument 'INPUT'"),
        (["predict", "CCO", "--nucleus", "15N"], "'15N' is not one of"),
        (["predict", "CCO", "--colour", "red"], "--colour"),
        (["predict", "CCO", "CC"], "unexpected extra argument"),
        (["explain", "CCO"], "--atom"),
        (["substituent"], "GROUP"),
        (["triage", "x.csv"], "--output"),
    ],
)
def test_usage_errors_are_one_line_and_code_2(run, words, message):
    result = run(*words)
    assert result.exit_code == 2 and result.stdout == ""
    assert message in result.stderr and result.stderr.count("\n") == 1 and "--help" in result.stderr


def test_an_extra_that_is_not_installed_is_named_with_its_cure():
    from shiftpred.cli.extras import require_extra

    with pytest.raises(SettingError, match=r"no no_such_library.*pip install 'shiftpred\[train\]'"):
        require_extra("train", "sys", "no_such_library")


def test_a_progress_bar_is_for_a_watching_person_only(monkeypatch):
    from shiftpred.cli import output

    class Stream:
        def __init__(self, terminal):
            self.terminal = terminal

        def isatty(self):
            return self.terminal

    for err, out, file, wanted in [
        (True, False, None, True),  # somebody watches, the rows go down a pipe
        (True, True, None, False),  # rows and bar would run into one another
        (True, True, "x.csv", True),
        (False, False, None, False),
        (False, True, "x.csv", False),
    ]:
        monkeypatch.setattr(output.sys, "stderr", Stream(err))
        monkeypatch.setattr(output.sys, "stdout", Stream(out))
        assert output.is_progress_wanted(file) is wanted
    monkeypatch.undo()
    items = [1, 2]
    assert output.track_progress(items, None, "molecules") is items


def test_the_process_itself_keeps_to_the_codes():
    bad = _shiftpred("predict", "CCO", "--format", "xml")
    assert (bad.returncode, bad.stdout) == (2, "") and bad.stderr.count("\n") == 1 and "Traceback" not in bad.stderr
    unknown = _shiftpred("frobnicate")
    assert unknown.returncode == 2 and "No command 'frobnicate'" in unknown.stderr


def test_versions_name_what_matters_for_a_report():
    result = _shiftpred("--version")
    assert result.returncode == 0
    names = [line.split()[0] for line in result.stdout.splitlines()]
    assert names[:5] == ["shiftpred", "model", "python", "rdkit", "numpy"] and len(names) == len(set(names))


def test_versions_import_neither_training_nor_tables():
    code = (
        "import sys; from click.testing import CliRunner; from shiftpred.cli import command\n"
        "assert CliRunner().invoke(command, ['--version']).exit_code == 0\n"
        "print(sorted({'sklearn', 'torch', 'pandas', 'matplotlib', 'jinja2', 'fastapi'} & set(sys.modules)))\n"
    )
    result = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=120)
    assert result.stdout.strip() == "[]", result.stderr


def test_predict_to_csv_imports_only_what_it_needs(shipped_model):
    code = (
        "import sys; from click.testing import CliRunner; from shiftpred.cli import command\n"
        "result = CliRunner().invoke(command, ['predict', 'CCO', '--format', 'csv'])\n"
        "assert result.exit_code == 0, result.output\n"
        "heavy = {'sklearn', 'torch', 'pandas', 'scipy', 'matplotlib', 'jinja2', 'tqdm', 'fastapi', 'rdkit.Chem.Draw'}\n"
        "print(sorted(heavy & set(sys.modules)))\n"
    )
    result = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=120)
    assert result.stdout.strip() == "[]", result.stderr


@pytest.mark.skipif(sys.platform == "win32", reason="pipes of Unix")
def test_a_reader_that_stops_reading_is_no_error(shipped_model):
    many = "".join(f"CCCCCCCC m{i}\n" for i in range(600))
    process = subprocess.Popen(
        [sys.executable, "-m", "shiftpred.cli", "predict", "-", "--format", "csv"],
        stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.PIPE,
    )  # fmt: skip
    process.stdout.close()
    process.stdin.write(many.encode())
    process.stdin.close()
    err = process.stderr.read()
    assert process.wait(timeout=120) == 0 and err == b""


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="no device that is always full")
def test_a_full_disk_behind_standard_output_is_told_in_words(shipped_model):
    with open("/dev/full", "w") as full:
        result = subprocess.run(
            [sys.executable, "-m", "shiftpred.cli", "predict", "CCO"],
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            timeout=120,
        )
    assert result.returncode == 2 and "full disk" in result.stderr and result.stderr.count("\n") == 1


def test_pipes_get_utf_8_whatever_the_locale(shipped_model):
    environment = {**os.environ, "LC_ALL": "C", "PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0", "PYTHONIOENCODING": ""}
    result = subprocess.run(
        [sys.executable, "-m", "shiftpred.cli", "predict", "-", "--format", "csv"],
        input="CC δ-lactone\n".encode(), capture_output=True, env=environment, timeout=120,
    )  # fmt: skip
    assert result.returncode == 0, result.stderr
    result.stdout.decode("utf-8")
