"""One run as the text fields of a table: the way back of `rows.py`, and the list of what a table carries.

A table is for people: it carries the fields of FIELDS_OUT and not the bounds of a share, counted protons, a method or a
cause that differs from product to product, attachments, history or numbers finer than the quantity readers take. JSON
Lines carries all. Reading a row back gives the same run in the fields that are carried (tested).
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from decimal import Decimal

from kb.errors import SidepathError
from kb.exchange.lookups import materials_in, solvents_in
from kb.exchange.material_cells import read_materials, read_solvents
from kb.quantity import Duration, Temperature, format_duration, format_temperature, parse_duration, parse_temperature
from kb.record.component import Component, SolventPart
from kb.record.outcome import ProductSeen
from kb.record.run import Run
from kb.vocabulary import Fate, Role

FIELDS_OUT: tuple[str, ...] = (
    "code", "date", "by", "project", "series", "reference", "scheme", "reagents", "bases", "acids", "additives",
    "solvent", "temperature", "time", "concentration", "scale", "atmosphere", "vessel", "workup", "split / %",
    "products", "method", "isolated yield / %", "assay yield / %", "conversion / %", "ee / %", "dr", "failed", "motif",
    "cause", "verdict", "note", "withdrawn", "uuid",
)  # fmt: skip
"""Headings of an exported table, in order."""

_ROLE_FIELDS = {Role.BASE: "bases", Role.ACID: "acids", Role.ADDITIVE: "additives"}
_AMOUNTS = {
    "equiv": "equiv",
    "loading_mol_pct": "mol%",
    "amount_mmol": "mmol",
    "mass_mg": "mg",
    "volume_ml": "mL",
}


def row_of(run: Run) -> dict[str, str]:
    """Return the run's cells by heading of FIELDS_OUT; "" = not recorded."""
    conditions, outcome = run.conditions, run.outcome
    cells = dict.fromkeys(FIELDS_OUT, "")
    for role_field in ("reagents", *_ROLE_FIELDS.values()):
        of_role = [c for c in conditions.components if _ROLE_FIELDS.get(c.role, "reagents") == role_field]
        cells[role_field] = "; ".join(_component(c) for c in of_role)
    split, products = _outcome_cells(outcome.products)
    method = next((p.method for p in outcome.products if p.method), None)
    motif = next((f.motif for f in outcome.failures if f.motif), None)
    cause = next((f.cause for f in outcome.failures if f.cause), None)
    return cells | {
        "code": run.code or "",
        "date": run.date.isoformat() if run.date else "",
        "by": run.by or "",
        "project": run.project or "",
        "series": run.series or "",
        "reference": run.reference or "",
        "scheme": run.scheme,
        "solvent": _solvents(conditions.solvents),
        "temperature": _temperature(conditions.temperature),
        "time": _duration(conditions.time),
        "concentration": _with_unit(conditions.conc_molar, "M"),
        "scale": _with_unit(conditions.scale_mmol, "mmol"),
        "atmosphere": conditions.atmosphere or "",
        "vessel": conditions.vessel or "",
        "workup": conditions.workup or "",
        "split / %": split,
        "products": products,
        "method": str(method or ""),
        "isolated yield / %": plain_number(outcome.isolated_yield_pct),
        "assay yield / %": plain_number(outcome.assay_yield_pct),
        "conversion / %": plain_number(outcome.conversion_pct),
        "ee / %": plain_number(outcome.ee_pct),
        "dr": outcome.dr or "",
        "failed": "; ".join(f.mode for f in outcome.failures),
        "motif": motif or "",
        "cause": str(cause or ""),
        "verdict": str(run.verdict or ""),
        "note": run.note,
        "withdrawn": run.withdrawn_why or "",
        "uuid": str(run.run_id),
    }


