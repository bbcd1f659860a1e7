"""Conditions as typed lines, and back: what the planning and entry forms hold.

It owns the grammar of the lines ("NaN3=1.5; NH4Cl=0.1", "THF:4; water:1"), not names (the book resolves
them) and not quantities (`kb.quantity`). Every field is read on its own, so that one bad field never hides
the others.
"""

from __future__ import annotations

from dataclasses import asdict, dataclass, fields
from typing import Any

from kb.errors import QuantityError, SidepathError
from kb.quantity import (
    format_concentration,
    format_number,
    parse_amount_mmol,
    parse_concentration,
    parse_duration,
    parse_temperature,
)
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.vocabulary import Role
from tui.ports import BookPort

ROLE_FIELDS: tuple[tuple[str, Role], ...] = (
    ("reagent", Role.REAGENT),
    ("base", Role.BASE),
    ("acid", Role.ACID),
    ("additive", Role.ADDITIVE),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class ConditionTexts:
    """One string per field of the form; "" = not decided, never zero."""

    reagent: str = ""
    base: str = ""
    acid: str = ""
    additive: str = ""
    solvent: str = ""
    temperature: str = ""
    time: str = ""
    concentration: str = ""
    scale: str = ""
    atmosphere: str = ""
    vessel: str = ""
    workup: str = ""

    def as_dict(self) -> dict[str, str]:
        """Return the fields by name, for drafts."""
        return asdict(self)

    @classmethod
    def from_dict(cls, data: dict[str, Any]) -> ConditionTexts:
        """Return texts from a draft; unknown and unreadable entries are passed over."""
        known = {f.name for f in fields(cls)}
        return cls(**{k: v for k, v in data.items() if k in known and isinstance(v, str)})


FIELD_WORDS: dict[str, str] = {
    "reagent": "Reagent",
    "base": "Base",
    "acid": "Acid",
    "additive": "Additive",
    "solvent": "Solvent",
    "temperature": "Temp.",
    "time": "Time",
    "concentration": "Conc.",
    "scale": "Scale",
    "atmosphere": "Atmos.",
    "vessel": "Vessel",
    "workup": "Work-up",
}

FIELD_EXAMPLES: dict[str, str] = {
    "reagent": "NaN3=1.5",
    "base": "K2CO3=2",
    "acid": "HCl",
    "additive": "NaI=0.1; 18-crown-6=0.1",
    "solvent": "DMF, or THF:4; water:1",
    "temperature": "60 C, rt, 0C to rt",
    "time": "4 h, overnight",
    "concentration": "0.2 M",
    "scale": "5 mmol",
    "atmosphere": "N2",
    "vessel": "sealed tube",
    "workup": "brine, dried, column",
}


def split_line(text: str) -> tuple[str, ...]:
    """Return the entries of a line; they are parted by semicolons, since names hold commas."""
    return tuple(part.strip() for part in text.split(";") if part.strip())


def read_conditions(texts: ConditionTexts, book: BookPort) -> tuple[Conditions, dict[str, SidepathError]]:
    """Read every field that can be read.

    Returns:
        The conditions without the bad fields, and the errors by field name.
    """
    errors: dict[str, SidepathError] = {}
    components: list[Component] = []
    for name, role in ROLE_FIELDS:
        for entry in split_line(getattr(texts, name)):
            try:
                components.append(book.resolve_component(entry, role))
            except SidepathError as error:
                errors.setdefault(name, error)
    solvents: list[SolventPart] = []
    for entry in split_line(texts.solvent):
        try:
            solvents.append(book.resolve_solvent(entry))
        except SidepathError as error:
            errors.setdefault("solvent", error)
    values: dict[str, Any] = {}
    readers = {
        "temperature": ("temperature", parse_temperature),
        "time": ("time", parse_duration),
        "concentration": ("conc_molar", parse_concentration),
        "scale": ("scale_mmol", parse_amount_mmol),
    }
    for name, (target, read) in readers.items():
        if text := getattr(texts, name).strip():
            try:
                values[target] = read(text)
            except QuantityError as error:
                errors[name] = error
    words = {name: getattr(texts, name).strip() or None for name in ("atmosphere", "vessel", "workup")}
    return Conditions(components=tuple(components), solvents=tuple(solvents), **values, **words), errors


def write_conditions(conditions: Conditions) -> ConditionTexts:
    """Return the lines that would be typed for some conditions."""
    lines: dict[str, str] = {}
    for name, role in ROLE_FIELDS:
        lines[name] = "; ".join(_component_text(c) for c in conditions.components if c.role is role)
    lines["solvent"] = "; ".join(
        s.name if s.parts is None else f"{s.name}:{format_number(s.parts)}" for s in conditions.solvents
    )
    return ConditionTexts(
        **lines,
        temperature=conditions.temperature.text if conditions.temperature else "",
        time=conditions.time.text if conditions.time else "",
        concentration=format_concentration(conditions.conc_molar) if conditions.conc_molar is not None else "",
        scale=f"{format_number(conditions.scale_mmol)} mmol" if conditions.scale_mmol is not None else "",
        atmosphere=conditions.atmosphere or "",
        vessel=conditions.vessel or "",
        workup=conditions.workup or "",
    )


def _component_text(component: Component) -> str:
    if component.loading_mol_pct is not None:
        return f"{component.name}={format_number(component.loading_mol_pct)} mol%"
    if component.equiv is not None:
        return f"{component.name}={format_number(component.equiv)}"
    return component.name
