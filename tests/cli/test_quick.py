"""The short way into `check` takes what the parser would take, and the same of it; the rest it leaves to the parser."""

from __future__ import annotations

import contextlib
import io
from typing import Any

import pytest
import typer

from kb.cli import checking, parsing, quick
from kb.cli.entry import hoist_globals, run
from kb.cli.root import app
from kb.cli.session import Session


@pytest.fixture
def asked(monkeypatch: pytest.MonkeyPatch) -> list[tuple[Any, ...]]:
    """What `answer_check` was asked, by whoever parsed the words."""
    calls: list[tuple[Any, ...]] = []

    def answer(session: Session, scheme: str, words: dict[str, Any], **rest: Any) -> int:
        given = dict.fromkeys(("top", "fail_on", "at_date", "acknowledge", "because")) | rest
        calls.append((session, scheme, {name: value for name, value in words.items() if value}, given))
        return 0

    monkeypatch.setattr(checking, "answer_check", answer)
    monkeypatch.setattr("kb.cli.check_command.answer_check", answer)
    return calls


def parts(argv: list[str]) -> tuple[list[str], list[str]]:
    whole = hoist_globals(argv)
    at = whole.index("check") if "check" in whole else len(whole)
    return whole[:at], whole[at:]


TAKEN = [
    "check CCBr",
    "check CCBr --with NaN3 --with KI=0.1 --base K2CO3=2 --acid HCl --add TBAI --solvent DMF:9 --solvent water:1",
    "check CCBr --temp=-78C --time=2h --conc=0.2M --scale=5mmol --atmosphere=N2",
    "check --temp -78C CCBr --json -q -v --book b.db --as AB",
    "--book=b.db check CCBr --top 0 --fail-on serious --at-date 2024-01-01",
    "check CCBr --top 200 --fail-on note",
]
LEFT = [
    "check", "check CCBr CCI", "check --help", "check CCBr --wit NaN3", "check CCBr --with", "check CCBr --temp",
    "check CCBr --temp 1C --temp 2C", "check CCBr --top 201", "check CCBr --top x", "check CCBr --top -1",
    "check CCBr --fail-on loud", "check CCBr --book", "check CCBr --book a --book b", "check CCBr -- --json",
    "check CCBr --with --solvent", "check CCBr --version", "find CCBr", "checks CCBr", "",
]  # fmt: skip


@pytest.mark.parametrize("line", TAKEN)
def test_what_is_taken_means_the_same_to_the_parser(line: str, asked: list[tuple[Any, ...]]) -> None:
    front, rest = parts(line.split())
    assert quick.run_quickly(front, rest) == 0
    assert parsing.run_parsed(front + rest) == 0
    short, long = asked
    assert short == long


@pytest.mark.parametrize("line", LEFT)
def test_what_is_unusual_is_left_to_the_parser(line: str, asked: list[tuple[Any, ...]]) -> None:
    assert quick.run_quickly(*parts(line.split())) is None
    assert asked == []


@pytest.mark.parametrize("words", [["check", ""], ["check", "CCBr", "--with", " "], ["check", "CCBr", "--book", ""]])
def test_an_empty_value_is_refused_as_ever(words: list[str]) -> None:
    assert quick.run_quickly(*parts(words)) is None
    err = io.StringIO()
    with contextlib.redirect_stderr(err):
        assert run(words) in (1, 2)
    assert err.getvalue().startswith("sidepath: ")


def test_the_options_are_those_of_the_parser() -> None:
    command: Any = typer.main.get_command(app)
    check = command.commands["check"]
    known = {max(p.opts, key=len) for p in check.params if p.param_type_name == "option"} - {"--help"}
    assert known == {*quick.MANY, *quick.ONE, *quick.OWN}
    repeatable = {max(p.opts, key=len) for p in check.params if p.multiple}
    assert repeatable == set(quick.MANY)
