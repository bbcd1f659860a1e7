"""Books in trouble: each gives one plain sentence, and the last good state stays."""

from __future__ import annotations

import ctypes
import os
import random
import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path

import pytest

from kb.errors import SidepathError, StoreBusy, StoreDamaged, StoreError, StoreExists, StoreMissing, StoreRefused
from kb.store import on_sqlite
from kb.store.checking import verify
from kb.store.runs import RunFilter
from kb.store.store import Store
from tests.engines import Books
from tests.factories import CHEMISTRY, a_book, a_run

ROOT = Path(__file__).resolve().parents[2]
ALL = RunFilter(with_withdrawn=True)


def test_a_new_book_never_overwrites(tmp_path: Path) -> None:
    a_book(tmp_path).close()
    before = (tmp_path / "book.sidepath").read_bytes()
    with pytest.raises(StoreExists):
        a_book(tmp_path)
    (tmp_path / "notes.txt").write_text("mine")
    with pytest.raises(StoreExists):
        a_book(tmp_path, "notes.txt")
    (tmp_path / "link").symlink_to(tmp_path / "nowhere")
    with pytest.raises(StoreExists):
        a_book(tmp_path, "link")
    assert (tmp_path / "book.sidepath").read_bytes() == before
    assert {p.name for p in tmp_path.iterdir()} == {"book.sidepath", "notes.txt", "link"}


def test_a_missing_folder_or_book_is_named(tmp_path: Path) -> None:
    with pytest.raises(StoreMissing, match="folder"):
        a_book(tmp_path / "nowhere")
    with pytest.raises(StoreMissing, match=r"gone\.sidepath"):
        Store.open(tmp_path / "gone.sidepath")
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    ("content", "reason"),
    [(b"", "is empty"), (b"date;scheme;yield\n", "no record book"), (b"SQLite format 3\x00" + b"\x00" * 3, "")],
)
def test_what_is_no_book_is_refused_and_left_alone(tmp_path: Path, content: bytes, reason: str) -> None:
    path = tmp_path / "other.file"
    path.write_bytes(content)
    for read_only in (False, True):
        with pytest.raises(StoreDamaged, match=reason or "book"):
            Store.open(path, read_only=read_only)
    assert path.read_bytes() == content


def test_another_program_s_database_is_refused_and_left_alone(tmp_path: Path) -> None:
    path = tmp_path / "other.sqlite"
    with closing(sqlite3.connect(path)) as raw, raw:
        raw.execute("CREATE TABLE run (x)")
    before = path.read_bytes()
    with pytest.raises(StoreDamaged, match="no record book"):
        Store.open(path)
    assert path.read_bytes() == before


def test_a_folder_is_refused(tmp_path: Path) -> None:
    with pytest.raises(StoreDamaged, match="folder"):
        Store.open(tmp_path)


@pytest.mark.parametrize("address", ["", "  ", "sqlite://", "sqlite:///:memory:", "nonsense://x", "a\x00b"])
def test_an_impossible_address_is_refused(address: str) -> None:
    with pytest.raises(StoreError):
        Store.open(address)


def test_a_url_and_a_path_name_the_same_book(tmp_path: Path) -> None:
    with a_book(tmp_path, "with space ü.sidepath") as store:
        store.add(a_run(), "MK")
    with Store.open(f"sqlite:///{tmp_path}/with space ü.sidepath") as store:
        assert store.count() == 1


def test_a_book_held_by_another_writer_is_busy_after_a_while(books: Books) -> None:
    told: list[float] = []
    with (
        a_book(books) as store,
        Store.open(books / "book.sidepath", wait_s=1.5, on_wait=told.append) as other,
        store.book.writing(),
    ):
        with pytest.raises(StoreBusy, match="somebody else"):
            other.add(a_run(), "MK")
        assert other.count() == 0  # reading goes on
    assert told and told[0] >= 1.0


def test_a_failed_write_leaves_nothing_and_the_store_usable(books: Books) -> None:
    with a_book(books) as store:
        store.add(a_run(), "MK")
        with pytest.raises(StoreError), store.book.writing() as connection:
            connection.exec_driver_sql("DELETE FROM history")
            connection.exec_driver_sql("INSERT INTO nowhere VALUES (1)")
        assert store.tip() == 1
        assert store.add(a_run(), "MK").code == "R-0002"
        assert all(c.ok for c in verify(store))


