"""Backups are whole and verified, rotate, never overwrite; restoring never loses the book that was there."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from kb.errors import Cancelled, StoreBusy, StoreDamaged, StoreExists, StoreMissing, StoreRefused
from kb.store import copying
from kb.store.checking import verify
from kb.store.engine import parse_address
from kb.store.safekeeping import backup, backups_in, replace_book, restore
from kb.store.store import Store
from tests.factories import CHEMISTRY, a_book, a_run


def names_in(folder: Path) -> set[str]:
    return {path.name for path in folder.iterdir()}


def test_a_backup_holds_everything_drafts_and_files_included(tmp_path: Path) -> None:
    with a_book(tmp_path, **CHEMISTRY) as store:
        for _ in range(3):
            store.add(a_run(), "MK")
        store.attachments.attach("1", "nmr.pdf", b"%PDF", "MK", "spectrum")
        store.drafts.save("form", {"scheme": "CC"})
        assert backup(store, tmp_path / "copy.sidepath") == tmp_path / "copy.sidepath"
        store.add(a_run(), "MK")  # the book goes on being used
        with Store.open(tmp_path / "copy.sidepath", **CHEMISTRY) as copy:
            assert list(copy.iter_runs()) == list(store.iter_runs())[:3]
            assert copy.drafts.list() == store.drafts.list()
            assert copy.attachments.get(copy.get("1").attachments[0].sha256) == b"%PDF"
            assert len(copy.derived_columns()["code"]) == 3
            assert copy.book_id == store.book_id


def test_a_backup_of_what_was_not_yet_folded_in_is_complete(tmp_path: Path) -> None:
    """The newest runs are in the write-ahead log only, where copying the file alone would lose them."""
    with a_book(tmp_path) as store:
        store.add(a_run(), "MK")
        assert (tmp_path / "book.sidepath-wal").stat().st_size > 0
        copy = backup(store, tmp_path / "copy.sidepath")
        assert not (tmp_path / "copy.sidepath-wal").exists()
        with Store.open(copy, read_only=True) as saved:
            assert saved.count() == 1


def test_backups_in_a_folder_rotate_and_leave_other_files_alone(tmp_path: Path) -> None:
    folder = tmp_path / "backups"
    folder.mkdir()
    (folder / "book-notes.sidepath").write_text("mine")
    with a_book(tmp_path) as store, a_book(tmp_path, "other.sidepath") as other:
        kept = backup(other, folder, keep=1)
        copies = [backup(store, folder, keep=3) for _ in range(5)]
    assert backups_in(folder, tmp_path / "book.sidepath") == copies[:1:-1]
    assert names_in(folder) == {"book-notes.sidepath", kept.name, *(c.name for c in copies[2:])}


def test_a_backup_never_overwrites_and_names_a_missing_folder(tmp_path: Path) -> None:
    (tmp_path / "mine").write_text("mine")
    with a_book(tmp_path) as store:
        with pytest.raises(StoreExists):
            backup(store, tmp_path / "mine")
        with pytest.raises(StoreMissing):
            backup(store, tmp_path / "nowhere" / "copy.sidepath")
        assert (tmp_path / "mine").read_text() == "mine"


def test_a_full_target_is_named_not_the_book(tmp_path: Path) -> None:
    resource = pytest.importorskip("resource")
    with a_book(tmp_path) as store:
        store.add_many([a_run(note="x" * 500) for _ in range(200)], "MK")
        before = resource.getrlimit(resource.RLIMIT_FSIZE)
        resource.setrlimit(resource.RLIMIT_FSIZE, (100_000, before[1]))
        try:
            with pytest.raises(StoreRefused, match=r"copy\.sidepath"):
                backup(store, tmp_path / "copy.sidepath")
        finally:
            resource.setrlimit(resource.RLIMIT_FSIZE, before)
        assert names_in(tmp_path) == {"book.sidepath", "book.sidepath-wal", "book.sidepath-shm"}
        assert store.count() == 200


def test_a_copy_that_does_not_verify_is_not_kept_and_older_ones_stay(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    folder = tmp_path / "backups"
    folder.mkdir()
    with a_book(tmp_path) as store:
        old = backup(store, folder, keep=1)
        monkeypatch.setattr(copying, "quick_trouble", lambda connection: "row 7 missing from index")
        with pytest.raises(StoreDamaged, match="row 7"):
            backup(store, folder, keep=1)
        assert names_in(folder) == {old.name}


def test_a_stopped_backup_leaves_nothing(tmp_path: Path) -> None:
    class Stop:
        def advance(self, done: int, total: int | None, note: str = "") -> None:
            """Take no note."""

        def cancelled(self) -> bool:
            return True

    with a_book(tmp_path) as store:
        before = names_in(tmp_path)
        with pytest.raises(Cancelled):
            backup(store, tmp_path / "copy.sidepath", progress=Stop())
        assert names_in(tmp_path) == before


def test_restoring_makes_a_new_book(tmp_path: Path) -> None:
    with a_book(tmp_path) as store:
        run = store.add(a_run(), "MK")
        copy = backup(store, tmp_path / "copy.sidepath")
    assert restore(copy, tmp_path / "again.sidepath") == str(tmp_path / "again.sidepath")
    with Store.open(tmp_path / "again.sidepath") as store:
        assert store.get("1") == run
        store.add(a_run(), "MK")
    with pytest.raises(StoreExists):
        restore(copy, tmp_path / "book.sidepath")
    with pytest.raises(StoreMissing):
        restore(tmp_path / "nowhere", tmp_path / "x.sidepath")


def test_a_broken_backup_is_not_restored(tmp_path: Path) -> None:
    with a_book(tmp_path) as store:
        store.add_many([a_run() for _ in range(50)], "MK")
        copy = backup(store, tmp_path / "copy.sidepath")
    whole = copy.read_bytes()
    copy.write_bytes(whole[: len(whole) // 2])
    for attempt in (restore, replace_book):
        target = tmp_path / ("x.sidepath" if attempt is restore else "book.sidepath")
        with pytest.raises(StoreDamaged):
            attempt(copy, target)
    with Store.open(tmp_path / "book.sidepath") as store:
        assert store.count() == 50
    assert names_in(tmp_path) == {"book.sidepath", "copy.sidepath"}


def test_replacing_keeps_the_old_book_aside(tmp_path: Path) -> None:
    book = tmp_path / "book.sidepath"
    with a_book(tmp_path) as store:
        store.add(a_run(note="before"), "MK")
        copy = backup(store, tmp_path / "copy.sidepath")
        store.add(a_run(note="after"), "MK")
    aside = replace_book(copy, book)
    with Store.open(book) as store:
        assert [run.note for run in store.iter_runs()] == ["before"]
    with Store.open(aside) as store:
        assert [run.note for run in store.iter_runs()] == ["before", "after"]


def test_a_book_that_is_open_is_not_replaced(tmp_path: Path) -> None:
    with a_book(tmp_path) as store:
        store.add(a_run(), "MK")
        copy = backup(store, tmp_path / "copy.sidepath")
        with pytest.raises(StoreBusy, match="in use"):
            replace_book(copy, tmp_path / "book.sidepath")
        assert store.add(a_run(), "MK").code == "R-0002"
    with pytest.raises(StoreMissing):
        replace_book(copy, tmp_path / "nowhere.sidepath")


def test_a_damaged_book_can_be_replaced(tmp_path: Path) -> None:
    book = tmp_path / "book.sidepath"
    with a_book(tmp_path) as store:
        store.add_many([a_run() for _ in range(50)], "MK")
        copy = backup(store, tmp_path / "copy.sidepath")
    book.write_bytes(b"\x00" * 4096)
    aside = replace_book(copy, book)
    assert aside.read_bytes() == b"\x00" * 4096
    with Store.open(book) as store:
        assert store.count() == 50
    assert parse_address(book).path == book


def test_the_log_of_a_book_that_was_deleted_is_not_played_into_its_successor(tmp_path: Path) -> None:
    """SQLite would play it into whatever takes the name: sqlite.org, How To Corrupt An SQLite Database File."""
    place = tmp_path / "group.sidepath"
    with Store.create(place) as first:
        first.add(a_run(note="of the first book"), "MK")
        log = place.with_name(f"{place.name}-wal")
        left = log.read_bytes()
    place.unlink()
    assert left
    log.write_bytes(left)
    with Store.create(place) as second:
        assert second.count() == 0
        assert all(check.ok for check in verify(second))
    kept = [p for p in tmp_path.iterdir() if "-wal.orphan" in p.name]
    assert [p.read_bytes() for p in kept] == [left]


def test_half_written_copies_of_a_killed_program_go_with_the_next_copy_and_nothing_else_does(tmp_path: Path) -> None:
    old = [f".book.sidepath.0123abcd.{kind}" for kind in ("copy", "copy-wal", "new", "new-journal", "restored")]
    kept = [
        ".book.sidepath.89abcdef.copy",  # somebody is writing it now
        ".book.sidepath.copy",
        "book.sidepath.0123abcd.copy",
        ".notes.txt.0123abcd.copy",
        ".book.sidepath.0123ABCD.copy",
    ]
    with a_book(tmp_path) as store:
        for name in (*old, *kept):
            (tmp_path / name).write_bytes(b"half")
            if name != kept[0]:
                os.utime(tmp_path / name, (1_000_000_000, 1_000_000_000))
        backup(store, tmp_path / "copy.sidepath")
    names = {path.name for path in tmp_path.iterdir()}
    assert not names & set(old)
    assert set(kept) <= names
