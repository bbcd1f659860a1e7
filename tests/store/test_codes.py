"""Codes are read as people say them, and kept apart by letters that depend on the runs alone."""

from __future__ import annotations

import doctest
from uuid import UUID

from hypothesis import given
from hypothesis import strategies as st

from kb.store import codes, curation


def test_the_examples_in_the_text_hold() -> None:
    assert doctest.testmod(codes).failed == 0
    assert doctest.testmod(codes).attempted > 0
    assert doctest.testmod(curation).failed == 0


@given(number=st.integers(0, 10**8), mark=st.text(codes.LETTERS, max_size=4))
def test_a_code_written_is_read_back(number: int, mark: str) -> None:
    assert codes.parse_code(codes.write_code(number, mark)) == (number, mark)
    assert codes.parse_code(codes.write_code(number, mark).upper()) == (number, mark)


@given(
    claimed=st.dictionaries(st.uuids(), st.sampled_from(["", "", "kt", "kt"]), min_size=2, max_size=9),
    seed=st.randoms(),
)
def test_marks_keep_all_apart_and_depend_on_the_set_only(claimed: dict[UUID, str], seed: object) -> None:
    found = codes.marks_of(claimed)
    assert len(set(found.values())) == len(claimed)
    assert all(mark and set(mark) <= set(codes.LETTERS) for mark in found.values())
    shuffled = list(claimed.items())
    seed.shuffle(shuffled)  # type: ignore[attr-defined]
    assert codes.marks_of(dict(shuffled)) == found


def test_one_alone_needs_no_mark_and_keeps_the_one_it_has() -> None:
    assert codes.marks_of({UUID(int=1): ""}) == {UUID(int=1): ""}
    assert codes.marks_of({UUID(int=1): "kt"}) == {UUID(int=1): "kt"}
    assert codes.marks_of({}) == {}


def test_alike_letters_are_lengthened_until_they_differ() -> None:
    base = len(codes.LETTERS)
    found = codes.marks_of({UUID(int=1): "", UUID(int=1 + base**2): "", UUID(int=5): ""})
    assert sorted(map(len, found.values())) == [3, 3, 3]
    assert len(set(found.values())) == 3