HARM = """
import sys
from tests.factories import CHEMISTRY, a_run
from kb.errors import StoreRefused
from kb.store.store import Store
"""


def in_a_process(code: str, *, drop_powers: bool = False) -> subprocess.CompletedProcess[str]:
    """Run Python code in a process of its own, without the super-user's right to write anywhere where asked."""

    def without_powers() -> None:
        libc = ctypes.CDLL(None)
        for capability in (1, 2):  # CAP_DAC_OVERRIDE, CAP_DAC_READ_SEARCH; 24 = PR_CAPBSET_DROP
            libc.prctl(24, capability, 0, 0, 0)

    return subprocess.run(
        [sys.executable, "-c", HARM + code],
        cwd=ROOT,
        env={**os.environ, "PYTHONPATH": str(ROOT), "PYTHONDONTWRITEBYTECODE": "1"},
        capture_output=True,
        text=True,
        timeout=120,
        preexec_fn=without_powers if drop_powers and os.geteuid() == 0 else None,
    )


@pytest.mark.skipif(sys.platform != "linux", reason="RLIMIT_FSIZE and capabilities as Linux has them")
def test_a_full_disk_is_told_and_loses_nothing(tmp_path: Path) -> None:
    """RLIMIT_FSIZE stands for the full disk: writing beyond it fails as it would there."""
    a_book(tmp_path, **CHEMISTRY).close()
    done = in_a_process(
        f"""
import resource
store = Store.open({str(tmp_path / "book.sidepath")!r}, **CHEMISTRY)
store.add(a_run(note="first"), "MK")
resource.setrlimit(resource.RLIMIT_FSIZE, (600_000, 600_000))
try:
    for n in range(1000):
        store.add(a_run(note=str(n) * 500), "MK")
        print("kept", n, flush=True)
except StoreRefused as error:
    print("refused:", error)
    print("reads on:", store.count())
"""
    )
    assert "refused:" in done.stdout, done.stderr
    assert "Make room" in done.stdout
    kept = done.stdout.count("kept")
    assert 0 < kept < 1000
    assert f"reads on: {kept + 1}" in done.stdout
    with Store.open(tmp_path / "book.sidepath", **CHEMISTRY) as store:
        assert store.count() == kept + 1
        assert [c for c in verify(store, sample=None) if not c.ok] == []
        store.add(a_run(), "MK")


@pytest.mark.skipif(sys.platform != "linux", reason="capabilities as Linux has them")
def test_a_folder_without_permission_is_told_and_still_read(tmp_path: Path) -> None:
    folder = tmp_path / "shared"
    folder.mkdir()
    with a_book(folder) as store:
        store.add(a_run(), "MK")
    book = folder / "book.sidepath"
    book.chmod(0o444)
    folder.chmod(0o555)
    try:
        done = in_a_process(
            f"""
for attempt in (
    lambda: Store.open({str(book)!r}).add(a_run(), "MK"),
    lambda: Store.create({str(folder / "new.sidepath")!r}),
):
    try:
        attempt()
        print("written")
    except StoreRefused as error:
        print("refused:", error)
with Store.open({str(book)!r}, read_only=True) as store:
    print("read", store.count(), store.get("1").code)
""",
            drop_powers=True,
        )
    finally:
        folder.chmod(0o755)
    assert done.stdout.count("refused:") == 2, done.stdout + done.stderr
    assert "read 1 R-0001" in done.stdout, done.stderr
    assert "Traceback" not in done.stderr


@pytest.mark.skipif(sys.platform != "linux", reason="capabilities as Linux has them")
def test_a_book_that_nobody_may_read_is_refused(tmp_path: Path) -> None:
    a_book(tmp_path).close()
    book = tmp_path / "book.sidepath"
    book.chmod(0o000)
    done = in_a_process(
        f"""
for read_only in (False, True):
    try:
        Store.open({str(book)!r}, read_only=read_only)
    except StoreRefused as error:
        print("refused:", error)
""",
        drop_powers=True,
    )
    assert done.stdout.count("refused:") == 2, done.stdout + done.stderr


