"""Conditions and plans from words: the flags of the command line, the fields of a form, a small TOML table.

It owns which word goes where; names are read by `kb.materials`, values by `kb.quantity`.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from kb.errors import InvalidRecord
from kb.record.conditions import Conditions
from kb.record.plan import Plan
from kb.vocabulary import Role

_ROLES = {"reagents": Role.REAGENT, "bases": Role.BASE, "acids": Role.ACID, "additives": Role.ADDITIVE}
_FIELDS = {
    *_ROLES,
    "solvents",
    "temperature",
    "time",
    "concentration",
    "scale",
    "atmosphere",
    "vessel",
    "workup",
}


def conditions_from_words(words: Mapping[str, Any]) -> Conditions:
    """Build conditions.

    Args:
        words: any of `reagents`, `bases`, `acids`, `additives` ("NaN3=1.5"), `solvents` ("DMF:3") as lists or one
            text, and `temperature`, `time`, `concentration`, `scale`, `atmosphere`, `vessel`, `workup` as text.
            Missing, None and "" mean not recorded.

    Raises:
        InvalidRecord: a field that conditions do not have.
        QuantityError, NameUnknown: a value or a name that cannot be read.
    """
    from kb.materials.resolving import resolve_component, resolve_solvents
    from kb.quantity import parse_amount_mmol, parse_concentration, parse_duration, parse_temperature

    unknown = sorted(set(words) - _FIELDS)
    if unknown:
        raise InvalidRecord(
            f"Conditions have no field {unknown[0]!r}.", f"Use: {', '.join(sorted(_FIELDS))}.", unknown[0]
        )
    temperature, time = words.get("temperature"), words.get("time")
    concentration, scale = words.get("concentration"), words.get("scale")
    return Conditions(
        components=tuple(resolve_component(t, role) for key, role in _ROLES.items() for t in _texts(words.get(key))),
        solvents=tuple(part for t in _texts(words.get("solvents")) for part in resolve_solvents(t)),
        temperature=parse_temperature(temperature) if temperature else None,
        time=parse_duration(time) if time else None,
        conc_molar=parse_concentration(concentration) if concentration else None,
        scale_mmol=parse_amount_mmol(scale) if scale else None,
        atmosphere=words.get("atmosphere") or None,
        vessel=words.get("vessel") or None,
        workup=words.get("workup") or None,
    )


def plan_from_words(words: Mapping[str, Any]) -> Plan:
    """Build a plan from `scheme`, an optional `project`, and the words of conditions."""
    rest = {k: v for k, v in words.items() if k not in ("scheme", "project")}
    return Plan(scheme=words["scheme"], project=words.get("project"), conditions=conditions_from_words(rest))


def _texts(value: str | Sequence[str] | None) -> Sequence[str]:
    if value is None or value == "":
        return ()
    return [value] if isinstance(value, str) else [text for text in value if text.strip()]
