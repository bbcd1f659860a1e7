"""Words are taken to the letter where the record holds them, and bent to the nearest where it does not."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.errors import QueryError
from kb.search.words import MAX_WORDS, alike, bend, fold, is_known, split_words

BOOK = sorted(
    ["alkene", "chromatography", "crystallised", "dimethylformamide", "emulsion", "filtered", "meoh", "mesylate"]
)


@pytest.mark.parametrize(
    ("typed", "meant", "why"),
    [
        ("emulshion", "emulsion", "a letter too many"),
        ("emulsoin", "emulsion", "two letters changed places"),
        ("cristallised", "crystallised", "another spelling"),
        ("chromatograpy", "chromatography", "a letter missing"),
        ("mesilate", "mesylate", "a trade word"),
    ],
)
def test_misspellings_find_the_word_that_was_meant(typed: str, meant: str, why: str) -> None:
    assert alike(typed, BOOK)[0] == meant, why


@pytest.mark.parametrize(
    ("typed", "why"),
    [
        ("mesh", "short words are never bent: MeSH is not MeOH"),
        ("emu", "a beginning is no misspelling, and short"),
        ("palladium", "nothing is near"),
        ("12345", "numbers are never bent"),
        ("r0042", "nor codes"),
    ],
)
def test_what_is_no_misspelling_is_left_alone(typed: str, why: str) -> None:
    assert alike(typed, BOOK) == (), why


def test_known_words_and_their_beginnings_are_not_bent() -> None:
    assert is_known("emul", BOOK)
    assert is_known("emulsion", BOOK)
    assert not is_known("emulsions", BOOK)
    read = bend(("emul", "alkene"), BOOK)
    assert read.wanted == (("emul",), ("alkene",))
    assert not read.is_bent
    assert read.notes == ()


def test_the_user_is_told_what_was_bent_and_what_is_not_there() -> None:
    read = bend(("emulshion", "xylophone"), BOOK)
    assert read.wanted == (("emulshion", "emulsion"), ("xylophone",))
    assert "emulsion" in read.notes[0]
    assert "nowhere" in read.notes[1]


def test_quotes_hold_words_together() -> None:
    assert split_words('slow "after work-up" red') == ("slow", "after work-up", "red")
    assert split_words('an open "quote') == ("an", "open", '"quote')


@pytest.mark.parametrize("text", ["", "   ", "??? !!", '""', " ".join(["word"] * (MAX_WORDS + 1))])
def test_no_word_or_far_too_many_are_refused(text: str) -> None:
    with pytest.raises(QueryError):
        split_words(text)


def test_accents_and_case_are_folded_as_in_the_word_index() -> None:
    assert fold("Émulsion À") == "emulsion a"


@given(text=st.text(max_size=60))
def test_any_text_is_read_or_refused(text: str) -> None:
    try:
        pieces = split_words(text)
    except QueryError:
        return
    assert len(bend(pieces, BOOK).wanted) == len(pieces)
