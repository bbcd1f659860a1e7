"""The demo book moved to PostgreSQL answers every question as the file does, to the letter."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from kb.store.moving import copy_all
from kb.store.store import Store
from tests.asking import Answer, ask
from tests.engines import Server

STEP = "CC(C)(C)OC1CCN(C(=O)OC(C)(C)C)C1>>CC(C)(C)OC1CCNC1"


@pytest.fixture(scope="module")
def moved(demo_book: Path, server: Server) -> Iterator[str]:
    """Return the address of the demo book on the server; only to be read."""
    schema = server.new_schema()
    with Store.open(demo_book, read_only=True) as store:
        copy_all(store, server.address(schema))
    yield server.address(schema)
    server.cut_off()
    server.forget([schema], {schema})


QUESTIONS = [
    ("runs", "--limit", "30", "--page", "3"),
    ("show", "R-0158"),
    ("history", "R-0158"),
    ("check", STEP, "--acid", "HCl=10", "--solvent", "dioxane", "--temp", "50C", "--time", "4 h"),
    ("find", "--words", "emulsion"),
    ("find", "--words", "emulsoin"),
    ("find", "--words", '"oiled out"'),
    ("find", "--words", '"out oiled"'),
    ("find", "--words", "K2CO3 dmf", "--limit", "7", "--page", "2"),
    ("find", "--substructure", "[CX4][Br]", "--role", "substrate", "--temp-from", "40C"),
    ("find", "--similar", "CC(C)CCBr", "--at-least", "0.3"),
    ("find", "--failed", "elimination", "--since", "2024-01-01"),
    ("find", "--solvent", "DMF", "--base", "K2CO3", "--verdict", "worked"),
    ("find", "--transformation", "[C:1][Br]>>[C:1]N=[N+]=[N-]"),
    ("audit", "recurring"),
    ("audit", "coverage"),
    ("rule", "list"),
    ("conflicts",),
]


def said(answer: Answer) -> object:
    """Return what a question gave, without how long it took."""
    found = answer.json
    if isinstance(found, dict):
        found.pop("elapsed_ms", None)
    return answer.status, found


@pytest.mark.parametrize("question", QUESTIONS, ids=" ".join)
def test_a_server_s_book_answers_as_the_file_does(demo_book: Path, moved: str, question: tuple[str, ...]) -> None:
    from_file = ask(*question, "--json", book=demo_book)
    assert from_file.status == 0
    assert said(ask(*question, "--json", book=moved)) == said(from_file)


def test_the_search_follows_what_another_process_writes(moved: str, demo_book: Path, server: Server) -> None:
    from kb.book import open_book
    from kb.search.criteria import Criteria

    schema = server.new_schema()
    with Store.open(demo_book, read_only=True) as store:
        copy_all(store, server.address(schema))
    address = server.address(schema)
    with open_book(address) as book:
        before = book.find(Criteria(words="quokka")).total
        written = subprocess.run(
            [sys.executable, "-m", "kb", "--book", address, "record", "CCBr>>CCO", "--note", "quokka", "--as", "MK"],
            capture_output=True,
            text=True,
            check=True,
        )
        assert "R-" in written.stdout
        assert (before, book.find(Criteria(words="quokka")).total) == (0, 1)


def test_a_file_and_a_server_import_the_same_runs_from_a_table(moved: str, tmp_path: Path, server: Server) -> None:
    schema = server.new_schema()
    table = tmp_path / "runs.csv"
    table.write_text("scheme,temp,note\nCCBr>>CCO,rt,ü first\nC1CC>>CC,rt,bad\nCCI>>CCO,333 K,second\n")
    places = (tmp_path / "file.sidepath", server.address(schema))
    outcomes = []
    for number, place in enumerate(places):
        assert ask("new", book=place).status == 0
        first = ask("import", str(table), "--as", "MK", "--json", book=place).json
        second = ask("import", str(table), "--as", "MK", "--json", book=place).json
        outcomes.append([{k: v for k, v in one.items() if isinstance(v, int)} for one in (first, second)])
        assert (first["stored"], first["rejected"], second["stored"], second["duplicate"]) == (2, 1, 0, 2), number
    assert outcomes[0] == outcomes[1]
