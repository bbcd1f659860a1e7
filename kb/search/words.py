"""Words of a search: what was typed, and what the record writes instead.

A word that the record does not hold, nor any word beginning with it, is looked up among the words that it
does hold; the nearest are searched in its place and the answer says so. Words that are there are taken to
the letter. Short words and numbers are never bent: MeOH and MeSH are one letter apart.
"""

from __future__ import annotations

import re
import unicodedata
from bisect import bisect_left
from collections.abc import Sequence
from dataclasses import dataclass

from kb.errors import QueryError

_PIECE = re.compile(r'"([^"]*)"|(\S+)')
_TOKEN = re.compile(r"\w+")
SHORTEST_BENT = 5
"""Letters from which on a misspelling is told from another word (judgement)."""
ALIKE_FROM = 82.0
"""Likeness 0..100 (normalised edit distance) from which a word is taken for a misspelling (judgement)."""
MOST_ALTERNATIVES = 4
MAX_WORDS = 32


@dataclass(frozen=True, slots=True)
class WordQuery:
    """Words to search, and what the user should be told.

    Attributes:
        wanted: for each word typed, its alternatives; one of them must occur.
        notes: one sentence for each word that the record does not hold.
        is_bent: at least one word has an alternative.
    """

    wanted: tuple[tuple[str, ...], ...]
    notes: tuple[str, ...] = ()
    is_bent: bool = False


def split_words(text: str) -> tuple[str, ...]:
    """Return the words of a search; "double quotes" hold words together.

    Raises:
        QueryError: there is no word in it, or far too many.
    """
    pieces = [quoted or bare for quoted, bare in _PIECE.findall(text.replace("\x00", " "))]
    usable = tuple(piece for piece in pieces if _TOKEN.search(piece))
    if not usable:
        raise QueryError(f"There is no word in {text[:60]!r}.", "Give at least one word.", text)
    if len(usable) > MAX_WORDS:
        raise QueryError(f"{len(usable)} words are too many.", f"Give at most {MAX_WORDS}.", len(usable))
    return usable


def bend(pieces: Sequence[str], vocabulary: Sequence[str]) -> WordQuery:
    """Return the words with alternatives for those that the record does not hold.

    Args:
        pieces: of `split_words`.
        vocabulary: every word that the record holds, folded, ascending.
    """
    wanted: list[tuple[str, ...]] = []
    notes: list[str] = []
    for piece in pieces:
        tokens = _TOKEN.findall(fold(piece))
        unknown = [token for token in tokens if not is_known(token, vocabulary)]
        nearest = alike(tokens[0], vocabulary) if unknown and len(tokens) == 1 else ()
        wanted.append((piece, *nearest))
        if nearest:
            notes.append(f"'{piece}' is written nowhere; searched for {' or '.join(nearest)} instead.")
        elif unknown:
            notes.append(f"'{piece}' is written nowhere in the record.")
    return WordQuery(tuple(wanted), tuple(notes), any(len(some) > 1 for some in wanted))


def fold(text: str) -> str:
    """Return text as the word index folds it: small letters, accents off."""
    apart = unicodedata.normalize("NFD", text.lower())
    return "".join(c for c in apart if not unicodedata.combining(c))


def is_known(word: str, vocabulary: Sequence[str]) -> bool:
    """Return whether any word of an ascending vocabulary begins with this one."""
    at = bisect_left(vocabulary, word)
    return at < len(vocabulary) and vocabulary[at].startswith(word)


def alike(word: str, vocabulary: Sequence[str]) -> tuple[str, ...]:
    """Return the nearest words of a vocabulary, best first; () = none near enough, or too short to tell."""
    if len(word) < SHORTEST_BENT or not word.isalpha():
        return ()
    from rapidfuzz import process
    from rapidfuzz.distance import DamerauLevenshtein

    found = process.extract(
        word,
        vocabulary,
        scorer=DamerauLevenshtein.normalized_similarity,
        score_cutoff=ALIKE_FROM / 100,
        limit=MOST_ALTERNATIVES,
    )
    return tuple(match for match, _, _ in found if len(match) >= SHORTEST_BENT - 1)
