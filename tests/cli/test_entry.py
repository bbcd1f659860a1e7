"""The program's door: options anywhere, plain errors, the contract's exit codes, nothing heavy at start-up."""

from __future__ import annotations

import json
import subprocess
import sys

import pytest

from kb.cli.entry import hoist_globals, run
from kb.cli.exit_codes import exit_code_of
from kb.errors import Cancelled, SettingsError, SidepathError, StoreBusy, StructureError


def test_importing_the_command_line_loads_nothing_heavy() -> None:
    code = (
        "import sys, kb.cli.entry, kb.cli.root;"
        "print(sorted({'rdkit', 'textual', 'sqlalchemy', 'numpy', 'alembic'} & set(sys.modules)))"
    )
    answer = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert answer.stdout.strip() == "[]"


@pytest.mark.parametrize(
    ("typed", "run_as"),
    [
        (["check", "CCBr", "--json"], ["--json", "check", "CCBr"]),
        (["show", "R-1", "--book", "a.db", "-v"], ["--book", "a.db", "-v", "show", "R-1"]),
        (["--book=a.db", "runs"], ["--book=a.db", "runs"]),
        (["record", "CCBr", "--note", "--json"], ["record", "CCBr", "--note", "--json"]),
        (["find", "--", "--json"], ["find", "--", "--json"]),
    ],
)
def test_global_options_stand_before_or_after_the_command(typed: list[str], run_as: list[str]) -> None:
    assert hoist_globals(typed) == run_as


@pytest.mark.parametrize(
    ("error", "code"),
    [
        (StructureError("x"), 1),
        (SettingsError("x"), 2),
        (StoreBusy("x"), 4),
        (Cancelled("x"), 130),
        (SidepathError("x"), 1),
    ],
)
def test_errors_end_with_the_status_of_the_contract(error: SidepathError, code: int) -> None:
    assert exit_code_of(error) == code


def test_a_typo_in_a_command_is_a_usage_error_in_one_sentence(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["chekc", "CCBr"]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert "chekc" in err and "Traceback" not in err


def test_with_json_the_error_is_an_object_on_stdout(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["--json", "show"]) == 2
    error = json.loads(capsys.readouterr().out)["error"]
    assert set(error) == {"code", "message", "hint"}


def test_help_says_what_each_command_does(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["--help"]) == 0
    said = capsys.readouterr().out
    for command in [
        "demo",
        "new",
        "read",
        "check",
        "record",
        "runs",
        "show",
        "history",
        "amend",
        "withdraw",
        "lookup",
        "find",
    ]:
        assert command in said
