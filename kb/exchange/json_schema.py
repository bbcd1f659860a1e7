"""The published JSON Schema of one run in JSON Lines, made from the dataclasses of the record.

It describes the portable form (`kb.record.portable`); nothing is written by hand that the dataclasses say, so the two
cannot drift apart. The schema is kept beside this file as `run.schema.json` for people and programs that do not have
Sidepath; a test compares it with what this file makes.

Source of the vocabulary: JSON Schema, draft 2020-12.
"""

from __future__ import annotations

import dataclasses
import datetime as dt
import json
import types
import typing
from enum import StrEnum
from pathlib import Path
from typing import Any
from uuid import UUID

from kb.exchange.jsonlines import REJECTED
from kb.record.portable import FORM
from kb.record.run import Run

PUBLISHED = Path(__file__).with_name("run.schema.json")


def run_schema() -> dict[str, Any]:
    """Return the schema of one line."""
    schema = _object(Run)
    properties = schema["properties"]
    schema["properties"] = {
        "sidepath_run": {"const": FORM, "description": "number of the form"},
        **properties,
        REJECTED: {"type": "object", "description": "reason why an import refused the line; passed over when read"},
    }
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "One run",
        "description": "One line of a JSON Lines export. Missing or null = not recorded; 0 = measured zero.",
        **schema,
    }


def schema_text() -> str:
    """Return the schema as it is published."""
    return json.dumps(run_schema(), indent=2, ensure_ascii=True) + "\n"


def _object(kind: type) -> dict[str, Any]:
    hints = typing.get_type_hints(kind)
    fields = dataclasses.fields(kind)
    needed = [f.name for f in fields if f.default is dataclasses.MISSING and f.default_factory is dataclasses.MISSING]
    return {
        "type": "object",
        "properties": {f.name: _value(hints[f.name], f.name, f.name in needed) for f in fields},
        "required": needed,
        "additionalProperties": False,
    }


def _value(hint: Any, name: str, is_needed: bool) -> dict[str, Any]:
    """Return the schema of one field; one that may be left out may be null too."""
    origin, inside = typing.get_origin(hint), typing.get_args(hint)
    if origin in (typing.Union, types.UnionType):
        kinds = [a for a in inside if a is not type(None)]
        return {"anyOf": [_value(kinds[0], name, True), {"type": "null"}]}
    schema = _plain(hint, name) if origin is not tuple else {"type": "array", "items": _value(inside[0], name, True)}
    return schema if is_needed else {"anyOf": [schema, {"type": "null"}]}


def _plain(hint: type, name: str) -> dict[str, Any]:
    if dataclasses.is_dataclass(hint):
        return _object(hint)
    if issubclass(hint, StrEnum):
        return {"type": "string", "enum": [str(word) for word in hint]}
    known: dict[type, dict[str, Any]] = {
        str: {"type": "string"},
        bool: {"type": "boolean"},
        int: {"type": "integer", "minimum": 0},
        float: {"type": "number"},
        dt.date: {"type": "string", "format": "date"},
        dt.datetime: {"type": "string", "format": "date-time"},
        UUID: {"type": "string", "format": "uuid"},
    }
    return {**known[hint], **({"pattern": r"\S"} if name in ("scheme", "name") else {})}
