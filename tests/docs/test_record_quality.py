"""The table of record quality names principles, mechanisms and tests; each test that it names is there."""

from __future__ import annotations

import ast
import re
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
SECTION = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8").split("## Record quality")[1].split("\n## ")[0]
ROWS = [line for line in SECTION.splitlines() if line.startswith("| ") and "`tests/" in line]
PRINCIPLES = (
    "attributable", "legible", "contemporaneous", "original", "accurate", "complete", "consistent", "enduring",
    "available",
)  # fmt: skip
NAMED = sorted(set(re.findall(r"`(tests/[^`]+?)::([a-z_0-9]+)`", SECTION)))


def test_every_principle_has_its_row_with_a_mechanism_and_a_test() -> None:
    assert tuple(row.split("|")[1].strip() for row in ROWS) == PRINCIPLES
    for row in ROWS:
        _, _, mechanism, tests, _ = row.split("|")
        assert len(mechanism) > 40 and "::test_" in tests, row


@pytest.mark.parametrize(("file", "name"), NAMED)
def test_every_test_that_it_names_is_there(file: str, name: str) -> None:
    tree = ast.parse((ROOT / file).read_text(encoding="utf-8"))
    functions = {n.name for n in ast.walk(tree) if isinstance(n, ast.FunctionDef | ast.AsyncFunctionDef)}
    assert name in functions


def test_what_a_table_carries_is_told_field_by_field() -> None:
    from kb.exchange.row_out import FIELDS_OUT

    told = SECTION.split("### What a file carries")[1].casefold()
    other_words = {"by": "person", "date": "day", "reagents": "materials", "bases": "role", "acids": "role"}
    other_words |= {"additives": "role", "workup": "work-up", "failed": "failure modes", "withdrawn": "withdrawal"}
    other_words |= {"isolated yield": "yields", "assay yield": "yields"}
    for field in FIELDS_OUT:
        bare = field.removesuffix(" / %")
        assert other_words.get(bare, bare) in told, field
