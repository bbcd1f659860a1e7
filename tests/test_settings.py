"""A flag wins over a variable, that over the file, that over the default; what is unknown is refused."""

from __future__ import annotations

from pathlib import Path

import pytest

from kb.errors import SettingsError
from kb.settings import FIELDS, Settings, load_settings


def written(tmp_path: Path, text: str) -> Path:
    file = tmp_path / "settings.toml"
    file.write_text(text, encoding="utf-8")
    return file


def test_nothing_said_gives_the_defaults(tmp_path: Path) -> None:
    assert load_settings() == Settings()
    assert load_settings(file=tmp_path / "none.toml") == Settings()
    assert load_settings(flags={"book": None}, environment={"SIDEPATH_BOOK": ""}) == Settings()


def test_the_nearer_place_wins(tmp_path: Path) -> None:
    file = written(tmp_path, 'book = "file"\nas = "AA"\nwait_s = 5\ntheme = "dark"\n')
    environment = {"SIDEPATH_BOOK": "variable", "SIDEPATH_AS": "BB", "PATH": "x", "_SIDEPATH_COMPLETE": "x"}
    settings = load_settings(flags={"book": "flag", "as": None}, environment=environment, file=file)
    assert settings == Settings(book="flag", initials="BB", wait_s=5.0, theme="dark")


def test_variables_are_read_as_their_kind() -> None:
    settings = load_settings(
        environment={"SIDEPATH_WAIT_S": "2.5", "SIDEPATH_PRECEDENTS": "7", "SIDEPATH_BACKUPS_KEPT": "3"}
    )
    assert (settings.wait_s, settings.precedents, settings.backups_kept) == (2.5, 7, 3)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("bok = 'x'", "Did you mean book?"),
        ("qqqqqqq = 1", "Settings: book, as"),
        ("wait_s = 'soon'", "wait_s is 'soon'"),
        ("wait_s = -1", "a number of seconds"),
        ("wait_s = nan", "a number of seconds"),
        ("wait_s = true", "a number of seconds"),
        ("precedents = 0", "a whole number"),
        ("precedents = 2.5", "a whole number"),
        ("theme = 'pink'", "one of auto, light, dark"),
        ("book = 7", "a path or a URL"),
        ("as = ' '", "initials"),
        ("book = ", "no settings file"),
    ],
)
def test_what_cannot_be_is_refused_with_the_place(tmp_path: Path, text: str, said: str) -> None:
    with pytest.raises(SettingsError) as caught:
        load_settings(file=written(tmp_path, text))
    assert said in str(caught.value)
    assert "settings.toml" in str(caught.value)


def test_a_misspelt_variable_is_refused_with_the_nearest() -> None:
    with pytest.raises(SettingsError, match="SIDEPATH_BOOK"):
        load_settings(environment={"SIDEPATH_BOOOK": "x"})


def test_a_file_that_is_no_text_is_refused(tmp_path: Path) -> None:
    file = tmp_path / "settings.toml"
    file.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(SettingsError):
        load_settings(file=file)
    with pytest.raises(SettingsError):
        load_settings(file=tmp_path)


def test_every_setting_has_a_field_and_is_in_the_table() -> None:
    import kb.settings

    assert {field for field, _, _ in FIELDS.values()} == set(Settings.__dataclass_fields__)
    assert all(f"| `{key}` | `SIDEPATH_{key.upper()}` |" in (kb.settings.__doc__ or "") for key in FIELDS)
