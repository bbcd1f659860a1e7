"""Which column of a table means what: the fields a table may carry, what groups call them, and the match between.

It owns the field names that files use (stable: a saved mapping and an exported table rest on them), their synonyms, and
the units that a heading may state. A heading that resembles a field (rapidfuzz) is matched and *said to be* a
resemblance, so that a front end can ask; one that resembles two fields about equally is left out and reported. It never
looks at chemistry.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from kb.errors import ImportFileError
from kb.vocabulary import Fate

FUZZY_AT_LEAST = 84.0
"""Least rapidfuzz ratio (0..100) of a resemblance; a judgement, chosen so that one or two typing slips pass."""

FUZZY_MARGIN = 4.0
"""A resemblance must lead the next field by this much."""

LIST_FIELDS = frozenset({"reagents", "bases", "acids", "additives", "solvent", "failed", "note", "products"})
"""Fields that several columns may feed ("reagent 1", "reagent 2"); any other field takes its best column only."""

MAX_FIELDS_SHOWN = 500
"""Most data fields of a structure file that a report lists."""

AMOUNT_FIELD = "equiv"
"""A column that gives the amount of the material in the nearest material column to its left."""

IGNORED_FIELDS = frozenset({"code", "sidepath row", "sidepath reason"})
"""Columns that our own files carry and an import passes over: the code belongs to the book it came from."""

_NAMES: dict[str, str] = {
    "uuid": "uuid, run id, run uuid",
    "code": "code, run code, sidepath code",
    "reference": (
        "reference, ref, notebook, notebook ref, notebook page, eln, eln id, experiment, exp, exp no, "
        "experiment id, page, lab book, labbook ref, entry"
    ),
    "date": "date, day, run date, date run, performed, date performed, started",
    "by": "by, who, initials, chemist, operator, run by, performed by, name of chemist, experimenter",
    "project": "project, programme, program, campaign, study",
    "series": "series, group, set, screen",
    "scheme": "scheme, reaction, reaction smiles, rxn, rxn smiles, rsmi, equation, smiles",
    "substrate": (
        "substrate, substrate smiles, starting material, starting material smiles, sm smiles, reactant, "
        "reactant smiles, educt, electrophile"
    ),
    "product": "product, product smiles, target, target smiles, desired product",
    "reagents": "reagents, reagent, nucleophile, nucleophiles, with, nu",
    "bases": "bases, base",
    "acids": "acids, acid, lewis acid, promoter",
    "additives": "additives, additive, catalyst, catalysts, ligand, add",
    "equiv": "equiv, eq, equivalents, equivs, loading, how much",
    "solvent": "solvent, solvents, medium, solv",
    "temperature": "temperature, temp, reaction temperature, bath temperature, bath temp, t bath",
    "time": "time, reaction time, duration, rxn time",
    "concentration": "concentration, conc, molarity, substrate concentration",
    "scale": "scale, amount, substrate amount, amount substrate, quantity, batch size, n substrate",
    "atmosphere": "atmosphere, gas, inert gas",
    "vessel": "vessel, flask, reactor, equipment",
    "workup": "workup, work up, quench, isolation",
    "split": "split, product split, product distribution, product ratio, fates, ratio",
    "products": "products, products seen, products found, found, by products, byproducts, side products",
    "method": "method, measured by, analysis, assay method, split by, analytical method",
    "isolated yield": "isolated yield, yield, isolated, yld, isol yield, yield isolated",
    "assay yield": "assay yield, nmr yield, gc yield, hplc yield, crude yield, solution yield, in situ yield",
    "conversion": "conversion, conv",
    "ee": "ee, enantiomeric excess, optical purity",
    "dr": "dr, diastereomeric ratio, d r, de",
    "failed": "failed, failure, failure mode, failure modes, what went wrong, problem, problems, issue",
    "motif": "motif, motif smarts, smarts, group hit",
    "cause": "cause, cause known, certainty",
    "verdict": "verdict, outcome, result, success, worked",
    "note": "note, notes, comment, comments, remark, remarks, observation, observations",
    "withdrawn": "withdrawn, withdrawn why",
    "sidepath row": "sidepath row",
    "sidepath reason": "sidepath reason",
}

SYNONYMS: dict[str, tuple[str, ...]] = {field: tuple(names.split(", ")) for field, names in _NAMES.items()} | {
    f"share {fate}": (f"share {fate}", str(fate)) for fate in Fate
}
"""Field to what groups call it (case, punctuation and units aside); the first is what the exports write."""

_MORE_SHARES = {
    Fate.SUBSTITUTION: ("sn2", "sn1", "sn", "substitution product", "substituted"),
    Fate.ELIMINATION: ("e2", "e1", "alkene", "olefin", "elimination product"),
    Fate.UNREACTED: ("sm left", "recovered sm", "remaining sm", "unreacted sm", "starting material left"),
    Fate.REARRANGED: ("rearrangement", "rearranged product"),
    Fate.OTHER: ("other products", "others"),
}

_UNITS = {
    "c": "C", "°c": "C", "degc": "C", "deg c": "C", "celsius": "C", "k": "K", "kelvin": "K", "f": "F", "°f": "F",
    "h": "h", "hr": "h", "hrs": "h", "hours": "h", "hour": "h", "min": "min", "mins": "min", "minutes": "min",
    "d": "d", "days": "d", "s": "s", "sec": "s",
    "m": "M", "mol/l": "M", "mm": "mM", "mmol": "mmol", "mol": "mol", "mg": "mg", "g": "g", "ml": "mL",
    "%": "%", "percent": "%", "pct": "%", "fraction": "fraction", "0-1": "fraction", "0..1": "fraction",
    "equiv": "equiv", "equiv.": "equiv", "eq": "equiv", "eq.": "equiv", "mol%": "mol%", "mol %": "mol%",
}  # fmt: skip

_UNIT_KINDS = {"temperature": ("C", "K", "F"), "time": ("h", "min", "d", "s")}


@dataclass(frozen=True, slots=True, kw_only=True)
class ColumnUse:
    """One column and what it is taken for.

    Attributes:
        position: 0-based column.
        heading: as it stands in the file.
        field: name from SYNONYMS; None = not used.
        unit: unit stated by the heading ("C", "min", "fraction"); None = none.
        how: "exact" (our own name), "synonym", "resembles", "chosen" (by a saved mapping), "unknown", "unclear" (like
            two fields), "spare" (another column feeds that field already) or "blank".
    """

    position: int
    heading: str
    field: str | None = None
    unit: str | None = None
    how: str = "unknown"


@dataclass(frozen=True, slots=True, kw_only=True)
class ColumnMapping:
    """What every column of a table is taken for.

    Attributes:
        columns: in file order.
        date_order: "dmy" or "mdy" for dates with slashes; None = refuse those that can be read in two ways.
    """

    columns: tuple[ColumnUse, ...]
    date_order: str | None = None

    @property
    def fields(self) -> frozenset[str]:
        """Return the fields that some column feeds."""
        return frozenset(c.field for c in self.columns if c.field)

    @property
    def unused(self) -> tuple[ColumnUse, ...]:
        """Return columns with a heading that feed nothing, those of our own making aside."""
        return tuple(c for c in self.columns if c.field is None and c.how != "blank")

    def as_dict(self) -> dict[str, Any]:
        """Return the mapping as it is saved by name: headings, not positions, so that it serves the next file."""
        return {
            "columns": {c.heading: {"field": c.field, "unit": c.unit} for c in self.columns if c.how != "blank"},
            "date_order": self.date_order,
        }


def match_headings(headings: Sequence[str], saved: Mapping[str, Any] | None = None) -> ColumnMapping:
    """Match the headings of a table to fields.

    Args:
        headings: first row of the table, in order.
        saved: what `ColumnMapping.as_dict` gave earlier, or simply heading to field; it wins over the matching.

    Raises:
        ImportFileError: the saved mapping names a field that does not exist, or no column tells the reaction.
    """
    chosen = _saved_columns(saved)
    date_order = (saved or {}).get("date_order")
    if date_order not in (None, "dmy", "mdy"):
        raise ImportFileError(f"The order of dates {str(date_order)[:40]!r} is none.", "Use dmy or mdy.", date_order)
    uses = [_match(position, heading, chosen) for position, heading in enumerate(headings)]
    best: dict[str, int] = {}
    rank = {"chosen": 0, "exact": 1, "synonym": 2, "resembles": 3}
    for use in uses:
        if use.field and use.field not in LIST_FIELDS | {AMOUNT_FIELD}:
            held = best.get(use.field)
            if held is None or rank[use.how] < rank[uses[held].how]:
                best[use.field] = use.position
    final = tuple(
        ColumnUse(position=u.position, heading=u.heading, how="spare")
        if u.field in best and best[u.field] != u.position
        else u
        for u in uses
    )
    mapping = ColumnMapping(columns=final, date_order=date_order)
    if not mapping.fields & {"scheme", "substrate"}:
        raise ImportFileError(
            "No column tells the reaction.",
            "Head one column `scheme` (reaction SMILES), or two `substrate` and `product`.",
            tuple(str(h)[:40] for h in headings[:20]),
        )
    return mapping


def recognised(headings: Sequence[str]) -> int:
    """Return how many headings are a field's own name or a synonym; used to find the heading row and the delimiter."""
    return sum(1 for h in headings if _bare_and_unit(h)[0] in _BY_NAME)