def plain_number(value: float | None, factor: int = 1) -> str:
    """Return a number with all its digits and no exponent; "" = None.

    >>> plain_number(0.1), plain_number(88.0), plain_number(0.29, 100)
    ('0.1', '88', '29')
    """
    if value is None:
        return ""
    exact = Decimal(repr(value)) * factor
    text = format(exact, "f")
    return (text.rstrip("0").rstrip(".") if "." in text else text) or "0"


def _with_unit(value: float | None, unit: str) -> str:
    return f"{plain_number(value)} {unit}" if value is not None else ""


def _component(component: Component) -> str:
    def reads_back(text: str) -> bool:
        found = materials_in(text, component.role)
        return len(found) == 1 and found[0].name == component.name and component.smiles in (None, found[0].smiles)

    amounts = [
        f"{plain_number(getattr(component, f))} {u}" for f, u in _AMOUNTS.items() if getattr(component, f) is not None
    ]
    if component.conc_molar is not None:
        amounts.append(f"({plain_number(component.conc_molar)} M)")
    return " ".join([_named(component.name, component.smiles, reads_back), *amounts])


def _solvents(solvents: Sequence[SolventPart]) -> str:
    def written(solvent: SolventPart) -> str:
        def reads_back(text: str) -> bool:
            found = solvents_in(text)
            return len(found) == 1 and found[0].name == solvent.name and solvent.smiles in (None, found[0].smiles)

        name = _named(solvent.name, solvent.smiles, reads_back)
        return f"{name} {plain_number(solvent.parts)}" if solvent.parts is not None else name

    return "; ".join(written(s) for s in solvents)


def _named(name: str, smiles: str | None, reads_back: Callable[[str], bool]) -> str:
    """Return the shortest way to write a name that reads back: bare, in quotes, with its structure in braces."""
    quoted = '"' + name.replace('"', '""') + '"'
    ways = [name, quoted, *([f"{name} {{{smiles}}}", f"{quoted} {{{smiles}}}"] if smiles else [])]
    for way in ways:
        try:
            if _is_one_item(way, name) and reads_back(way):
                return way
        except SidepathError:
            continue
    return quoted


def _is_one_item(text: str, name: str) -> bool:
    """Return whether a list cell that holds this and another item keeps it whole."""
    items = read_materials(f"{text} 1 equiv; x")
    solvents = read_solvents(f"{text} 1; x")
    return len(items) == 2 and items[0].name == name and len(solvents) == 2 and solvents[0][0] == name


def _temperature(temperature: Temperature | None) -> str:
    if temperature is None:
        return ""
    try:
        if parse_temperature(temperature.text) == temperature:
            return temperature.text
        shown = format_temperature(temperature)
        parse_temperature(shown)
        return shown
    except SidepathError:
        return f"{plain_number(temperature.high_c)} °C" if temperature.high_c is not None else temperature.text


def _duration(duration: Duration | None) -> str:
    if duration is None:
        return ""
    try:
        if parse_duration(duration.text) == duration:
            return duration.text
        shown = format_duration(duration)
        parse_duration(shown)
        return shown
    except SidepathError:
        return f"{plain_number(duration.h)} h" if duration.h is not None else duration.text


def _outcome_cells(products: Sequence[ProductSeen]) -> tuple[str, str]:
    """Return the split and the products cell: structures by themselves, the split as a sum where a rest has none."""
    drawn, sums = [], dict[Fate, Decimal]()
    has_rest: dict[Fate, bool] = {}
    for product in products:
        if product.share is not None:
            sums[product.fate] = sums.get(product.fate, Decimal(0)) + Decimal(repr(product.share))
        if product.smiles:
            share = f" {plain_number(product.share, 100)}" if product.share is not None else ""
            drawn.append(f"{product.smiles}{share} ({product.fate})")
        elif product.share is None:
            has_rest.setdefault(product.fate, False)
        else:
            has_rest[product.fate] = True
    split = [
        f"{fate} {plain_number(float(sums[fate]), 100)}" if is_measured else f"{fate} ?"
        for fate, is_measured in has_rest.items()
    ]
    return "; ".join(split), "; ".join(drawn)
