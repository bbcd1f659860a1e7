"""How alike two steps are: a weighted geometric mean of named parts, each in [0, 1].

It owns the parts, their weights and their scales; it ranks nothing and words nothing. The geometric mean makes one
hopeless part (a tertiary centre against a methyl) spoil the whole, as it should. A part where either side was not
recorded counts as `UNRECORDED`: neither alike nor different.

Weights, scales and ladders are judgements; `audit calibration` measures how well they serve a book. Leaving-group
distances rest on the published relative reactivities of `kb.physorg.constants.leaving_scale`.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from kb.assess.distinct import distinct, distinct_with_places
from kb.assess.table import WORDS, FactTable, flag_words
from kb.materials.nucleophile import DONORS
from kb.physorg.constants import leaving_scale
from kb.vocabulary import CentreFlag

PARTS: tuple[tuple[str, float], ...] = (
    ("centre", 0.22),
    ("leaving group", 0.12),
    ("nucleophile", 0.12),
    ("base", 0.09),
    ("solvent", 0.08),
    ("temperature", 0.08),
    ("promoter", 0.08),
    ("groups at risk", 0.14),
    ("reagents", 0.04),
    ("rest of molecule", 0.03),
)
"""Parts and their weights (sum 1)."""

UNRECORDED = 0.6
FLOOR = 0.01
RISK_STEP = 0.1
"""Likeness left for each endangered group that only one of the two molecules holds."""

TEMPERATURE_WIDTH_K = 28.0
"""Standard deviation of the Gaussian in temperature."""

_CLASS_STEP = (1.0, 0.45, 0.15, 0.05)
_FLAG_WEIGHT = {
    CentreFlag.ALLYLIC: 0.5,
    CentreFlag.BENZYLIC: 0.5,
    CentreFlag.PROPARGYLIC: 0.45,
    CentreFlag.ALPHA_CARBONYL: 0.6,
    CentreFlag.ALPHA_HETEROATOM: 0.5,
    CentreFlag.BETA_BRANCHED: 0.3,
    CentreFlag.NEOPENTYL: 0.8,
    CentreFlag.RING: 0.15,
    CentreFlag.SMALL_RING: 0.5,
    CentreFlag.HOMOBENZYLIC: 0.4,
}


def similarity_parts(
    plan: FactTable,
    table: FactTable,
    rest: NDArray[np.float64] | None = None,
    risk_differences: NDArray[np.float64] | None = None,
) -> dict[str, NDArray[np.float64]]:
    """Compare one plan with every row of a table, part by part.

    Args:
        plan: a table of one row.
        table: n rows.
        risk_differences: how many groups that the plan's conditions endanger stand in only one of the two (n); None =
            not looked for.
        rest: whole-molecule Tanimoto (n), 0..1; None or NaN = not computed, counts as not recorded.

    Returns:
        Part name to (n) float64 in [FLOOR, 1].
    """
    parts = {name: np.clip(way(plan, table)[0], FLOOR, 1.0) for name, way in _WAYS.items()}
    parts["groups at risk"] = np.clip(
        np.ones(len(table)) if risk_differences is None else RISK_STEP**risk_differences, FLOOR, 1.0
    )
    parts["rest of molecule"] = _rest(rest, len(table))
    return {name: parts[name] for name, _ in PARTS}


def pairwise_part(name: str, table: FactTable) -> NDArray[np.float64]:
    """Compare every row of a table with every row, in one part of those that rest on the facts alone (n, n)."""
    return np.clip(_WAYS[name](table, table), FLOOR, 1.0)


def combine(parts: dict[str, NDArray[np.float64]]) -> NDArray[np.float64]:
    """Return the weighted geometric mean of the parts (n), 0..1."""
    total = sum(weight * np.log(parts[name]) for name, weight in PARTS)
    return np.asarray(np.exp(total), dtype=np.float64)


def centre_likeness(some: NDArray[np.uint64], others: NDArray[np.uint64]) -> NDArray[np.float64]:
    """Return the Tanimoto similarity of rooted environments (k, n); 0 where there is no centre."""
    both = np.zeros((len(some), len(others)))
    either = np.zeros((len(some), len(others)))
    for word in range(some.shape[1]):
        one, other = some[:, None, word], others[None, :, word]
        both += np.bitwise_count(one & other)
        either += np.bitwise_count(one | other)
    return np.divide(both, either, out=np.zeros_like(both), where=either > 0)


def leaving_similarity(one: str | None, other: str | None) -> float:
    """Compare two leaving groups by published reactivity; groups off the scale only equal themselves."""
    if one is None or other is None:
        return 1.0 if one == other else UNRECORDED
    if one == other:
        return 1.0
    scale = leaving_scale()
    if one in scale and other in scale:
        return float(0.92 * np.exp(-abs(scale[one] - scale[other]) / 2.2))
    return 0.2


def nucleophile_similarity(one: str | None, other: str | None) -> float:
    """Compare two nucleophile classes: the same, of one donor atom, or different."""
    if one == other:
        return 1.0
    if one is None or other is None:
        return 0.3
    donor = DONORS.get(one)
    return 0.55 if donor is not None and donor == DONORS.get(other) else 0.18


def _rest(rest: NDArray[np.float64] | None, n: int) -> NDArray[np.float64]:
    if rest is None:
        return np.full(n, UNRECORDED)
    return np.asarray(np.where(np.isnan(rest), UNRECORDED, 0.35 + 0.65 * rest))


# Each of the following compares k rows with n rows and returns (k, n).


def _reagents(some: FactTable, others: FactTable) -> NDArray[np.float64]:
    codes, place = distinct_with_places(some.flask)
    if not len(others) or not len(codes):
        return np.zeros((len(some), len(others)))
    rows = np.stack([others.flasks.likeness_to(some.flasks.sets[int(code)]) for code in codes])
    return rows[place][:, others.flask]


def _centre(some: FactTable, others: FactTable) -> NDArray[np.float64]:
    carbon = _CLASS_TABLE[some.words["carbon_class"]][:, others.words["carbon_class"]]
    mine, theirs = distinct(some.flags), np.flatnonzero(np.bincount(others.flags, minlength=1))
    lookup = np.zeros((int(mine.max(initial=0)) + 1, int(theirs.max(initial=0)) + 1))
    for one in mine:
        for other in theirs:
            lookup[one, other] = _flag_similarity(int(one), int(other))
    flag = lookup[some.flags][:, others.flags]
    return np.asarray(carbon * flag * (0.55 + 0.45 * centre_likeness(some.centre_bits, others.centre_bits)))


@lru_cache(maxsize=65536)
def _flag_similarity(one_code: int, other_code: int) -> float:
    one, other = flag_words(one_code), flag_words(other_code)
    activation = {"allylic", "benzylic", "propargylic"}
    distance = sum(_FLAG_WEIGHT[CentreFlag(word)] for word in one ^ other)
    if one & activation and other & activation and (one ^ other) & activation:
        distance -= 0.5  # allylic against benzylic: both activated
    return float(np.exp(-max(distance, 0.0)))


def _leaving(some: FactTable, others: FactTable) -> NDArray[np.float64]:
    return _LEAVING_TABLE[some.words["leaving_group"]][:, others.words["leaving_group"]]


def _nucleophile(some: FactTable, others: FactTable) -> NDArray[np.float64]:
    mine, theirs = (*some.nucleophile_words, None), (*others.nucleophile_words, None)
    codes, place = distinct_with_places(some.nucleophile)
    rows = np.array([[nucleophile_similarity(mine[code], word) for word in theirs] for code in codes])
    return rows.reshape(len(codes), len(theirs))[place][:, others.nucleophile]


def _base(some: FactTable, others: FactTable) -> NDArray[np.float64]:
    water_pkah = -1.7  # with no base in the flask the strongest one is the solvent; water, common practice
    mine = np.nan_to_num(some.numbers["base_pkah"], nan=water_pkah)[:, None]
    theirs = np.nan_to_num(others.numbers["base_pkah"], nan=water_pkah)
    bulk, other = some.words["base_bulk"][:, None], others.words["base_bulk"]
    differs = (bulk >= 0) & (other >= 0) & (other != bulk)
    return np.asarray(np.exp(-np.abs(theirs - mine) / 7.0) * np.where(differs, 0.45, 1.0))


def _solvent(some: FactTable, others: FactTable) -> NDArray[np.float64]:
    mine, theirs = some.protic[:, None], others.protic
    proton = np.where((theirs < 0) | (mine < 0), UNRECORDED, np.where(theirs == mine, 1.0, 0.4))
    polarity = np.full(proton.shape, np.nan)
    for column, scale in (("et30_kcal_mol", 9.0), ("permittivity", 25.0)):
        step = np.exp(-np.abs(others.numbers[column] - some.numbers[column][:, None]) / scale)
        polarity = np.where(np.isnan(polarity), step, polarity)
    return np.asarray(proton * np.where(np.isnan(polarity), 0.8, polarity))


def _temperature(some: FactTable, others: FactTable) -> NDArray[np.float64]:
    away = (others.numbers["temperature_c"] - some.numbers["temperature_c"][:, None]) / TEMPERATURE_WIDTH_K
    return np.asarray(np.where(np.isnan(away), UNRECORDED, np.exp(-0.5 * away**2)))


def _promoter(some: FactTable, others: FactTable) -> NDArray[np.float64]:
    result = np.ones((len(some), len(others)))
    step = np.array([1.0, 0.45, 0.12])
    for column in ("acidity", "lewis_acid", "halophile"):
        mine, theirs = some.words[column][:, None], others.words[column]
        unknown = (theirs < 0) | (mine < 0)
        result *= np.where(unknown, 0.8, step[np.abs(theirs - np.maximum(mine, 0)).clip(0, 2)])
    return result


def _class_table() -> NDArray[np.float64]:
    """Return the likeness of carbon classes by code; the last row and column answer code -1, not read."""
    words = WORDS["carbon_class"]
    ladder = words.index("tertiary")
    table = np.full((len(words) + 1, len(words) + 1), UNRECORDED)
    for one in range(len(words)):
        for other in range(len(words)):
            on_ladder = one <= ladder and other <= ladder
            table[one, other] = _CLASS_STEP[abs(one - other)] if on_ladder else 1.0 if one == other else 0.03
    return table


def _leaving_table() -> NDArray[np.float64]:
    words = (*WORDS["leaving_group"], None)
    return np.array([[leaving_similarity(one, other) for other in words] for one in words])


_CLASS_TABLE, _LEAVING_TABLE = _class_table(), _leaving_table()
_WAYS: dict[str, Callable[[FactTable, FactTable], NDArray[np.float64]]] = {
    "centre": _centre,
    "leaving group": _leaving,
    "nucleophile": _nucleophile,
    "base": _base,
    "solvent": _solvent,
    "temperature": _temperature,
    "promoter": _promoter,
    "reagents": _reagents,
}
