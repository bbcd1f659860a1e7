"""JSON Lines: what is refused, and that the published schema says exactly what is written and read."""

from __future__ import annotations

import datetime as dt
import json
import re
from pathlib import Path
from typing import Any
from uuid import UUID

import pytest
from hypothesis import given

from kb.book import runs_from_json
from kb.errors import InvalidRecord, SidepathError
from kb.exchange.json_schema import PUBLISHED, run_schema, schema_text
from kb.exchange.jsonlines import rejected_line, run_from_line, run_to_line
from kb.exchange.loading import load_file
from kb.record.run import Run
from tests.exchange.carried import KeptInMemory
from tests.factories import a_run, runs


@pytest.mark.parametrize(
    "line",
    [
        "",
        "[]",
        "1",
        "{",
        '{"scheme": "CC", "colour": 1}',
        '{"scheme": NaN}',
        '{"scheme": "CC", "outcome": {"ee_pct": Infinity}}',
        '{"scheme": "CC", "date": "tomorrow"}',
        '{"scheme": "CC\\u0000"}',
        '{"scheme": "CC", "note": "\\ud800"}',
        '{"scheme": "CC", "sidepath_run": 99}',
        "[" * 100_000,
        '{"a":' * 50_000,
        '{"scheme": "CC", "outcome": {"products": [{"fate": "purple"}]}}',
    ],
)
def test_a_line_that_is_no_run_is_refused_in_a_sentence(line: str) -> None:
    with pytest.raises(InvalidRecord) as refusal:
        run_from_line(line)
    assert len(str(refusal.value)) < 500


def test_a_line_is_one_line_of_plain_ascii() -> None:
    line = run_to_line(a_run(note="größer\nals\u2028nichts"))
    assert line.isascii()
    assert len(line.splitlines()) == 1


def test_a_run_without_an_id_gets_the_same_one_each_time() -> None:
    assert run_from_line('{"scheme": "CCBr"}').run_id == run_from_line('{ "scheme":"CCBr" }').run_id


def test_a_rejected_line_says_why_and_is_read_again_when_mended() -> None:
    line = rejected_line('{"scheme": "CCBr", "colour": 1}', 7, "no colour")
    assert json.loads(line)["sidepath_rejected"] == {"line": 7, "reason": "no colour"}
    assert run_from_line(line.replace(', "colour": 1', "")).scheme == "CCBr"
    wrapped = rejected_line('{"scheme": "CCBr"', 7, "broken")
    assert run_from_line(wrapped.replace('\\"CCBr\\"', '\\"CCBr\\"}')).scheme == "CCBr"


def test_the_published_schema_is_the_one_the_dataclasses_give() -> None:
    assert PUBLISHED.read_text(encoding="utf-8") == schema_text()


@given(run=runs())
def test_every_line_written_fits_the_schema(run: Run) -> None:
    assert misfits(json.loads(run_to_line(run)), run_schema()) == []


@given(run=runs())
def test_the_schema_refuses_what_the_reader_refuses(run: Run) -> None:
    data = json.loads(run_to_line(run))
    for spoil in (
        lambda d: d.pop("scheme"),
        lambda d: d.update(colour="red"),
        lambda d: d.update(verdict="purple"),
        lambda d: d["conditions"].update(conc_molar="much"),
        lambda d: d["outcome"].update(products=[{"share": 0.5}]),
        lambda d: d.update(date="17.5.2024"),
        lambda d: d.update(revision="1"),
    ):
        spoiled = json.loads(json.dumps(data))
        spoil(spoiled)
        assert misfits(spoiled, run_schema())
        with pytest.raises(InvalidRecord):
            run_from_line(json.dumps(spoiled))


def misfits(value: Any, schema: dict[str, Any], place: str = "run") -> list[str]:
    """Check a value against the part of JSON Schema that `run_schema` uses; an independent reading of draft 2020-12."""
    found: list[str] = []
    known = {"$schema", "title", "description", "type", "properties", "required", "additionalProperties", "items"}
    assert set(schema) <= known | {"anyOf", "enum", "const", "format", "pattern", "minimum"}, schema
    if "anyOf" in schema and all(misfits(value, option, place) for option in schema["anyOf"]):
        found.append(f"{place}: none of anyOf")
    types = {"object": dict, "array": list, "string": str, "boolean": bool, "null": type(None)}
    kind = schema.get("type")
    if kind in types and not isinstance(value, types[kind]):
        return [f"{place}: no {kind}"]
    if kind in ("number", "integer"):
        is_number = isinstance(value, int | float) and not isinstance(value, bool)
        if not is_number or (kind == "integer" and value != int(value)):
            return [f"{place}: no {kind}"]
        if value < schema.get("minimum", value):
            found.append(f"{place}: below minimum")
    if "const" in schema and value != schema["const"]:
        found.append(f"{place}: not {schema['const']}")
    if "enum" in schema and value not in schema["enum"]:
        found.append(f"{place}: not in enum")
    if "pattern" in schema and not re.search(schema["pattern"], value):
        found.append(f"{place}: pattern")
    if "format" in schema and not fits(value, schema["format"]):
        found.append(f"{place}: no {schema['format']}")
    if isinstance(value, dict) and "properties" in schema:
        found += [f"{place}.{k}: missing" for k in schema.get("required", ()) if k not in value]
        for key, inner in value.items():
            if key in schema["properties"]:
                found += misfits(inner, schema["properties"][key], f"{place}.{key}")
            elif schema.get("additionalProperties") is False:
                found.append(f"{place}.{key}: unknown")
    if isinstance(value, list) and "items" in schema:
        for n, item in enumerate(value):
            found += misfits(item, schema["items"], f"{place}[{n}]")
    return found


def fits(text: str, kind: str) -> bool:
    read = {"date": dt.date.fromisoformat, "date-time": dt.datetime.fromisoformat, "uuid": UUID}[kind]
    try:
        read(text)
    except ValueError:
        return False
    return True


@pytest.mark.parametrize(
    "changes",
    [
        {"scheme": "not a scheme"},
        {"date": "2999-01-01"},
        {"date": "1820-01-01"},
        {"outcome": {"failures": [{"mode": "exploded"}]}},
        {"outcome": {"failures": [{"mode": "elimination", "motif": "C(("}]}},
        {"conditions": {"temperature": {"text": "-400 C", "start_c": -400.0, "end_c": -400.0}}},
    ],
)
def test_an_import_keeps_to_the_rules_of_record_from(changes: dict[str, Any], tmp_path: Path) -> None:
    text = json.dumps({"scheme": "CCBr>>C=C", **changes})
    (tmp_path / "a.jsonl").write_text(text + "\n", encoding="utf-8")
    report = load_file(tmp_path / "a.jsonl", KeptInMemory(), who="AB")
    assert (report.stored, report.rejected) == (0, 1)
    with pytest.raises(SidepathError) as refusal:
        runs_from_json(text, "a.json")
    assert report.rejections[0].reason == str(refusal.value)
