"""The user's settings, from four places, into one frozen value.

A flag wins over a `SIDEPATH_*` variable, that over the settings file (TOML, see `kb.paths.settings_file`), that over
the default. Unknown keys are refused with the nearest good name, since a setting that is silently ignored is a trap.
Only `kb.book` and the front ends read settings; everything below gets arguments. Nothing is read at import.

| key | variable | means |
|---|---|---|
| `book` | `SIDEPATH_BOOK` | path or URL of the record book |
| `as` | `SIDEPATH_AS` | initials of who is writing |
| `wait_s` | `SIDEPATH_WAIT_S` | how long to wait for another writer [s] |
| `backups_kept` | `SIDEPATH_BACKUPS_KEPT` | copies kept in a backup folder |
| `precedents` | `SIDEPATH_PRECEDENTS` | precedents listed in an assessment |
| `theme` | `SIDEPATH_THEME` | `auto`, `light` or `dark` |
"""

from __future__ import annotations

import difflib
import os
import tomllib
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from kb.errors import SettingsError

PREFIX = "SIDEPATH_"
THEMES = ("auto", "light", "dark", "high-contrast")


@dataclass(frozen=True, slots=True, kw_only=True)
class Settings:
    """What the user chose.

    Attributes:
        book: path or URL; None = the default place.
        initials: who is writing; None = not said. Its key is `as`, as the flag is.
        wait_s: how long to wait for another writer [s].
        backups_kept: copies kept in a backup folder.
        precedents: how many to list in an assessment.
        theme: colours of the terminal interface.
    """

    book: str | None = None
    initials: str | None = None
    wait_s: float = 30.0
    backups_kept: int = 10
    precedents: int = 5
    theme: str = "auto"


def load_settings(
    flags: Mapping[str, Any] | None = None,
    environment: Mapping[str, str] | None = None,
    file: Path | None = None,
) -> Settings:
    """Return the settings.

    Args:
        flags: key to value as given on the command line; None values were not given.
        environment: variables; None = those of the process.
        file: the settings file; None or not there = no file.

    Raises:
        SettingsError: an unknown key, an impossible value, or a file that is no TOML; names the place.
    """
    settings = Settings()
    if file is not None:
        settings = _apply(settings, _read(file), str(file))
    variables = os.environ if environment is None else environment
    named = {n.removeprefix(PREFIX).lower(): v for n, v in variables.items() if n.startswith(PREFIX) and v != ""}
    settings = _apply(settings, named, "the environment", shown=lambda key: f"{PREFIX}{key.upper()}")
    given = {key: value for key, value in (flags or {}).items() if value is not None}
    return _apply(settings, given, "the command line", shown=lambda key: f"--{key.replace('_', '-')}")


def _text(value: Any) -> str:
    if not isinstance(value, str) or not value.strip():
        raise ValueError("text")
    return value


def _seconds(value: Any) -> float:
    number = float(value)
    if isinstance(value, bool) or not 0 <= number <= 3600:
        raise ValueError("a number of seconds from 0 to 3600")
    return number


def _count(value: Any) -> int:
    number = int(str(value))
    if isinstance(value, bool) or not 1 <= number <= 1000:
        raise ValueError("a whole number from 1 to 1000")
    return number


def _theme(value: Any) -> str:
    if value not in THEMES:
        raise ValueError(f"one of {', '.join(THEMES)}")
    return str(value)


FIELDS: dict[str, tuple[str, Callable[[Any], Any], str]] = {
    "book": ("book", _text, "a path or a URL"),
    "as": ("initials", _text, "initials"),
    "wait_s": ("wait_s", _seconds, "a number of seconds from 0 to 3600"),
    "backups_kept": ("backups_kept", _count, "a whole number from 1 to 1000"),
    "precedents": ("precedents", _count, "a whole number from 1 to 1000"),
    "theme": ("theme", _theme, f"one of {', '.join(THEMES)}"),
}
"""Key to the field of Settings, its reader, and what it wants in words."""


def _read(file: Path) -> Mapping[str, Any]:
    try:
        return tomllib.loads(file.read_text(encoding="utf-8"))
    except FileNotFoundError:
        return {}
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise SettingsError(f"{file} is no settings file: {error}.", "Mend or remove it.", str(file)) from error
    except OSError as error:
        raise SettingsError(f"{file} cannot be read: {error.strerror}.", "Check its permissions.", str(file)) from error


def _apply(
    settings: Settings, values: Mapping[str, Any], place: str, shown: Callable[[str], str] = lambda key: key
) -> Settings:
    for key, value in values.items():
        if key not in FIELDS:
            near = difflib.get_close_matches(key, FIELDS, n=1)
            hint = f"Did you mean {shown(near[0])}?" if near else f"Settings: {', '.join(map(shown, FIELDS))}."
            raise SettingsError(f"There is no setting {ascii(shown(key))[1:-1][:60]} (in {place}).", hint, key)
        field, read, wanted = FIELDS[key]
        try:
            settings = replace(settings, **{field: read(value)})
        except (ValueError, TypeError, OverflowError) as error:
            raise SettingsError(
                f"{shown(key)} is {ascii(value)[:60]} (in {place}).", f"Give {wanted}.", value
            ) from error
    return settings
