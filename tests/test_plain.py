"""Text made safe for a terminal, fast enough for a long note."""

from __future__ import annotations

import json
import unicodedata

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.plain import excerpt, plain, plain_json, shortened

ANYTHING = st.text(alphabet=st.characters(exclude_categories=()), max_size=60)


@given(ANYTHING)
def test_nothing_that_acts_gets_through(text: str) -> None:
    for keep in (False, True):
        shown = plain(text, keep_lines=keep)
        assert len(shown) == len(text)
        left = set(shown) - ({"\n", "\t"} if keep else set())
        assert not any(unicodedata.category(c) in ("Cc", "Cf", "Cs", "Co", "Zl", "Zp") for c in left)


@given(ANYTHING)
def test_what_is_harmless_stays(text: str) -> None:
    shown = plain(text)
    assert all(a == b for a, b in zip(text, shown, strict=True) if a.isprintable())


@given(st.recursive(ANYTHING | st.integers(), lambda inner: st.lists(inner) | st.dictionaries(ANYTHING, inner)))
def test_json_keeps_its_value(value: object) -> None:
    tame = plain_json(json.dumps(value, ensure_ascii=False))
    assert json.loads(tame) == value
    assert all(c.isprintable() or unicodedata.category(c) in ("Zs", "Cn") for c in tame)


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("\x1b[31mred", "\ufffd[31mred"),
        ("a\nb\tc", "a b c"),
        ("\r", "\ufffd"),
        ("\u202eabc", "\ufffdabc"),
        ("é🙂", "é🙂"),
    ],
)
def test_examples(text: str, shown: str) -> None:
    assert plain(text) == shown


def test_cutting_says_so() -> None:
    assert (shortened("abcdef", 4), shortened("abcd", 4)) == ("abc…", "abcd")
    assert excerpt("abcdef", 4) == "abcd… (6 characters in all)" and excerpt("abcd", 4) == "abcd"
