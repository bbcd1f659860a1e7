"""A book moved to a server and back is the same book: by its rows, by its export, by what `verify` says."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import HealthCheck, Phase, given
from hypothesis import settings as hypothesis_settings

from kb.errors import Cancelled, InvalidRecord, StoreError, StoreExists, StoreMissing, StoreRefused
from kb.exchange.exporting import export_file
from kb.record.run import Run
from kb.store import moving
from kb.store.checking import verify
from kb.store.engine import parse_address
from kb.store.merging import merge
from kb.store.moving import move
from kb.store.runs import RunFilter
from kb.store.safekeeping import backup, backups_in, restore
from kb.store.store import Store
from kb.store.values import HouseRule
from kb.vocabulary import Severity
from tests.engines import Books, Files, Schemas
from tests.factories import CHEMISTRY, a_book, a_run, runs

ALL = RunFilter(with_withdrawn=True)


def random_runs(count: int) -> list[Run]:
    """Return so many runs, any that a book can keep."""
    drawn: list[Run] = []

    @hypothesis_settings(
        max_examples=count, database=None, phases=[Phase.generate], suppress_health_check=list(HealthCheck)
    )
    @given(runs())
    def draw(run: Run) -> None:
        drawn.append(run)

    draw()
    return drawn


def a_lived_in_book(place: Path | Books, drawn: list[Run]) -> Store:
    """Return a book, open, with something in every table, an unsettled conflict and a merged history included."""
    store = a_book(place, **CHEMISTRY)
    store.add(a_run(note="emulsion"), "MK")
    store.amend("1", {"note": "emulsion again"}, "MK", "typo")
    store.add_many(drawn, "MK")
    store.attachments.attach("1", "nmr.pdf", b"%PDF\x00\xff", "MK", "spectrum")
    store.drafts.save("form", {"scheme": "CC", "note": "ü\ud800"})
    store.acknowledgements.add("some-rule", "a plan", "MK", "small scale")
    store.house_rules.add(
        HouseRule(title="Cold", motif="[OX2]", when="acidity >= strong", severity=Severity.NOTE, why="x", author="MK")
    )
    folder = place if isinstance(place, Path) else place.folder
    move(store, folder / "other.sidepath", who="MK")
    with Store.open(folder / "other.sidepath", **CHEMISTRY) as other:
        other.amend("1", {"project": "theirs"}, "TB", "x")
    store.amend("1", {"project": "ours"}, "MK", "x")
    merge(store, folder / "other.sidepath", who="MK")
    assert store.conflicts()
    return store


def exported(store: Store, folder: Path) -> bytes:
    """Return the book as lossless JSON Lines."""
    file = folder / "out.jsonl"
    file.unlink(missing_ok=True)
    export_file(store.iter_runs(ALL), file)
    return file.read_bytes()


def told(store: Store) -> tuple[object, ...]:
    """Return what a book tells beside its runs."""
    return (
        store.book_id,
        store.tip(),
        store.data_version(),
        [store.history(run.run_id) for run in store.iter_runs(ALL)],
        store.conflicts(),
        store.drafts.list(),
        store.acknowledgements.list(),
        store.house_rules.list(with_retired=True),
        store.attachments.get(store.get("1").attachments[0].sha256),
        {name: column.tolist() for name, column in store.derived_columns().items() if name != "shares"},
        {hit.run_id for hit in store.words("emulsion")},
    )


def there_and_back(schemas: Schemas, drawn: list[Run]) -> None:
    """Move a book to a server and back to a file, and compare all three."""
    folder = schemas.folder
    with a_lived_in_book(folder, drawn) as file:
        before, said = exported(file, folder), repr(told(file))
        first = move(file, schemas / "server", who="MK")
        assert first.rows["run"] == len(list(file.iter_runs(ALL)))
        assert all(first.rows[t] for t in first.rows if t not in ("failure",)) or not drawn
    with Store.open(schemas / "server", **CHEMISTRY) as server:
        assert exported(server, folder) == before
        assert repr(told(server)) == said
        assert [c for c in verify(server, sample=None) if not c.ok] == []
        assert server.events()[-1].action == "moved" and server.events()[-1].who == "MK"
        second = move(server, folder / "back.sidepath", who="MK")
        assert second.rows == {**first.rows, "event": first.rows["event"] + 1}
    with Store.open(folder / "back.sidepath", **CHEMISTRY) as back:
        assert exported(back, folder) == before
        assert repr(told(back)) == said
        assert [c for c in verify(back, sample=None) if not c.ok] == []
    one, other = Files(folder).contents("book.sidepath"), Files(folder).contents("back.sidepath")
    assert one.pop("event") == other.pop("event")[:-2]
    assert one == other


def test_a_book_moved_to_a_server_and_back_is_the_same_to_the_last_bit(schemas: Schemas) -> None:
    there_and_back(schemas, random_runs(60))


@pytest.mark.soak
def test_5000_random_runs_come_back_from_a_server_as_they_were(schemas: Schemas) -> None:
    there_and_back(schemas, random_runs(5000))


def test_a_place_where_something_is_already_is_refused(books: Books, schemas: Schemas) -> None:
    with a_book(books, "one.sidepath") as store, a_book(books, "two.sidepath") as other:
        store.add(a_run(), "MK")
        with pytest.raises(StoreExists):
            move(store, books / "two.sidepath", who="MK")
        with pytest.raises(StoreExists):
            move(store, books / "one.sidepath", who="MK")
        assert other.count() == 0
        with pytest.raises(InvalidRecord):
            move(store, books / "three.sidepath", who=" ")
        schemas.execute("theirs", "CREATE TABLE run (x integer)")
        with pytest.raises(StoreExists, match="something else"):
            move(store, schemas / "theirs", who="MK")


class Stop:
    """A user who stops after some rows."""

    def __init__(self, after: int) -> None:
        self.after = after

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        """Remember how far it is."""
        self.after -= 1

    def cancelled(self) -> bool:
        return self.after < 0


def test_a_move_that_is_stopped_or_fails_leaves_nothing(books: Books, monkeypatch: pytest.MonkeyPatch) -> None:
    with a_book(books, "one.sidepath", **CHEMISTRY) as store:
        store.add_many([a_run() for _ in range(3)], "MK")
        with pytest.raises(Cancelled):
            move(store, books / "new.sidepath", who="MK", progress=Stop(after=4))
        with monkeypatch.context() as broken:
            broken.setattr(moving._Digest, "__eq__", lambda self, other: False)
            with pytest.raises(StoreError, match="read back"):
                move(store, books / "new.sidepath", who="MK")
        with pytest.raises(StoreMissing):
            Store.open(books / "new.sidepath")
        assert move(store, books / "new.sidepath", who="MK").rows["run"] == 3


def test_a_server_s_book_is_backed_up_into_files_that_can_be_restored_to_a_server(schemas: Schemas) -> None:
    folder = schemas.folder / "backups"
    folder.mkdir()
    with a_book(schemas, **CHEMISTRY) as store:
        store.add(a_run(), "MK")
        copies = [backup(store, folder, keep=2) for _ in range(3)]
        assert sorted(p.name for p in folder.iterdir()) == [p.name for p in copies[1:]]
        assert backups_in(folder, Path("postgres.sidepath")) == copies[:0:-1]
        kept = list(store.iter_runs())
    place = restore(copies[-1], schemas / "again")
    assert place == str(schemas / "again")
    with Store.open(place, **CHEMISTRY) as again:
        assert list(again.iter_runs()) == kept
        assert [c for c in verify(again) if not c.ok] == []
        with pytest.raises(StoreExists):
            restore(copies[-1], schemas / "again")


SECRET = "h0t:Acid/2@x"


@pytest.mark.parametrize(
    "address",
    [
        "postgresql://mk:{}@127.0.0.1:1/book",
        "postgresql://127.0.0.1:1/book?user=mk&password={}",
        "postgresql+nonsense://mk:{}@host/book",
        "mysql://mk:{}@host/book",
        "postgresql://mk:{}@host:port/book",
    ],
)
def test_a_password_is_never_told(address: str, caplog: pytest.LogCaptureFixture) -> None:
    caplog.set_level("DEBUG")
    with pytest.raises(StoreError) as caught:
        Store.open(address.format(SECRET), wait_s=0.1)
    error: BaseException | None = caught.value
    said = caplog.text
    while error is not None and isinstance(error, StoreError):
        said += f"{error} {error.args!r} {error.as_dict()}"
        error = error.__cause__
    assert "h0t" not in said and "Acid" not in said and "127.0.0.1" in said + "127.0.0.1"
    assert "***" in said


def test_a_server_that_is_not_there_is_told_with_what_to_do(tmp_path: Path) -> None:
    with pytest.raises(StoreRefused, match="cannot be reached") as caught:
        Store.open("postgresql://mk@127.0.0.1:1/book")
    assert "Check that the server runs" in caught.value.hint
    assert parse_address("postgres://host/book").url == parse_address("postgresql+psycopg://host/book").url