@pytest.fixture(scope="module")
def sound(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """Give the bytes of a sound book of 15 runs."""
    folder = tmp_path_factory.mktemp("sound")
    with a_book(folder, **CHEMISTRY) as store:
        store.add_many([a_run(note=f"run {n}", scheme=f"{'C' * n}Br>>{'C' * n}O") for n in range(1, 16)], "MK")
    return (folder / "book.sidepath").read_bytes()


def use_all_of(book: Path) -> str:
    """Open a book and use every part of it; return what went wrong, "" = nothing. Only our errors may come out."""
    try:
        with Store.open(book, **CHEMISTRY) as store:
            for run in list(store.iter_runs(ALL)):
                store.history(run.run_id)
            store.derived_columns()
            list(store.structures())
            store.words("run")
            wrong = [c for c in verify(store, sample=None) if not c.ok]
            if wrong:
                return f"verify: {wrong[0].detail}"
            store.add(a_run(), "MK")
    except SidepathError as error:
        assert error.message and error.hint
        return str(error)
    return ""


def test_a_truncated_book_is_told_at_100_places(tmp_path: Path, sound: bytes) -> None:
    book = tmp_path / "book.sidepath"
    for place in sorted(random.Random(1).sample(range(len(sound)), 100)):
        book.write_bytes(sound[:place])
        for log in ("-wal", "-shm"):
            book.with_name(book.name + log).unlink(missing_ok=True)
        assert use_all_of(book), f"truncated to {place} bytes, and nobody noticed"


def test_a_flipped_bit_is_told_or_does_no_harm(tmp_path: Path, sound: bytes) -> None:
    flip_bits(tmp_path, sound, places=40)


@pytest.mark.soak
def test_a_flipped_bit_is_told_or_does_no_harm_at_1000_places(tmp_path: Path, sound: bytes) -> None:
    flip_bits(tmp_path, sound, places=1000)


def flip_bits(tmp_path: Path, sound: bytes, places: int) -> None:
    """Flip one bit at a time; one in a page's unused space harms nothing, then all must read as it was recorded."""
    good = tmp_path / "good.sidepath"
    good.write_bytes(sound)
    with Store.open(good) as store:
        runs = list(store.iter_runs(ALL))
    book = tmp_path / "book.sidepath"
    told = 0
    for place in sorted(random.Random(2).sample(range(len(sound)), places)):
        flipped = bytearray(sound)
        flipped[place] ^= 1 << (place % 8)
        book.write_bytes(flipped)
        for log in ("-wal", "-shm"):
            book.with_name(book.name + log).unlink(missing_ok=True)
        if use_all_of(book):
            told += 1
        else:
            with Store.open(book) as store:
                assert list(store.iter_runs(ALL))[: len(runs)] == runs, f"bit {place % 8} of byte {place}"
    assert told > places / 20


@pytest.mark.parametrize(
    ("mounts", "kind"),
    [
        ("/dev/sda1 / ext4 rw 0 0\nserver:/home {place} nfs4 rw 0 0\n", "nfs4"),
        ("/dev/sda1 / ext4 rw 0 0\n//server/share {parent} cifs rw 0 0\n", "cifs"),
        ("/dev/sda1 / ext4 rw 0 0\nserver:/x {place}x nfs rw 0 0\n", "ext4"),
        ("nonsense\n", None),
    ],
)
def test_the_file_system_is_told_from_the_mount_table(tmp_path: Path, mounts: str, kind: str | None) -> None:
    table = tmp_path / "mounts"
    table.write_text(mounts.format(place=tmp_path, parent=tmp_path.parent))
    assert on_sqlite.file_system_of(tmp_path / "book.sidepath", table) == kind


def test_a_network_file_system_is_refused_with_the_alternative(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    a_book(tmp_path).close()
    monkeypatch.setattr(on_sqlite, "file_system_of", lambda path, mounts: "nfs4")
    for attempt in (lambda: a_book(tmp_path, "new.sidepath"), lambda: Store.open(tmp_path / "book.sidepath")):
        with pytest.raises(StoreRefused, match="PostgreSQL"):
            attempt()
    with Store.open(tmp_path / "book.sidepath", read_only=True) as store:
        assert store.count() == 0
