"""Condition profiles written down as facts, for tables of liabilities and hazards.

Facts read `acidity=strong; reagent=azide+alkoxide; solvent=alcohol; temperature_c=60; water=yes`. In a closed
profile what is not written is absent (the table names all that is in the flask); in an open one it is unknown.
Temperature and time stay unknown in both, since a table that leaves them out says nothing about them.
"""

from __future__ import annotations

from typing import Any

from kb.materials.class_names import add_wider
from kb.materials.profile import ConditionProfile

_ABSENT: dict[str, Any] = {
    "acidity": "none",
    "nucleophile": "none",
    "lewis_acid": "none",
    "hydride": "none",
    "halophile": "none",
    "water": False,
    "alcohol": False,
    "peroxide": False,
    "fluoride": False,
    "metal_catalyst": False,
    "hydrogenolysis": False,
    "dissolving_metal": False,
    "organometallic": False,
    "ionising": False,
    "prolonged": False,
    "has_unknown_solvent": False,
}
_SETS = {"reagent": "reagent_classes", "oxidant": "oxidants", "solvent": "solvent_classes"}
_NUMBERS = ("base_pkah", "temperature_c", "time_h", "bp_c")


def a_profile(facts: str = "", *, is_closed: bool = True, **changes: Any) -> ConditionProfile:
    """Build a profile from a line of facts; see the module."""
    values: dict[str, Any] = dict(_ABSENT) if is_closed else {}
    for part in filter(None, (p.strip() for p in facts.split(";"))):
        name, word = part.split("=", 1)
        if name in _SETS:
            words = frozenset(word.split("+"))
            values[_SETS[name]] = add_wider(words) if name == "reagent" else words
            if name == "solvent":
                values["has_unknown_solvent"] = False
        elif name == "solvent_alkoxy":
            values[name] = frozenset({word})
        elif name in _NUMBERS:
            values[name] = float(word)
        else:
            values[name] = word == "yes" if word in ("yes", "no") else word
    return ConditionProfile(**(values | changes))
