"""Mappings of headings to fields, saved by name beside the settings, so that a group's table is explained once.

It owns where they are kept and what a name may be: a name becomes part of a path, so only letters, digits, `-`, `_` and
`.` are taken. What a mapping says is `kb.exchange.headings`; a bad one is refused there when it is used.
"""

from __future__ import annotations

import difflib
import json
import re
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from kb import paths
from kb.errors import ImportFileError, SettingsError
from kb.plain import excerpt

if TYPE_CHECKING:
    from kb.exchange.headings import ColumnMapping

LARGEST_FILE = 1_000_000
"""Longest file that is read as a mapping [bytes]."""

DATE_ORDERS = ("dmy", "mdy")
_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]{0,59}")


def saved_mappings() -> tuple[str, ...]:
    """Return the names of the saved mappings, sorted."""
    folder = paths.mappings_folder()
    return tuple(sorted(p.stem for p in folder.glob("*.json"))) if folder.is_dir() else ()


def load_mapping(name_or_file: str) -> dict[str, Any]:
    """Return a mapping by its name, or by the name of a file that ends in .json.

    Raises:
        ImportFileError: no such mapping or file, or no JSON object.
    """
    path = Path(name_or_file) if name_or_file.casefold().endswith(".json") else _path_of(name_or_file)
    if not path.is_file() and path.parent == paths.mappings_folder():
        names = saved_mappings()
        near = difflib.get_close_matches(name_or_file, names, n=1)
        known = f"Saved: {', '.join(names[:20])}." if names else "Save one with --save-mapping."
        raise ImportFileError(
            f"No mapping is saved as {excerpt(name_or_file, 40)!r}.",
            f"Did you mean {near[0]}?" if near else known,
            name_or_file,
        )
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise ImportFileError(f"{path} is too large for a mapping.", "Name the mapping, not the table.", str(path))
        data = json.loads(path.read_text(encoding="utf-8-sig"))
    except (ValueError, RecursionError) as error:
        raise ImportFileError(
            f"{path} is no JSON: {type(error).__name__}.",
            'Write it like {"columns": {"T [K]": "temperature"}}.',
            str(path),
        ) from error
    if not isinstance(data, dict):
        raise ImportFileError(
            f"{path} holds no mapping.", 'Write it like {"columns": {"T [K]": "temperature"}}.', str(path)
        )
    return data


def save_mapping(name: str, mapping: ColumnMapping) -> Path:
    """Save what columns were taken for; one that has that name is replaced.

    Raises:
        SettingsError: no name that can be kept.
    """
    path = _path_of(name)
    path.parent.mkdir(parents=True, exist_ok=True)
    half = path.with_suffix(".part")
    half.write_text(json.dumps(mapping.as_dict(), indent=1, ensure_ascii=False) + "\n", encoding="utf-8")
    half.replace(path)
    return path


def with_date_order(mapping: Mapping[str, Any] | None, order: str | None) -> dict[str, Any] | None:
    """Return a mapping that reads dates with slashes in that order, None = as the mapping says."""
    if order is None:
        return dict(mapping) if mapping is not None else None
    given = dict(mapping or {})
    columns = given.get("columns", {k: v for k, v in given.items() if k != "date_order"})
    return {"columns": columns, "date_order": order}


def headings_of(path: Path, mapping: Mapping[str, Any] | None = None, sheet: str | None = None) -> ColumnMapping | None:
    """Return what the columns of a table would be taken for; None for formats without columns.

    Raises:
        ImportFileError: as an import.
    """
    from kb.exchange.sources import format_of, open_source

    if format_of(path) not in ("csv", "xlsx"):
        return None
    return open_source(path, mapping=mapping, sheet=sheet).mapping


def write_template(path: Path) -> str:
    """Write an empty table (.csv, .xlsx), or the JSON Schema of a run (.json); return what it is in a few words.

    Raises:
        ImportFileError: another ending, something is there already, or it cannot be written.
    """
    if path.exists():
        raise ImportFileError(f"{path} is there already.", "Name a new file.", str(path))
    if path.suffix.casefold() != ".json":
        from kb.exchange.tables_out import write_template as write_table

        write_table(path)
        return "an empty table with its headings and an example"
    from kb.exchange.json_schema import schema_text

    try:
        path.write_text(schema_text(), encoding="utf-8")
    except OSError as error:
        raise ImportFileError(
            f"{path} cannot be written: {error.strerror}.", "Name another place.", str(path)
        ) from error
    return "the JSON Schema of one run, one line of a JSON Lines file"


def _path_of(name: str) -> Path:
    if not _NAME.fullmatch(name):
        raise SettingsError(
            f"{excerpt(name, 40)!r} is no name for a mapping.", "Use up to 60 letters, digits, '-', '_' and '.'.", name
        )
    return paths.mappings_folder() / f"{name}.json"
