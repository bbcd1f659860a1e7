"""What a cell says of materials and solvents: names, structures in braces, amounts, ratios.

It owns the small language of those cells, which the exports write back; it looks no name up (`lookups.py`). It refuses
an amount without a name and a ratio that does not fit its solvents.

    materials   NaN3 2 equiv; TBAI 10 mol%; HCl 8 equiv (4 M); "any name; even this" 5 mg; Name {SMILES} 1 mL
    solvents    DMF | EtOH:water 3:1 | EtOH/water (3:1) | DCM 9; MeOH 1 | 10% MeOH in DCM
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from kb.errors import InvalidRecord, QuantityError
from kb.exchange.cells import MAX_ITEMS
from kb.plain import quoted
from kb.quantity import parse_amount, parse_concentration, parse_equiv, parse_loading_mol_pct, parse_number

_NUMBER = r"\d+(?:[.,]\d+)?"
_UNIT = r"equivalents?|equiv\.?|eq\.?|mol\s?-?%|mmol|mol|mg|kg|g|ml|[uµμ]l|l|mM|M"
_AMOUNT = rf"{_NUMBER}\s*(?:{_UNIT})"
_LEADING = re.compile(rf"\(?\s*({_AMOUNT})(?![\w%])\s*\)?\s*(?:of\s+)?(?=\S)", re.I)
_TRAILING = re.compile(rf"(?:[\s(,\[=]|(?<=\")|(?<=\}}))\s*({_AMOUNT})\s*[)\]]?\s*$", re.I)
_EQUALS = re.compile(rf"=\s*({_NUMBER})\s*$")
_AMOUNT_NEXT = re.compile(rf"\s*{_AMOUNT}(?![\w%])", re.I)
_STRUCTURE = re.compile(r"\{([^{}\s]+)\}\s*$")
_QUOTED = re.compile(r'"((?:[^"]|"")*)"')


@dataclass(frozen=True, slots=True, kw_only=True)
class MaterialText:
    """One material as a cell gives it.

    Attributes:
        name: as written, amounts taken off.
        smiles: structure given in braces; None = not given.
        amounts: field of `Component` to value, in that field's unit.
    """

    name: str
    smiles: str | None = None
    amounts: dict[str, float] = field(default_factory=dict)


def read_materials(text: str) -> list[MaterialText]:
    """Return the materials of a cell, in order.

    Raises:
        QuantityError: an amount that cannot be, or the same kind of amount twice.
        InvalidRecord: an amount without a name, or more than MAX_ITEMS materials.
    """
    return [_material(item) for item in _items(text, commas=True)]


def read_solvents(text: str) -> list[tuple[str, str | None, float | None]]:
    """Return (name, SMILES in braces or None, parts by volume or None) of each solvent.

    Raises:
        InvalidRecord: as many ratio figures as solvents are not there.
    """
    if text.strip().casefold() in ("neat", "none", "no solvent", "solvent-free"):
        return []
    share = re.fullmatch(rf"\s*({_NUMBER})\s*%\s*(.+?)\s+in\s+(.+?)\s*", text)
    if share:
        part = parse_number(share[1])
        if part < 100:
            return [(share[2], None, part), (share[3], None, 100 - part)]
    items = _items(text, commas=True)
    if len(items) == 1:
        return _mixture(items[0])
    found = []
    for item in items:
        parts = re.fullmatch(rf"(.+?)(?:\s*[:=]\s*|\s+)({_NUMBER})(?:\s*(?:parts?|%|v))?", item)
        name = parts[1] if parts else item
        found.append((*_named(name), parse_number(parts[2]) if parts else None))
    return found


def _items(text: str, *, commas: bool) -> list[str]:
    """Split a cell at `;`, new lines, ` + ` and at commas before a blank, but not inside quotes or before an amount."""
    items, start, quoted = [], 0, False
    for position, character in enumerate(text):
        if character == '"':
            quoted = not quoted
        elif quoted:
            continue
        elif (
            character in ";\n"
            or (
                commas
                and character == ","
                and text[position + 1 : position + 2] == " "
                and not _AMOUNT_NEXT.match(text, position + 1)
            )
            or (character == "+" and text[position - 1 : position] == " " and text[position + 1 : position + 2] == " ")
        ):
            items.append(text[start:position])
            start = position + 1
    items.append(text[start:])
    found = [item.strip() for item in items if item.strip()]
    if len(found) > MAX_ITEMS:
        raise InvalidRecord(f"The cell lists {len(found)} things.", f"Give at most {MAX_ITEMS}.", len(found))
    return found


def _material(item: str) -> MaterialText:
    amounts: dict[str, float] = {}
    rest = item
    equals = _EQUALS.search(rest)
    if equals and not _QUOTED.fullmatch(rest):
        _put(amounts, "equiv", parse_equiv(equals[1]), item)
        rest = rest[: equals.start()]
    while trailing := _TRAILING.search(rest):
        _put(amounts, *_amount(trailing[1]), item)
        rest = rest[: trailing.start()].rstrip(" ,=")
    leading = _LEADING.match(rest)
    if leading and leading.end() < len(rest):
        _put(amounts, *_amount(leading[1]), item)
        rest = rest[leading.end() :]
    name, smiles = _named(rest)
    if not name or re.fullmatch(_AMOUNT, name, re.I):
        raise InvalidRecord(f"{quoted(item)} is an amount of nothing.", "Put the name before the amount.", item)
    return MaterialText(name=name, smiles=smiles, amounts=amounts)


def _named(text: str) -> tuple[str, str | None]:
    rest = text.strip()
    structure = _STRUCTURE.search(rest)
    smiles = None
    if structure:
        smiles, rest = structure[1], rest[: structure.start()].strip()
    quoted = _QUOTED.fullmatch(rest)
    return (quoted[1].replace('""', '"') if quoted else rest), smiles


def _amount(text: str) -> tuple[str, float]:
    """Return the field of `Component` and its value for one amount with its unit."""
    unit = re.sub(r"[\d.,\s]", "", text, count=0)
    folded = unit.casefold()
    if folded.startswith("eq"):
        return "equiv", parse_equiv(text)
    if "%" in folded:
        return "loading_mol_pct", parse_loading_mol_pct(text)
    if unit in ("M", "mM"):
        return "conc_molar", parse_concentration(text)
    amount = parse_amount(text)
    for name in ("amount_mmol", "mass_mg", "volume_ml"):
        value = getattr(amount, name)
        if value is not None:
            return name, value
    raise QuantityError(f"{quoted(text)} is no amount.", "Write it like 5 mmol, 250 mg or 3 mL.", text)


def _put(amounts: dict[str, float], name: str, value: float, item: str) -> None:
    if name in amounts:
        raise QuantityError(f"{quoted(item)} gives the same kind of amount twice.", "Give it once.", item)
    amounts[name] = value


def _mixture(text: str) -> list[tuple[str, str | None, float | None]]:
    """Read one solvent, or several parted by `:` or `/` with a ratio behind ("EtOH:water 3:1")."""
    if _QUOTED.match(text) or "{" in text:
        parts = re.fullmatch(rf"(.+?)\s*(?:[:=]\s*|\s)({_NUMBER})", text)
        return [(*_named(parts[1] if parts else text), parse_number(parts[2]) if parts else None)]
    bare = re.sub(r"\b(?:v/v(?:/v)?|by volume)\b", "", text, flags=re.I).strip()
    ratio = re.search(rf"[\s(]\(?({_NUMBER}(?:\s*[:/]\s*{_NUMBER})+)\)?\s*$", bare)
    numbers = [parse_number(n) for n in re.split(r"\s*[:/]\s*", ratio[1])] if ratio else []
    names_text = bare[: ratio.start()].rstrip(" (") if ratio else bare
    single = re.fullmatch(rf"(.+?)\s*[:=]\s*({_NUMBER})", names_text)
    if single and not ratio:
        return [(*_named(single[1]), parse_number(single[2]))]
    counted = re.fullmatch(rf"(.+?)\s+({_NUMBER})", names_text)
    if counted and not ratio:
        return [(*_named(counted[1]), parse_number(counted[2]))]
    names = [n.strip() for n in re.split(r"\s*[:/]\s*|\s+[-–]\s+|\s+and\s+", names_text) if n.strip()]
    if ratio and len(numbers) != len(names):
        raise InvalidRecord(
            f"{quoted(text)} names {len(names)} solvents and {len(numbers)} parts.",
            "Write it like EtOH:water 3:1.",
            text,
        )
    return [(name, None, numbers[n] if numbers else None) for n, name in enumerate(names)]
