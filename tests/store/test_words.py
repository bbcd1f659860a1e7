"""Words find runs by note, materials, failures and labels; the index never lags behind the record."""

from __future__ import annotations

import random
import sqlite3
import unicodedata
from contextlib import closing
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import settings as hypothesis_settings
from hypothesis import strategies as st

from kb.errors import QueryError
from kb.record.outcome import Failure, Outcome
from kb.store.checking import verify
from kb.store.store import Store
from kb.store.words_postgres import words_of
from tests.engines import Books, Schemas
from tests.factories import CHEMISTRY, a_book, a_run


@pytest.fixture
def store(books: Books) -> Store:
    """Give a book of three runs."""
    book = a_book(books)
    book.add(a_run(note="bad emulsion at work-up, emulsion again with brine"), "MK")
    book.add(a_run(note="clean", outcome=Outcome(failures=(Failure(mode="group-loss"),))), "MK")
    book.add(a_run(note="Überschuß: emulsions"), "MK")
    return book


def codes(store: Store, words: str, **options: object) -> list[str]:
    return [hit.code for hit in store.words(words, **options)]  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("words", "found"),
    [
        ("emulsion", {"R-0001", "R-0003"}),
        ("EMULS", {"R-0001", "R-0003"}),
        ("emulsion brine", {"R-0001"}),
        ('"emulsion again"', {"R-0001"}),
        ('"again emulsion"', set()),
        ("uberschuss", set()),
        ("uberschuß", {"R-0003"}),
        ("group-loss", {"R-0002"}),
        ("K2CO3 dmf", {"R-0001", "R-0002", "R-0003"}),
        ("MK-2-117", {"R-0001", "R-0002", "R-0003"}),
        ("azides clean", {"R-0002"}),
        ("sausage", set()),
        ("note:emulsion", set()),
    ],
)
def test_words_find_runs(store: Store, words: str, found: set[str]) -> None:
    assert set(codes(store, words)) == found


def test_the_best_match_comes_first(store: Store) -> None:
    hits = store.words("emulsion")
    assert [hit.code for hit in hits] == ["R-0001", "R-0003"]
    assert hits[0].score > hits[1].score
    assert codes(store, "emulsion", limit=1) == ["R-0001"]


@pytest.mark.parametrize("words", ["", "  ", '"', "***", "()", "-- ;"])
def test_no_word_is_refused(store: Store, words: str) -> None:
    with pytest.raises(QueryError):
        store.words(words)


@given(words=st.text(max_size=40))
@hypothesis_settings(max_examples=80)
def test_no_text_is_an_operator_or_an_error(words: str, store: Store) -> None:
    try:
        assert len(store.words(words)) <= 3
    except QueryError:
        assert not any(c.isalnum() for c in words)


@pytest.mark.parametrize(
    "words",
    [
        "emulsion OR zebra",
        "NEAR(clean dmf)",
        "clean AND NOT zebra",
        "rowid:1",
        "^dmf*zebra",
        "{note} : clean",
        "a'b\"c",
    ],
)
def test_operators_are_plain_words(store: Store, words: str) -> None:
    assert codes(store, words) == []


def test_the_index_follows_amendments_and_withdrawals(store: Store) -> None:
    store.amend("1", {"note": "no trouble"}, "MK", "wrong run")
    assert codes(store, "emulsion") == ["R-0003"]
    assert codes(store, "trouble") == ["R-0001"]
    store.withdraw("3", "twice", "MK")
    assert codes(store, "emulsion") == []
    assert codes(store, "emulsion", include_withdrawn=True) == ["R-0003"]
    assert [c for c in verify(store) if not c.ok] == []


def test_an_index_that_lags_is_noticed(store: Store, books: Books) -> None:
    books.execute("book.sidepath", "UPDATE run SET note = 'silently changed' WHERE code = 'R-0002'")
    assert {c.name for c in verify(store) if not c.ok} == {"record", "words"}
    books.execute("book.sidepath", "UPDATE run SET note = 'clean' WHERE code = 'R-0002'")
    assert [c for c in verify(store) if not c.ok] == []


