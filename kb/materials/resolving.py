"""Words at the command line to record values: "NaN3=1.5", "DMF:3", "THF/H2O 4:1", a SMILES where no name fits.

It owns the little grammar of `NAME=AMOUNT` and `NAME:PARTS`. It refuses a name that is neither in the catalogue
nor a structure, with the nearest names; a near miss is never taken.

`=` and `:` also occur inside SMILES, so the text as a whole is tried first; then what follows the last sign is taken
for an amount only where it reads as one and what stands before it means something.
"""

from __future__ import annotations

import re

from kb.errors import NameUnknown
from kb.materials.labels import plain_name
from kb.materials.names import ParsedMaterial, find_material, parse_material, unknown_name
from kb.materials.structural import canonical_smiles
from kb.quantity import format_number, parse_amount, parse_equiv, parse_loading_mol_pct, parse_number
from kb.record.component import Component, SolventPart
from kb.vocabulary import Role


def resolve_component(text: str, role: Role) -> Component:
    """Return the component that "NaN3", "NaN3=1.5", "Pd/C=5 mol%", "HCl=4 mL" or a SMILES stands for.

    Args:
        text: name or SMILES, then perhaps "=" and equivalents, mol %, mmol, mg or mL.
        role: what it does in the flask.

    Returns:
        The component; its name as written, its SMILES canonical (None for a mixture such as celite).

    Raises:
        NameUnknown: neither a name in the catalogue nor a structure.
        QuantityError: the amount cannot be read.
    """
    name, amount = _split(text, "=", None, _AMOUNT)
    material, smiles = _meaning(name, None)
    fields: dict[str, float | None] = {"conc_molar": material.conc_molar if material else None}
    if amount is not None:
        fields |= _amount_fields(amount)
    return Component(role=role, name=plain_name(name), smiles=smiles, **fields)


def resolve_solvent(text: str) -> SolventPart:
    """Return the solvent part that "DMF", "DMF:3", "80% EtOH" or a SMILES stands for; parts None where not given.

    A label keeps its words in the name ("aq. acetone"); the water in it is counted by `medium.py`.

    Raises:
        NameUnknown: neither a solvent in the catalogue nor a structure, or several solvents in one text.
        QuantityError: the parts cannot be read.
    """
    parts = resolve_solvents(text)
    if len(parts) != 1:
        names = ", ".join(f"{p.name}:{format_number(p.parts)}" if p.parts is not None else p.name for p in parts)
        raise NameUnknown(f'"{plain_name(text)}" names several solvents.', f"Give them one by one: {names}.", text)
    return parts[0]


def resolve_solvents(text: str) -> tuple[SolventPart, ...]:
    """Return the solvents of "THF/H2O 4:1", "MeOH-DCM (1:9)", "THF and water"; one for a single solvent.

    Raises:
        NameUnknown: one of them is neither a solvent in the catalogue nor a structure.
        QuantityError: the parts cannot be read.
    """
    whole = plain_name(text)
    if found := _RATIO.fullmatch(whole):
        ratio = [parse_number(n.strip(), "number of parts") for n in found[2].split(":")]
        for separator in ("/", "-", ":", ",", "+", " and "):
            if names := _all_solvents(found[1].split(separator), len(ratio)):
                return tuple(_one_solvent(n, r) for n, r in zip(names, ratio, strict=True))
    for separator in ("/", " and ", "+"):
        if names := _all_solvents(whole.split(separator), None):
            return tuple(_one_solvent(n, None) for n in names)
    name, parts = _split(text, ":", "solvent", _PARTS)
    return (_one_solvent(name, parse_number(parts, "number of parts") if parts else None),)


_RATIO = re.compile(r"(.+?)[\s,(]+((?:\d+(?:[.,]\d+)?\s*:\s*)+\d+(?:[.,]\d+)?)\)?")
_PARTS = re.compile(r"\s*[-+]?\d+(?:[.,]\d+)?\s*")
_AMOUNT = re.compile(r"\s*[-+]?[\d.,].*")


def _all_solvents(texts: list[str], count: int | None) -> list[str]:
    """Return the names where there are several (or just `count`) and every one is a solvent; else none."""
    names = [t.strip() for t in texts]
    enough = len(names) == count if count else len(names) > 1
    return names if enough and all(find_material(n, "solvent").exact for n in names) else []


def _one_solvent(name: str, parts: float | None) -> SolventPart:
    _, smiles = _meaning(name, "solvent")
    return SolventPart(name=plain_name(name), smiles=smiles, parts=parts)


def _meaning(name: str, kind: str | None) -> tuple[ParsedMaterial | None, str | None]:
    """Return the material and its SMILES; the material None for a structure that is in no table."""
    match = find_material(name, kind)
    if match.exact is not None:
        return parse_material(name, kind), match.exact.smiles
    smiles = canonical_smiles(name)
    if smiles is None:
        raise unknown_name(name, match, kind)
    return None, smiles


def _split(text: str, sign: str, kind: str | None, figure: re.Pattern[str]) -> tuple[str, str | None]:
    """Return (name, amount) split at the last sign, or the whole text where the sign belongs to a SMILES."""
    name, found, amount = text.rpartition(sign)
    if not found or not name.strip():
        return text, None
    if find_material(name, kind).exact is not None:
        return name, amount
    if not figure.fullmatch(amount) or (canonical_smiles(name) is None and canonical_smiles(text) is not None):
        return text, None
    return name, amount


def _amount_fields(text: str) -> dict[str, float | None]:
    """Return the field that the amount belongs to: equivalents where no other unit is written."""
    if "%" in text:
        return {"loading_mol_pct": parse_loading_mol_pct(text)}
    if re.search(r"(?:[mu]?mol|[kmu]?g|[mu]?l)\.?\s*$", text.casefold().replace("µ", "u")):
        amount = parse_amount(text)
        return {"amount_mmol": amount.amount_mmol, "mass_mg": amount.mass_mg, "volume_ml": amount.volume_ml}
    return {"equiv": parse_equiv(text)}
