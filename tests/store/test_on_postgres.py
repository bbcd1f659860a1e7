"""What only a server can do to a book: connections that break, other encodings, limits of its types, its own plans."""

from __future__ import annotations

import threading

import pytest
import sqlalchemy as sa

from kb.errors import StoreError, StoreRefused
from kb.store.checking import verify
from kb.store.moving import move
from kb.store.store import Store
from tests.engines import Schemas
from tests.factories import CHEMISTRY, a_book, a_run


def test_a_connection_that_broke_meanwhile_is_made_anew(schemas: Schemas) -> None:
    with a_book(schemas) as store:
        store.add(a_run(), "MK")
        schemas.server.cut_off()
        assert store.add(a_run(), "MK").code == "R-0002"
        schemas.server.cut_off()
        assert store.count() == 2


def test_a_connection_that_breaks_within_a_change_leaves_nothing_of_it(schemas: Schemas) -> None:
    with a_book(schemas) as store:
        store.add(a_run(), "MK")
        with pytest.raises(StoreError, match="cannot be reached") as caught, store.book.writing() as connection:
            connection.execute(sa.text("DELETE FROM solvent"))
            schemas.server.cut_off()
            connection.execute(sa.text("DELETE FROM component"))
        assert "look whether it is there" in caught.value.hint
        assert [c for c in verify(store) if not c.ok] == []


def test_a_server_that_only_reads_is_told(schemas: Schemas) -> None:
    """A standby answers any change with the same SQLSTATE (25006) as a transaction that was made read-only."""
    with a_book(schemas) as store, pytest.raises(StoreRefused, match="cannot be written now"):  # noqa: SIM117
        with store.book.writing() as connection:
            connection.exec_driver_sql("SET TRANSACTION READ ONLY")
            connection.exec_driver_sql("DELETE FROM solvent")


def test_a_database_that_cannot_hold_every_letter_is_refused(schemas: Schemas) -> None:
    schemas.server.admin.execute("CREATE DATABASE old ENCODING 'LATIN1' LOCALE 'C' TEMPLATE template0")
    try:
        with pytest.raises(StoreRefused, match="LATIN1") as caught:
            Store.create(f"postgresql://keeper@/old?host={schemas.server.folder}")
        assert "UTF8" in caught.value.hint
    finally:
        schemas.server.admin.execute("DROP DATABASE old WITH (FORCE)")


def test_a_role_or_database_that_is_not_there_is_told(schemas: Schemas) -> None:
    for user, database in (("nobody-here", "postgres"), ("keeper", "nowhere")):
        with pytest.raises(StoreError, match="does not exist"):
            Store.open(f"postgresql://{user}@/{database}?host={schemas.server.folder}")


def test_texts_beyond_what_the_word_index_takes_are_kept_and_found_by_their_beginning(schemas: Schemas) -> None:
    long_note = "emulsion " + " ".join(f"word{n}" for n in range(150_000))
    with a_book(schemas) as store:
        assert store.add(a_run(note=long_note), "MK").note == long_note
        store.add(a_run(note="x" * 5000 + " emulsion"), "MK")
        store.add(a_run(note="brine " * 20_000 + "emulsion"), "MK")
        assert {hit.code for hit in store.words("emulsion")} == {"R-0001", "R-0002", "R-0003"}
        assert [hit.code for hit in store.words("word1999")] == ["R-0001"]
        assert [hit.code for hit in store.words("x" * 4000)] == ["R-0002"]
        assert [hit.code for hit in store.words("azides dmf word7")] == ["R-0001"]
        assert [c for c in verify(store) if not c.ok] == []


def test_large_numbers_of_a_run_are_kept(schemas: Schemas) -> None:
    with a_book(schemas) as store:
        assert store.get(str(store.add(a_run(revision=2**40), "MK").code)).revision == 2**40


def test_words_are_searched_through_the_server_s_index(schemas: Schemas) -> None:
    with a_book(schemas) as store:
        store.add_many([a_run(note=f"note {n}") for n in range(30)], "MK")
        with store.book.reading() as connection:
            connection.exec_driver_sql("SET LOCAL enable_seqscan TO off")
            plan = connection.exec_driver_sql(
                "EXPLAIN SELECT run_key FROM run_words WHERE words @@ CAST('''note'':*ABC' AS tsquery)"
            ).scalars()
            assert "ix_run_words_words" in "\n".join(plan)


def test_two_books_in_one_database_do_not_wait_for_each_other(schemas: Schemas) -> None:
    with a_book(schemas, "one") as one, a_book(schemas, "two") as two, one.book.writing():
        impatient = Store.open(two.book.address.for_opening, wait_s=0.2)
        with impatient:
            assert impatient.add(a_run(), "MK").code == "R-0001"


def test_writers_wait_their_turn_and_then_go_on(schemas: Schemas) -> None:
    """The second writer begins while the first one holds the book, and must see what that one leaves."""
    with a_book(schemas) as first, Store.open(schemas / "book.sidepath", wait_s=60) as second:
        with first.book.writing():
            waiting = threading.Thread(target=second.add, args=(a_run(), "TB"))
            waiting.start()
            waiting.join(timeout=0.3)
            assert waiting.is_alive()
        waiting.join()
        assert first.add(a_run(), "MK").code == "R-0002"
        assert [c for c in verify(first) if not c.ok] == []


def test_a_book_opened_for_reading_can_be_moved_away(schemas: Schemas) -> None:
    with a_book(schemas, **CHEMISTRY) as store:
        store.add(a_run(), "MK")
    with Store.open(schemas / "book.sidepath", read_only=True) as store:
        assert move(store, schemas.folder / "away.sidepath", who="MK").rows["run"] == 1
