"""How alike two steps are: a weighted geometric mean of named parts, each in [0, 1].

It owns the parts, their weights and their scales; it ranks nothing and words nothing. The geometric mean makes one
hopeless part (a tertiary centre against a methyl) spoil the whole, as it should. A part where either side was not
recorded counts as `UNRECORDED`: neither alike nor different.

Weights, scales and ladders are judgements; `audit calibration` measures how well they serve a book. Leaving-group
distances rest on the published relative reactivities held in `LEAVING_SCALE`.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence

import numpy as np
from numpy.typing import NDArray

from kb.assess.table import WORDS, FactTable, flag_words
from kb.vocabulary import CentreFlag, LeavingGroup

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

LEAVING_SCALE: dict[LeavingGroup, float] = {
    LeavingGroup.FLUORIDE: 0.0,
    LeavingGroup.CHLORIDE: 2.3,
    LeavingGroup.BROMIDE: 4.0,
    LeavingGroup.IODIDE: 4.5,
    LeavingGroup.TOSYLATE: 4.8,
    LeavingGroup.MESYLATE: 4.8,
    LeavingGroup.SULFONATE: 4.9,
    LeavingGroup.TRIFLATE: 8.0,
}
"""log10 relative reactivity, fluoride = 0. Source: F 1, Cl 200, Br 10,000, I 30,000, OTs 60,000 as tabulated in
Solomons, Organic Chemistry (teaching notes); mesylate beside tosylate and triflate some 10^3 above are common
practice."""

_NUCLEOPHILE_FAMILY: dict[str, str] = {}
for _family, _members in {
    "nitrogen": "azide amine primary_amine secondary_amine tertiary_amine ammonia aniline aromatic_amine imide amide "
    "azole sulfonamide carbamate hydroxylamine hydrazine nitrite",
    "oxygen": "alkoxide hydroxide phenoxide phenol carboxylate water alcohol oxime nitrate peroxide",
    "sulfur": "thiolate thiol thiocarboxylate sulfide sulfinate thiourea thiocyanate sulfite thiosulfate xanthate",
    "carbon": "cyanide enolate malonate stabilised_carbanion alkynyl organometallic cuprate grignard carbanion arene",
    "halide": "fluoride chloride bromide iodide",
    "phosphorus": "phosphine phosphite phosphide",
}.items():
    _NUCLEOPHILE_FAMILY.update(dict.fromkeys(_members.split(), _family))


def similarity_parts(
    plan: FactTable,
    table: FactTable,
    rest: NDArray[np.float64] | None = None,
    risk_differences: NDArray[np.float64] | None = None,
    only: Collection[str] | None = None,
) -> dict[str, NDArray[np.float64]]:
    """Compare one plan with every row of a table, part by part.

    Args:
        plan: a table of one row.
        table: n rows.
        risk_differences: how many groups that the plan's conditions endanger stand in only one of the two (n); None =
            not looked for.
        rest: whole-molecule Tanimoto (n), 0..1; None or NaN = not computed, counts as not recorded.
        only: names of the parts wanted; None = all.

    Returns:
        Part name to (n) float64 in [FLOOR, 1].
    """
    n = len(table)
    ways: dict[str, Callable[[], NDArray[np.float64]]] = {
        "centre": lambda: _centre(plan, table),
        "leaving group": lambda: _leaving(plan, table),
        "nucleophile": lambda: _nucleophile(plan, table),
        "base": lambda: _base(plan, table),
        "solvent": lambda: _solvent(plan, table),
        "temperature": lambda: _gauss(plan, table, "temperature_c", 28.0),
        "promoter": lambda: _promoter(plan, table),
        "groups at risk": lambda: np.ones(n) if risk_differences is None else RISK_STEP**risk_differences,
        "reagents": lambda: _reagents(plan, table),
        "rest of molecule": lambda: _rest(rest, n),
    }
    return {name: np.clip(way(), FLOOR, 1.0) for name, way in ways.items() if only is None or name in only}


def combine(parts: dict[str, NDArray[np.float64]]) -> NDArray[np.float64]:
    """Return the weighted geometric mean of the parts (n), 0..1."""
    total = sum(weight * np.log(parts[name]) for name, weight in PARTS)
    return np.asarray(np.exp(total), dtype=np.float64)


def centre_likeness(query: NDArray[np.uint64], rows: NDArray[np.uint64]) -> NDArray[np.float64]:
    """Return the Tanimoto similarity (n) of a rooted environment to others; 0 where there is no centre."""
    both = np.bitwise_count(rows & query).sum(axis=1, dtype=np.float64)
    either = np.bitwise_count(rows | query).sum(axis=1, dtype=np.float64)
    return np.divide(both, either, out=np.zeros(len(rows)), where=either > 0)


def leaving_likeness(words: Sequence[str | None]) -> NDArray[np.float64]:
    """Return `leaving_similarity` of each pair of some words (m, m)."""
    distinct = list(dict.fromkeys(words))
    table = np.array([[leaving_similarity(a, b) for b in distinct] for a in distinct])
    codes = [distinct.index(word) for word in words]
    return table[np.ix_(codes, codes)]


def leaving_similarity(one: str | None, other: str | None) -> float:
    """Compare two leaving groups by published reactivity; groups off the scale only equal themselves."""
    if one is None or other is None:
        return 1.0 if one == other else UNRECORDED
    if one == other:
        return 1.0
    scale = {str(k): v for k, v in LEAVING_SCALE.items()}
    if one in scale and other in scale:
        return float(0.92 * np.exp(-abs(scale[one] - scale[other]) / 2.2))
    return 0.2


def nucleophile_similarity(one: str | None, other: str | None) -> float:
    """Compare two nucleophile classes: the same, of one donor atom, or different."""
    if one == other:
        return 1.0
    if one is None or other is None:
        return 0.3
    family = _NUCLEOPHILE_FAMILY.get(one)
    return 0.55 if family is not None and family == _NUCLEOPHILE_FAMILY.get(other) else 0.18


def _reagents(plan: FactTable, table: FactTable) -> NDArray[np.float64]:
    mine = plan.flasks.sets[int(plan.flask[0])]
    return table.flasks.likeness_to(mine)[table.flask] if len(table) else np.zeros(0)


def _rest(rest: NDArray[np.float64] | None, n: int) -> NDArray[np.float64]:
    if rest is None:
        return np.full(n, UNRECORDED)
    return np.asarray(np.where(np.isnan(rest), UNRECORDED, 0.35 + 0.65 * rest))


def _centre(plan: FactTable, table: FactTable) -> NDArray[np.float64]:
    vocabulary = WORDS["carbon_class"]
    ladder = vocabulary.index("tertiary")
    mine = int(plan.words["carbon_class"][0])
    by_code = np.full(len(vocabulary) + 1, UNRECORDED)  # last place answers code -1
    if mine >= 0:
        for code in range(len(vocabulary)):
            on_ladder = code <= ladder and mine <= ladder
            by_code[code] = _CLASS_STEP[abs(code - mine)] if on_ladder else float(code == mine) or 0.03
    carbon = by_code[table.words["carbon_class"]]
    distinct, where = np.unique(table.flags, return_inverse=True)
    mine_flags = flag_words(int(plan.flags[0]))
    flag = np.array([_flag_similarity(mine_flags, flag_words(int(code))) for code in distinct])[where]
    return np.asarray(carbon * flag * (0.55 + 0.45 * centre_likeness(plan.centre_bits[0], table.centre_bits)))


def _flag_similarity(one: frozenset[str], other: frozenset[str]) -> float:
    activation = {"allylic", "benzylic", "propargylic"}
    distance = sum(_FLAG_WEIGHT[CentreFlag(word)] for word in one ^ other)
    if one & activation and other & activation and (one ^ other) & activation:
        distance -= 0.5  # allylic against benzylic: both activated
    return float(np.exp(-max(distance, 0.0)))


def _leaving(plan: FactTable, table: FactTable) -> NDArray[np.float64]:
    mine = plan.word("leaving_group", 0)
    by_code = [leaving_similarity(mine, word) for word in WORDS["leaving_group"]] + [leaving_similarity(mine, None)]
    return np.array(by_code)[table.words["leaving_group"]]


def _nucleophile(plan: FactTable, table: FactTable) -> NDArray[np.float64]:
    mine = plan.nucleophile_word(0)
    by_code: Sequence[float] = [nucleophile_similarity(mine, w) for w in table.nucleophile_words]
    by_code = [*by_code, nucleophile_similarity(mine, None)]
    return np.array(by_code)[table.nucleophile]


def _base(plan: FactTable, table: FactTable) -> NDArray[np.float64]:
    water_pkah = -1.7  # with no base in the flask the strongest one is the solvent; water, common practice
    mine = plan.number("base_pkah", 0)
    theirs = np.nan_to_num(table.numbers["base_pkah"], nan=water_pkah)
    strength = np.exp(-np.abs(theirs - (water_pkah if mine is None else mine)) / 7.0)
    bulk_code = int(plan.words["base_bulk"][0])
    other = table.words["base_bulk"]
    differs = (bulk_code >= 0) & (other >= 0) & (other != bulk_code)
    return np.asarray(strength * np.where(differs, 0.45, 1.0))


def _solvent(plan: FactTable, table: FactTable) -> NDArray[np.float64]:
    mine = int(plan.protic[0])
    proton = np.where((table.protic < 0) | (mine < 0), UNRECORDED, np.where(table.protic == mine, 1.0, 0.4))
    polarity = np.full(len(table), np.nan)
    for column, scale in (("et30_kcal_mol", 9.0), ("permittivity", 25.0)):
        value = plan.number(column, 0)
        if value is not None:
            step = np.exp(-np.abs(table.numbers[column] - value) / scale)
            polarity = np.where(np.isnan(polarity), step, polarity)
    return np.asarray(proton * np.where(np.isnan(polarity), 0.8, polarity))


def _gauss(plan: FactTable, table: FactTable, column: str, width: float) -> NDArray[np.float64]:
    mine = plan.number(column, 0)
    theirs = table.numbers[column]
    if mine is None:
        return np.full(len(table), UNRECORDED)
    alike = np.exp(-0.5 * ((theirs - mine) / width) ** 2)
    return np.asarray(np.where(np.isnan(theirs), UNRECORDED, alike))


def _promoter(plan: FactTable, table: FactTable) -> NDArray[np.float64]:
    result = np.ones(len(table))
    step = np.array([1.0, 0.45, 0.12])
    for column in ("acidity", "lewis_acid", "halophile"):
        mine = int(plan.words[column][0])
        theirs = table.words[column]
        unknown = (theirs < 0) | (mine < 0)
        result *= np.where(unknown, 0.8, step[np.abs(theirs - max(mine, 0)).clip(0, 2)])
    return np.asarray(result)