def _saved_columns(saved: Mapping[str, Any] | None) -> dict[str, tuple[str | None, str | None]]:
    if saved is None:
        return {}
    columns = saved.get("columns", saved) if isinstance(saved, Mapping) else None
    if not isinstance(columns, Mapping):
        raise ImportFileError(
            "The saved mapping has no columns.", 'Write it like {"columns": {"T [K]": "temperature"}}.'
        )
    chosen: dict[str, tuple[str | None, str | None]] = {}
    for heading, use in columns.items():
        field = use.get("field") if isinstance(use, Mapping) else use
        if field is not None and field not in SYNONYMS:
            raise ImportFileError(
                f"The saved mapping sends {str(heading)[:40]!r} to {str(field)[:40]!r}, which is no field.",
                f"Fields: {', '.join(SYNONYMS)}.",
                field,
            )
        chosen[_fold(str(heading))] = (field, use.get("unit") if isinstance(use, Mapping) else None)
    return chosen


def _match(position: int, heading: str, chosen: Mapping[str, tuple[str | None, str | None]]) -> ColumnUse:
    bare, unit = _bare_and_unit(heading)
    if _fold(heading) in chosen:
        field, chosen_unit = chosen[_fold(heading)]
        return ColumnUse(position=position, heading=heading, field=field, unit=chosen_unit or unit, how="chosen")
    if not bare:
        return ColumnUse(position=position, heading=heading, how="blank")
    numberless = re.sub(r"\s*\d+$", "", bare)
    if bare == "t":
        kind = "temperature" if unit in _UNIT_KINDS["temperature"] or (unit is None and "T" in heading) else "time"
        return ColumnUse(position=position, heading=heading, field=kind, unit=unit, how="synonym")
    for name in (bare, numberless):
        if name in _BY_NAME:
            field = _BY_NAME[name]
            how = "exact" if name == _fold(field) else "synonym"
            return ColumnUse(position=position, heading=heading, field=field, unit=unit, how=how)
    return _resemblance(position, heading, numberless, unit)


