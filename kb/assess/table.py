"""The record as columns: every standing run's facts and outcome as NumPy arrays, ready for one vectorised kernel.

It owns the coding of words to small integers and the reading of the store's columns; it compares nothing. Row order
is the store's; -1 codes "not recorded" in word columns, NaN in number columns.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.flask import Flasks
from kb.materials.profile import LEVELS
from kb.record.derived import CENTRE_BITS, DerivedFacts
from kb.vocabulary import CarbonClass, CentreFlag, Fate, LeavingGroup, Verdict

FATES: tuple[Fate, ...] = tuple(Fate)
WORDS: dict[str, tuple[str, ...]] = {
    "carbon_class": tuple(map(str, CarbonClass)),
    "leaving_group": tuple(map(str, LeavingGroup)),
    "fate": tuple(map(str, Fate)),
    "base_bulk": ("unhindered", "hindered"),
    "acidity": LEVELS["acidity"],
    "lewis_acid": LEVELS["lewis_acid"],
    "halophile": ("none", "mercury", "silver"),
    "verdict": tuple(map(str, Verdict)),
}
"""Coding of each word column; the code is the position."""

NUMBERS: tuple[str, ...] = (
    "base_pkah",
    "swain_scott_n",
    "permittivity",
    "et30_kcal_mol",
    "winstein_y",
    "temperature_c",
    "time_h",
    "beta_hydrogens",
    "centre_atom",
)
_COLUMNS = (
    "nucleophile",
    "flags",
    "protic",
    "centre_bits",
    "shares",
    "yield_pct",
    "date",
    "profile",
    "flask",
)
_FLAG_BIT = {str(flag): 1 << position for position, flag in enumerate(CentreFlag)}
_WORDS_PER_CENTRE = CENTRE_BITS // 64


@dataclass(frozen=True, slots=True, kw_only=True)
class FactTable:
    """Facts and outcomes of n runs.

    Attributes:
        codes: short codes (n).
        words: int8 codes per word column (n each), see WORDS.
        numbers: float64 per number column (n each), NaN = not recorded.
        nucleophile: code into nucleophile_words (n) int16, -1 = none.
        nucleophile_words: the classes met in this book, in order of first meeting.
        flags: bit per CentreFlag (n) uint16.
        protic: 1, 0 or -1 (n) int8.
        centre_bits: rooted environment (n, CENTRE_BITS / 64) uint64, zeros = no centre.
        shares: molar share per fate (n, 8) float64, all NaN = nothing measured.
        yield_pct: (n) float64, NaN = not recorded.
        date: proleptic ordinal (n) int32, 0 = not recorded.
        substrate: canonical SMILES (n), "" = not read.
        profile: code into profiles (n) int32.
        profiles: JSON of each condition profile met in this book, each once.
        flask: code into flasks (n) int32.
        flasks: the sets of reagents met in this book, for comparing them.
    """

    codes: tuple[str, ...]
    words: dict[str, NDArray[np.int8]]
    numbers: dict[str, NDArray[np.float64]]
    nucleophile: NDArray[np.int16]
    nucleophile_words: tuple[str, ...]
    flags: NDArray[np.uint16]
    protic: NDArray[np.int8]
    centre_bits: NDArray[np.uint64]
    shares: NDArray[np.float64]
    yield_pct: NDArray[np.float64]
    date: NDArray[np.int32]
    substrate: tuple[str, ...]
    profile: NDArray[np.int32]
    profiles: tuple[str, ...]
    flask: NDArray[np.int32]
    flasks: Flasks

    def __len__(self) -> int:
        return len(self.codes)

    def rows(self, keep: NDArray[Any]) -> FactTable:
        """Return the table cut down to the rows of a mask or an index array."""
        where = np.flatnonzero(keep) if keep.dtype == bool else keep
        return self._cut(lambda column: column[where], lambda texts: tuple(texts[i] for i in where))

    def first(self, count: int) -> FactTable:
        """Return the first rows, without copying an array."""
        return self._cut(lambda column: column[:count], lambda texts: texts[:count])

    def _cut(
        self, arrays: Callable[[NDArray[Any]], NDArray[Any]], texts: Callable[[tuple[str, ...]], tuple[str, ...]]
    ) -> FactTable:
        columns: dict[str, Any] = {name: arrays(getattr(self, name)) for name in _COLUMNS}
        return replace(
            self,
            codes=texts(self.codes),
            words={k: arrays(v) for k, v in self.words.items()},
            numbers={k: arrays(v) for k, v in self.numbers.items()},
            substrate=texts(self.substrate),
            **columns,
        )

    def word(self, column: str, row: int) -> str | None:
        """Return the word behind a code, None = not recorded."""
        code = int(self.words[column][row])
        return WORDS[column][code] if code >= 0 else None

    def number(self, column: str, row: int) -> float | None:
        """Return the number, None = not recorded."""
        value = float(self.numbers[column][row])
        return None if np.isnan(value) else value

    def nucleophile_word(self, row: int) -> str | None:
        """Return the nucleophile class of a row, None = none."""
        code = int(self.nucleophile[row])
        return self.nucleophile_words[code] if code >= 0 else None

    def split(self, row: int) -> tuple[tuple[Fate, float], ...]:
        """Return the measured shares of a row, largest first, zeros left out."""
        measured = [(f, float(s)) for f, s in zip(FATES, self.shares[row], strict=True) if s > 0]
        return tuple(sorted(measured, key=lambda pair: -pair[1]))


def flag_code(flags: str) -> int:
    """Code comma-joined flag words as bits; unknown words are ignored."""
    return sum(_FLAG_BIT.get(word, 0) for word in flags.split(",") if word)


def flag_words(code: int) -> frozenset[str]:
    """Return the flag words of a code."""
    return frozenset(word for word, bit in _FLAG_BIT.items() if code & bit)


def code_of(column: str, word: object) -> int:
    """Return the code of a word in a column, -1 for None or a word of a later program."""
    return WORDS[column].index(str(word)) if word is not None and str(word) in WORDS[column] else -1


def build_table(columns: Mapping[str, Any]) -> FactTable:
    """Code the store's columns (`kb.store.facts.derived_columns` gives shapes and codings).

    Args:
        columns: equal-length arrays: `code`, `verdict`, `isolated_yield_pct`, `assay_yield_pct`, `date_ordinal`,
            `shares` (n, 8) in vocabulary order, `centre_bits` (n, 4) uint64, and the fields of DerivedFacts.

    Returns:
        The table, in the order given.
    """
    n = len(columns["code"])
    nucleophile_words = tuple(dict.fromkeys(w for w in columns["nucleophile_class"] if w))
    nucleophile_code: dict[object, int] = {w: i for i, w in enumerate(nucleophile_words)}
    words = {
        column: _coded(columns[column], {w: i for i, w in enumerate(vocabulary)})
        for column, vocabulary in WORDS.items()
    }
    flag_of = {text: flag_code(text or "") for text in set(columns["flags"])}
    isolated = np.asarray(columns["isolated_yield_pct"], dtype=np.float64)
    profile, profiles, flask, flasks = _coded_profiles(columns["profile_json"])
    return FactTable(
        codes=tuple(columns["code"]),
        words=words,
        numbers={c: np.asarray(columns[c], dtype=np.float64) for c in NUMBERS},
        nucleophile=np.fromiter(
            (nucleophile_code.get(w, -1) for w in columns["nucleophile_class"]), dtype=np.int16, count=n
        ),
        nucleophile_words=nucleophile_words,
        flags=np.fromiter((flag_of[t] for t in columns["flags"]), dtype=np.uint16, count=n),
        protic=np.asarray(columns["protic"], dtype=np.int8),
        centre_bits=np.asarray(columns["centre_bits"], dtype=np.uint64).reshape(n, _WORDS_PER_CENTRE),
        shares=_zero_where_others_measured(np.asarray(columns["shares"], dtype=np.float64).reshape(n, len(FATES))),
        yield_pct=np.where(np.isnan(isolated), np.asarray(columns["assay_yield_pct"], dtype=np.float64), isolated),
        date=np.asarray(columns["date_ordinal"], dtype=np.int32),
        substrate=tuple(s or "" for s in columns["substrate"]),
        profile=profile,
        profiles=profiles,
        flask=flask,
        flasks=flasks,
    )


def stack(first: FactTable, second: FactTable) -> FactTable:
    """Return the rows of two tables one after the other; classes, profiles and flasks are coded anew."""
    profiles = [*(first.profiles[c] for c in first.profile), *(second.profiles[c] for c in second.profile)]
    words = tuple(dict.fromkeys((*first.nucleophile_words, *second.nucleophile_words)))
    code = {word: place for place, word in enumerate(words)}
    nucleophile = [first.nucleophile_word(i) for i in range(len(first))]
    nucleophile += [second.nucleophile_word(i) for i in range(len(second))]
    columns: dict[str, Any] = {
        name: np.concatenate([getattr(first, name), getattr(second, name)])
        for name in _COLUMNS
        if name not in ("nucleophile", "profile", "flask")
    }
    both = replace(
        first,
        codes=(*first.codes, *second.codes),
        words={k: np.concatenate([v, second.words[k]]) for k, v in first.words.items()},
        numbers={k: np.concatenate([v, second.numbers[k]]) for k, v in first.numbers.items()},
        substrate=(*first.substrate, *second.substrate),
        nucleophile=np.array([-1 if w is None else code[w] for w in nucleophile], dtype=np.int16),
        nucleophile_words=words,
        **columns,
    )
    return with_profiles(both, profiles)


def with_profiles(table: FactTable, profiles_json: Sequence[str]) -> FactTable:
    """Return the table with other condition profiles (n)."""
    profile, profiles, flask, flasks = _coded_profiles(profiles_json)
    return replace(table, profile=profile, profiles=profiles, flask=flask, flasks=flasks)


def _coded_profiles(
    texts: Sequence[str],
) -> tuple[NDArray[np.int32], tuple[str, ...], NDArray[np.int32], Flasks]:
    """Code profiles, and their sets of reagents, by order of first meeting."""
    profiles = tuple(dict.fromkeys(texts))
    code = {text: place for place, text in enumerate(profiles)}
    profile = np.fromiter((code[text] for text in texts), dtype=np.int32, count=len(texts))
    reagents = [frozenset(json.loads(text).get("reagents", ())) for text in profiles]
    sets = tuple(dict.fromkeys(reagents))
    set_code = {one: place for place, one in enumerate(sets)}
    of_profile = np.array([set_code[one] for one in reagents], dtype=np.int32)
    return profile, profiles, of_profile[profile], Flasks(sets)


def columns_of(rows: Sequence[DerivedFacts]) -> dict[str, Any]:
    """Return facts in the store's columns, without outcomes: for plans, and for tests by hand."""
    n = len(rows)
    columns: dict[str, Any] = {
        name: [getattr(row, name) for row in rows]
        for name in DerivedFacts.__slots__
        if name not in ("run_id", "recipe")
    }
    for name in NUMBERS:
        columns[name] = np.array([np.nan if v is None else v for v in columns[name]], dtype=np.float64)
    columns["protic"] = np.array([-1 if p is None else int(p) for p in columns["protic"]], dtype=np.int8)
    packed = b"".join(bits or bytes(CENTRE_BITS // 8) for bits in columns["centre_bits"])
    columns["centre_bits"] = np.frombuffer(packed, dtype="<u8").reshape(n, _WORDS_PER_CENTRE)
    nothing = np.full(n, np.nan)
    return columns | {
        "code": [f"R-{i + 1}" for i in range(n)],
        "verdict": [None] * n,
        "isolated_yield_pct": nothing,
        "assay_yield_pct": nothing,
        "date_ordinal": np.zeros(n, dtype=np.int32),
        "shares": np.full((n, len(FATES)), np.nan),
    }


def one_row(facts: DerivedFacts) -> FactTable:
    """Return a table of one row for a plan: facts, no outcome."""
    return build_table(columns_of([facts]))


def _zero_where_others_measured(shares: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return shares in which a fate nobody mentioned counts as none, where any fate of the run was measured."""
    measured = ~np.isnan(shares).all(axis=1)
    filled = shares.copy()
    filled[measured] = np.nan_to_num(filled[measured])
    return filled


def _coded(values: Sequence[Any], code: Mapping[str, int]) -> NDArray[np.int8]:
    return np.fromiter(
        (code.get(str(v), -1) if v is not None else -1 for v in values), dtype=np.int8, count=len(values)
    )
