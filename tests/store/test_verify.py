"""Whatever is changed behind the program's back is noticed, by the check that is meant to notice it."""

from __future__ import annotations

from pathlib import Path

import pytest

from kb.store.checking import verify
from kb.store.store import Store
from tests.engines import Books, Schemas
from tests.factories import CHEMISTRY, a_book, a_run


@pytest.fixture
def book(books: Books) -> Path | str:
    """Give a book with amended, withdrawn and attached things in it."""
    with a_book(books, **CHEMISTRY) as store:
        for n in range(6):
            store.add(a_run(note=f"run {n}", scheme=f"{'C' * n}CBr>>{'C' * n}CO"), "MK")
        store.amend("1", {"note": "again"}, "MK", "typo")
        store.withdraw("2", "wrong flask", "MK")
        store.attachments.attach("3", "nmr.pdf", b"%PDF", "MK", "spectrum")
    return books / "book.sidepath"


def failed(book: Path | str, **options: object) -> set[str]:
    with Store.open(book, **CHEMISTRY) as store:
        checks = verify(store, **options)  # type: ignore[arg-type]
    assert [c.name for c in checks] == [
        *("file", "foreign keys", "history", "record", "codes", "words", "facts", "structures", "attachments")
    ]
    assert all(c.detail.endswith(".") for c in checks)
    return {c.name for c in checks if not c.ok}


def test_a_sound_book_passes(book: Path | str) -> None:
    assert failed(book) == set()
    assert failed(book, sample=None) == set()


def test_a_book_opened_for_reading_can_be_verified(book: Path | str) -> None:
    with Store.open(book, read_only=True) as store:
        assert all(c.ok for c in verify(store))


SAID_TO_POSTGRESQL = {
    "UPDATE run SET has_conflict = 1 WHERE run_key = 4": "UPDATE run SET has_conflict = true WHERE run_key = 4",
    "UPDATE structure SET morgan = x'00' WHERE structure_id = 2": (
        r"UPDATE structure SET morgan = '\x00' WHERE structure_id = 2"
    ),
    "UPDATE attachment_blob SET content = x'00'": r"UPDATE attachment_blob SET content = '\x00'",
    "INSERT INTO run_words(run_words) VALUES ('delete-all')": "DELETE FROM run_words",
    "INSERT INTO component VALUES (99, 0, 'base', 'x', NULL, 1, 1, 1, 1, 1, 1)": "",
}
"""The same harm in the other engine's words; "" = it does not let one."""


@pytest.mark.parametrize(
    ("harm", "noticed"),
    [
        ("UPDATE history SET who = 'XX' WHERE seq = 2", {"history"}),
        ("UPDATE history SET at = '2020-01-01 00:00:00.000000' WHERE seq = 2", {"history"}),
        ("UPDATE history SET why = 'other reason' WHERE action = 'withdraw'", {"history"}),
        ("UPDATE history SET after = replace(after, 'run 3', 'run 9') WHERE seq = 4", {"history", "record"}),
        ("UPDATE history SET changed = replace(changed, 'again', 'never')", {"history", "record"}),
        ("DELETE FROM history WHERE seq = 4", {"history", "record"}),
        ("DELETE FROM history WHERE seq = (SELECT max(seq) FROM history)", {"history", "record"}),
        ("UPDATE history SET chain = 'x' WHERE seq = 4", {"history"}),
        ("UPDATE history SET parents = '' WHERE action = 'amend'", {"history"}),
        ("UPDATE history SET after = 'no json' WHERE seq = 4", {"history", "record"}),
        ("UPDATE meta SET value = '4:x' WHERE name = 'history_tip'", {"history"}),
        ("UPDATE run SET isolated_yield_pct = 99 WHERE run_key = 4", {"record"}),
        ("UPDATE run SET withdrawn_why = NULL WHERE run_key = 2", {"record"}),
        ("UPDATE run SET revision = 7 WHERE run_key = 4", {"record"}),
        ("UPDATE run SET has_conflict = 1 WHERE run_key = 4", {"record"}),
        ("UPDATE run SET verdict = 'superb' WHERE run_key = 4", {"record", "facts"}),
        ("UPDATE run SET conc_molar = -1 WHERE run_key = 4", {"record", "facts"}),
        ("DELETE FROM solvent WHERE run_key = 4", {"record", "words"}),
        ("UPDATE component SET equiv = 9 WHERE run_key = 4", {"record"}),
        ("UPDATE product_seen SET share = 0.5 WHERE run_key = 4 AND position = 0", {"record"}),
        ("UPDATE run SET code = 'R-0999' WHERE run_key = 4", {"codes"}),
        ("UPDATE run SET code_number = 9 WHERE run_key = 4", {"codes"}),
        ("INSERT INTO component VALUES (99, 0, 'base', 'x', NULL, 1, 1, 1, 1, 1, 1)", {"foreign keys"}),
        ("UPDATE facts SET carbon_class = 'tertiary' WHERE run_key = 4", {"facts"}),
        ("DELETE FROM facts WHERE run_key = 4", {"facts"}),
        ("UPDATE structure SET morgan = x'00' WHERE structure_id = 2", {"structures"}),
        ("UPDATE structure SET recipe_id = NULL WHERE structure_id = 2", {"structures"}),
        ("UPDATE attachment_blob SET content = x'00'", {"attachments"}),
        ("INSERT INTO run_words(run_words) VALUES ('delete-all')", {"words"}),
    ],
)
def test_harm_is_noticed(book: Path | str, books: Books, harm: str, noticed: set[str]) -> None:
    if books.engine == "postgresql":
        harm = SAID_TO_POSTGRESQL.get(harm, harm)
        if not harm:
            pytest.skip("the server refuses a row that points nowhere; a key that is taken away is another test")
    assert books.execute("book.sidepath", harm) != 0
    assert failed(book, sample=None) == noticed


def test_a_key_that_was_taken_away_is_noticed(schemas: Schemas) -> None:
    with a_book(schemas) as store:
        assert all(c.ok for c in verify(store))
        schemas.execute("book.sidepath", "ALTER TABLE component DROP CONSTRAINT fk_component_run_key_run")
        assert {c.name for c in verify(store) if not c.ok} == {"foreign keys"}


def test_a_missing_file_of_an_imported_run_is_told_and_no_failure(books: Books) -> None:
    with a_book(books, "there.sidepath") as there:
        there.add(a_run(), "MK")
        run = there.attachments.attach("1", "nmr.pdf", b"%PDF", "MK", "spectrum")
    with a_book(books) as here:
        here.add(run, "MK")
        (check,) = [c for c in verify(here) if c.name == "attachments"]
        assert check.ok and "1 more" in check.detail


def test_a_stopped_check_says_only_what_it_looked_at(book: Path | str) -> None:
    class Stop:
        def advance(self, done: int, total: int | None, note: str = "") -> None:
            """Take no note."""

        def cancelled(self) -> bool:
            return True

    with Store.open(book) as store:
        assert verify(store, Stop()) == ()
