"""What the pages say is there, and what is there is said: commands, options, settings, errors, modes, rule ids."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
import typer

from kb import errors, settings
from kb.cli import exit_codes
from kb.cli.root import app
from kb.record.failure_modes import failure_modes
from tests.asking import ask
from tests.docs import rule_ids

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


def commands(group: Any = None, before: str = "") -> Iterator[tuple[str, Any]]:
    """Yield every command with its full name ("rule add")."""
    group = typer.main.get_command(app) if group is None else group
    for name, command in group.commands.items():
        if hasattr(command, "commands"):
            yield from commands(command, f"{before}{name} ")
        else:
            yield f"{before}{name}", command


COMMANDS = dict(commands())


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_is_a_row_of_the_readme(name: str) -> None:
    assert re.search(rf"^\| `{name}[ `]", README, re.MULTILINE), f"README.md has no row for `{name}`"


def test_every_row_of_the_readme_is_a_command() -> None:
    table = README.split("| command | does |")[1].split("\n\n")[0]
    for row in re.findall(r"^\| `([^`]+)`", table, re.MULTILINE):
        words = [word for word in row.split() if word == word.lower() and "=" not in word]
        assert " ".join(words) in COMMANDS, row


@pytest.mark.parametrize("name", ["check", "record", "find", "split", "import", "read", "runs", "rule add", "lookup"])
def test_every_option_of_these_commands_is_in_the_readme(name: str) -> None:
    for parameter in COMMANDS[name].params:
        for option in parameter.opts:
            if option.startswith("--") and option not in ("--help", "--from"):
                assert f"`{option}" in README or f"{option} " in README, f"{name} {option}"
    assert name != "record" or "--from FILE.json" in README


def test_every_command_says_in_one_line_what_it_does() -> None:
    for name, command in COMMANDS.items():
        said = command.get_short_help_str(limit=200)
        assert said and "..." not in said, name
        answer = ask(*name.split(), "--help")
        assert answer.status == 0
        assert max(map(len, answer.out.splitlines())) <= 80, name


def test_every_exit_status_is_in_the_readme() -> None:
    statuses = {v for k, v in vars(exit_codes).items() if k.isupper()}
    table = README.split("| status | means |")[1].split("\n\n")[0]
    assert {int(n) for n in re.findall(r"^\| (\d+) \|", table, re.MULTILINE)} == statuses


def test_every_setting_is_in_the_readme_with_its_variable_and_default() -> None:
    rows = {m[1]: m[0] for m in re.finditer(r"^\| `(\w+)` \| `SIDEPATH_\w+` \|.*$", README, re.MULTILINE)}
    assert set(rows) == set(settings.FIELDS)
    plain = settings.Settings()
    for key, (field, _, _) in settings.FIELDS.items():
        assert f"`{settings.PREFIX}{key.upper()}`" in rows[key]
        default = getattr(plain, field)
        if default is not None:
            shown = f"{default:g}" if isinstance(default, float) else str(default)
            assert rows[key].rstrip(" |").rstrip("`").endswith(shown), key


def test_the_python_of_the_readme_runs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    code = README.split("```python")[1].split("```")[0]
    monkeypatch.chdir(tmp_path)
    assert ask("new", book="group.sidepath").status == 0
    exec(compile(code, "README.md", "exec"), {})


def test_the_readme_names_the_methods_of_a_book() -> None:
    from kb.book.facade import Book

    said = re.search(r"A book has `([^`]+)`", README)
    assert said is not None
    for method in said[1].split():
        assert callable(getattr(Book, method))


def _classes(base: type[errors.SidepathError]) -> Iterator[type[errors.SidepathError]]:
    yield base
    for child in base.__subclasses__():
        if child.__module__ == errors.__name__:
            yield from _classes(child)


@pytest.mark.parametrize("error", list(_classes(errors.SidepathError)), ids=lambda e: e.__name__)
def test_every_error_class_is_in_developers_with_its_code_and_status(error: type[errors.SidepathError]) -> None:
    status = exit_codes.exit_code_of(error("x"))
    assert f"| `{error.__name__}` | `{error.code}` | {status} |" in DEVELOPERS
    assert error.__doc__


def test_every_failure_mode_is_in_developers() -> None:
    section = DEVELOPERS.split("## Failure modes")[1].split("##")[0]
    assert set(re.findall(r"`([a-z-]+)`", section)) == {m.word for m in failure_modes()}


def test_every_rule_id_is_in_developers() -> None:
    written = DEVELOPERS.split(rule_ids.BEGIN)[1].split(rule_ids.END)[0]
    assert written.strip() == rule_ids.appendix().strip(), "run: python tests/docs/rule_ids.py"


def test_the_cautions_worked_out_are_those_of_the_code() -> None:
    code = (ROOT / "kb" / "assess" / "caution_checks.py").read_text(encoding="utf-8")
    named = set(re.findall(r'rule_id=f?"(hazard-[a-z-]+)', code))
    assert {n.rstrip("-") for n in named} == {re.sub(r"-[ab]$", "", i) for i in rule_ids.WORKED}


def test_every_data_finding_has_an_id_that_says_so() -> None:
    for folder in ("assess", "book"):
        for path in (ROOT / "kb" / folder).glob("*.py"):
            for rule_id in re.findall(r'"(data:[^"]+)"', path.read_text(encoding="utf-8")):
                assert re.fullmatch(r"data:[a-z0-9-]+", rule_id)