EMPTIED = {"sqlite": "INSERT INTO run_words(run_words) VALUES ('delete-all')", "postgresql": "DELETE FROM run_words"}


def test_an_index_that_was_lost_is_made_anew_with_what_is_derived(books: Books) -> None:
    with a_book(books, **CHEMISTRY) as store:
        store.add(a_run(note="bad emulsion"), "MK")
        books.execute("book.sidepath", EMPTIED[books.engine])
        assert codes(store, "emulsion") == []
        store.rebuild()
        assert codes(store, "emulsion") == ["R-0001"]
        assert [c for c in verify(store) if not c.ok] == []


PARTS = ["emulsion", "Über", "schuß", "group-loss", "K2CO3", "naïve", "4-Å", "e", "ØX", "ærlig", "50 °C", "THF/H2O"]
PARTS += ["β-H", "İo"]
GLUE = [" ", "-", "/", ", ", "; ", "_", "'", ""]
sentences = st.lists(st.sampled_from(PARTS) | st.sampled_from(GLUE), min_size=1, max_size=7).map("".join)


@pytest.fixture(scope="module")
def notes() -> list[str]:
    """Give notes that are put together from the parts of the questions, the same ones each time."""
    drawn = random.Random(3)
    return ["".join(drawn.choice(PARTS) + drawn.choice(GLUE) for _ in range(drawn.randint(1, 6))) for _ in range(80)]


@given(asked=sentences, is_phrase=st.booleans())
@hypothesis_settings(max_examples=150)
def test_both_engines_find_the_same_runs(
    asked: str, is_phrase: bool, notes: list[str], tmp_path: Path, schemas: Schemas
) -> None:
    kept = BOOKS_OF_NOTES.get(tmp_path)
    if kept is None:
        kept = a_book(tmp_path), a_book(schemas)
        for store in kept:
            store.add_many([a_run(note=note) for note in notes], "MK")
        BOOKS_OF_NOTES[tmp_path] = kept
    text = f'"{asked}"' if is_phrase else asked
    found = []
    for store in kept:
        try:
            found.append({hit.code for hit in store.words(text)})
        except QueryError:
            found.append(None)
    assert found[0] == found[1]


BOOKS_OF_NOTES: dict[Path, tuple[Store, Store]] = {}
"""The two books of the test above, filled once for all its examples."""


YOUNGER = "ͿԨԪԬԮ"
"""Capitals that came to Unicode after SQLite's tables were made; SQLite leaves them as they are."""


def test_letters_are_folded_on_a_server_as_sqlite_folds_them() -> None:
    letters = [chr(n) for n in (*range(0x21, 0x530), *range(0x1E00, 0x1F00), *range(0x3041, 0x3100))]
    letters = [c for c in letters if unicodedata.category(c)[0] in "LN" and c not in YOUNGER]
    letters += [chr(n) for n in range(0x300, 0x332)]
    with closing(sqlite3.connect(":memory:")) as raw:
        raw.execute("CREATE VIRTUAL TABLE t USING fts5(x, tokenize='unicode61 remove_diacritics 2')")
        raw.execute("CREATE VIRTUAL TABLE v USING fts5vocab(t, 'instance')")
        raw.executemany("INSERT INTO t (rowid, x) VALUES (?, ?)", [(n, f"q{c}z") for n, c in enumerate(letters)])
        theirs: dict[int, list[str]] = {}
        for term, number in raw.execute("SELECT term, doc FROM v ORDER BY doc, offset"):
            theirs.setdefault(number, []).append(term)
    assert len(letters) > 1500
    assert {c: words_of(f"q{c}z") for c in letters} == {c: theirs[n] for n, c in enumerate(letters)}
