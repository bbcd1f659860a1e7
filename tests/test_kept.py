"""What is kept between two runs is given back whole or not at all, and only to who made it of the same things."""

from __future__ import annotations

import os
import stat
from pathlib import Path

import pytest

from kb import kept, paths
from kb.assess.rulefile import _read_rules
from kb.materials.catalogue import _read_tables


@pytest.fixture(autouse=True)
def allowed(monkeypatch: pytest.MonkeyPatch) -> None:
    """Switch keeping on for the test."""
    monkeypatch.setattr(kept, "_allowed", True)


def kept_file(name: str) -> Path:
    return paths.kept_folder() / f"{name}.kept"


def test_a_value_comes_back_under_its_key_only() -> None:
    assert kept.recall("x", "one") is None
    assert kept.keep("x", "one", {"a": (1, 2)})
    assert kept.recall("x", "one") == {"a": (1, 2)}
    assert kept.recall("x", "on") is None
    assert kept.recall("x", "one ") is None


def test_nothing_is_kept_unless_it_was_allowed(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(kept, "_allowed", False)
    assert not kept.keep("x", "one", 1)
    assert kept.recall("x", "one") is None
    assert not paths.kept_folder().exists()


def test_what_another_version_made_is_not_taken(monkeypatch: pytest.MonkeyPatch) -> None:
    kept.keep("x", "one", 1)
    monkeypatch.setattr(kept, "made_by", lambda: "another program")
    assert kept.recall("x", "one") is None


def test_a_changed_file_of_the_program_is_another_version(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "data").mkdir()
    table = tmp_path / "data" / "table.toml"
    table.write_text("a = 1")
    monkeypatch.setattr(paths, "PACKAGE", tmp_path)
    before = kept.made_by.__wrapped__()
    assert kept.made_by.__wrapped__() == before
    table.write_text("a = 2")
    os.utime(table, ns=(1, 1))
    assert kept.made_by.__wrapped__() != before


@pytest.mark.parametrize("at", [0, 3, 17, 22, 40, -1])
def test_a_damaged_file_is_not_read(at: int) -> None:
    kept.keep("x", "one", list(range(1000)))
    content = bytearray(kept_file("x").read_bytes())
    content[at] ^= 0x55
    kept_file("x").write_bytes(content)
    assert kept.recall("x", "one") is None


def test_a_cut_off_file_is_not_read() -> None:
    kept.keep("x", "one", list(range(1000)))
    whole = kept_file("x").read_bytes()
    for length in (0, 1, 16, 20, 24, 30, len(whole) - 1):
        kept_file("x").write_bytes(whole[:length])
        assert kept.recall("x", "one") is None


def test_a_file_that_others_may_write_is_not_read() -> None:
    kept.keep("x", "one", 1)
    assert stat.S_IMODE(kept_file("x").stat().st_mode) == 0o600
    kept_file("x").chmod(0o666)
    assert kept.recall("x", "one") is None


def test_a_folder_that_cannot_be_made_is_no_trouble() -> None:
    paths.kept_folder().parent.mkdir(parents=True)
    paths.kept_folder().write_text("a file stands in the way")
    assert not kept.keep("x", "one", 1)
    assert kept.recall("x", "one") is None
    assert kept.once("x", lambda: 7) == 7


def test_what_is_too_large_is_not_kept(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(kept, "LARGEST_BYTES", 1000)
    assert not kept.keep("x", "one", bytes(2000))
    assert list(paths.kept_folder().glob("*")) == [] if paths.kept_folder().exists() else True


def test_a_table_is_made_once_and_comes_back_equal() -> None:
    made: list[int] = []

    def make() -> object:
        made.append(1)
        return _read_rules(), _read_tables()

    first, second = kept.once("tables", make), kept.once("tables", make)
    assert made == [1]
    assert first == second
    assert first is not second