def _resemblance(position: int, heading: str, bare: str, unit: str | None) -> ColumnUse:
    from rapidfuzz import fuzz, process

    if len(bare) < 4:
        return ColumnUse(position=position, heading=heading, unit=unit)
    close = process.extract(
        bare, _LONG_NAMES, scorer=fuzz.ratio, score_cutoff=FUZZY_AT_LEAST - FUZZY_MARGIN, limit=None
    )
    by_field: dict[str, float] = {}
    for name, score, _ in close:
        field = _BY_NAME[name]
        by_field[field] = max(score, by_field.get(field, 0.0))
    ranked = sorted(by_field.items(), key=lambda item: -item[1])
    if not ranked or ranked[0][1] < FUZZY_AT_LEAST:
        return ColumnUse(position=position, heading=heading, unit=unit)
    if len(ranked) > 1 and ranked[0][1] - ranked[1][1] < FUZZY_MARGIN:
        return ColumnUse(position=position, heading=heading, unit=unit, how="unclear")
    return ColumnUse(position=position, heading=heading, field=ranked[0][0], unit=unit, how="resembles")


def _fold(heading: str) -> str:
    plain = unicodedata.normalize("NFKC", str(heading)[:200]).casefold()
    return re.sub(r"[\s_\-:;,*#.]+", " ", plain).strip()


def _bare_and_unit(heading: str) -> tuple[str, str | None]:
    """Return the folded heading without its unit, and the unit: `T / °C`, `time (min)`, `Yield [%]`, `yield %`."""
    text = unicodedata.normalize("NFKC", str(heading)[:200]).strip()
    found = re.fullmatch(r"(.*?)\s*(?:\(([^()]*)\)|\[([^\[\]]*)\]|/\s*([^/]+)|\bin\s+(\S+)|(%))\s*", text)
    if found:
        inner = next(g for g in found.groups()[1:] if g is not None).strip()
        unit = _UNITS.get(inner.casefold()) if inner != "M" else "M"
        if unit is None and inner == "mM":
            unit = "mM"
        if unit is not None:
            return _fold(found[1]), unit
        if found[1].strip():
            return _fold(re.sub(r"[\[\]()/]", " ", text)), None
    words = text.rsplit(" ", 1)
    if (
        len(words) == 2
        and words[1].casefold() in ("mmol", "min", "mg", "°c", "equiv", "%")
        and _fold(words[0]) in _BY_NAME
    ):
        return _fold(words[0]), _UNITS[words[1].casefold()]
    return _fold(re.sub(r"[().\[\]]", " ", text)), None


_BY_NAME: dict[str, str] = {_fold(name): field for field, names in SYNONYMS.items() for name in names} | {
    _fold(name): f"share {fate}" for fate, names in _MORE_SHARES.items() for name in names
}
_LONG_NAMES = tuple(name for name in _BY_NAME if len(name) > 3)
