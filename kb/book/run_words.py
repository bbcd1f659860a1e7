"""Whole runs from JSON text: one object, a list, or JSON Lines, each as `show --json` prints it.

It owns what a person may hand in by `record --from`: the portable form (`kb.record.portable`) under the rules of entry
(`kb.exchange.entry_rules`), which a JSON Lines import keeps to as well. All runs are read before any is given back, so
that a bad one stops the lot before anything is stored.
"""

from __future__ import annotations

import json
from typing import Any

from kb.book.words import today
from kb.errors import ImportFileError, InvalidRecord, SidepathError
from kb.exchange.entry_rules import check_entry
from kb.logs import tame_rdkit
from kb.record.portable import run_from_dict
from kb.record.run import Run

LARGEST_FILE = 50_000_000
"""Longest text that is read [characters]; whole tables are for `sidepath import`."""
_HINT = "Give runs as `sidepath show CODE --json` prints them."


def runs_from_json(text: str, place: str) -> list[Run]:
    """Return the runs of a JSON text.

    Args:
        text: one object, one list of objects, or one object a line.
        place: where the text came from, for messages.

    Raises:
        ImportFileError: no JSON, or too long. InvalidRecord: no run, or a run that cannot be taken; says which.
    """
    if len(text) > LARGEST_FILE:
        raise ImportFileError(f"{place} is longer than 50 MB.", "Use `sidepath import` for many runs.", place)
    entries = _entries(text, place)
    tame_rdkit()
    if not entries:
        raise InvalidRecord(f"{place} holds no run.", _HINT, place)
    if len(entries) == 1:
        return [_run(entries[0])]
    runs = []
    for number, entry in enumerate(entries, start=1):
        try:
            runs.append(_run(entry))
        except SidepathError as error:
            message = f"Run {number} of {len(entries)}: {error.message}"
            raise type(error)(message, error.hint, error.value) from error
    return runs


def _entries(text: str, place: str) -> list[Any]:
    try:
        data = _loads(text)
        return data if isinstance(data, list) else [data]
    except json.JSONDecodeError as error:
        whole_error = error
    except InvalidRecord:
        raise
    except (ValueError, RecursionError) as error:
        raise _no_json(place, "a value in it is too large or too deep") from error
    lines = [line for line in text.splitlines() if line.strip()]
    if len(lines) < 2:
        raise _no_json(place, _where(whole_error)) from whole_error
    entries = []
    for number, line in enumerate(lines, start=1):
        try:
            entries.append(_loads(line))
        except json.JSONDecodeError as error:
            if number == 1:  # not one object a line either: tell of the text as a whole
                raise _no_json(place, _where(whole_error)) from whole_error
            raise _no_json(place, f"line {number}, {_where(error)}") from error
        except InvalidRecord:
            raise
        except (ValueError, RecursionError) as error:
            raise _no_json(place, f"line {number}, a value in it is too large or too deep") from error
    return entries


def _loads(text: str) -> Any:
    return json.loads(text, object_pairs_hook=_without_doubles, parse_constant=_no_constant)


def _without_doubles(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) != len(pairs):
        keys = [key for key, _ in pairs]
        double = next(key for key in keys if keys.count(key) > 1)
        raise InvalidRecord(f"The key {ascii(double)[:60]} stands twice in one object.", "Keep one of them.", double)
    return found


def _no_constant(word: str) -> None:
    raise InvalidRecord(f"{word} is no number.", "Write null where nothing was recorded.", word)


def _no_json(place: str, why: str) -> ImportFileError:
    return ImportFileError(f"{place} is no JSON: {why}.", _HINT, place)


def _where(error: json.JSONDecodeError) -> str:
    return f"{error.msg[:1].lower()}{error.msg[1:]} at character {error.pos + 1:,}"


def _run(entry: Any) -> Run:
    return check_entry(run_from_dict(entry), today())
