"""How much: equivalents, loadings, percentages, concentrations and amounts, text to numbers and back.

It converts between units of one kind only; a mass needs the compound before it is an amount of substance, and
that is not known here. Upper limits only catch slips of the pen.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from kb.quantity.numbers import format_number, number_and_unit, refuse, show, within

_EQUIV_WORDS = {"", "equiv", "equivs", "eq", "eqs", "eqv", "eqiv", "equivalent", "equivalents"}
_CONCENTRATIONS: dict[str, float] = {
    **dict.fromkeys(("m", "molar", "mol/l", "mmol/ml"), 1.0),
    **dict.fromkeys(("mm", "millimolar", "mmol/l", "umol/ml"), 1e-3),
    **dict.fromkeys(("um", "micromolar", "umol/l"), 1e-6),
}
_AMOUNTS: dict[str, tuple[str, float, float]] = {
    "mol": ("amount_mmol", 1e3, 1e7),
    "mmol": ("amount_mmol", 1.0, 1e7),
    "umol": ("amount_mmol", 1e-3, 1e7),
    "kg": ("mass_mg", 1e6, 1e9),
    "g": ("mass_mg", 1e3, 1e9),
    "mg": ("mass_mg", 1.0, 1e9),
    "ug": ("mass_mg", 1e-3, 1e9),
    "l": ("volume_ml", 1e3, 1e7),
    "ml": ("volume_ml", 1.0, 1e7),
    "ul": ("volume_ml", 1e-3, 1e7),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Amount:
    """How much, as given: exactly one of the three figures is set.

    Attributes:
        text: as written ("5 mmol").
        amount_mmol: amount of substance [mmol].
        mass_mg: mass [mg].
        volume_ml: volume [mL].
    """

    text: str
    amount_mmol: float | None = None
    mass_mg: float | None = None
    volume_ml: float | None = None


def parse_concentration(text: str) -> float:
    """Return a concentration [mol/L]: `0.2 M`, `200 mM`, `0,2 mol/L`.

    Raises:
        QuantityError: unreadable, no unit, normality, negative, or more than 60 M (water itself is 55.5 M).

    >>> parse_concentration("200 mM")
    0.2
    """
    what, hint = "concentration", "Write it like 0.2 M or 200 mM."
    number, unit = number_and_unit(text, what, hint)
    bare = re.sub(r"[\s·.]", "", unit).replace("dm-3", "/l").replace("l-1", "/l").replace("dm3", "l")
    if bare in ("n", "normal"):
        refuse(text, what, "is a normality, which depends on the reaction", hint)
    # NFKC and casefold leave "M" and "m" alike; molality is not a concentration that a flask is planned in.
    factor = _CONCENTRATIONS.get(bare)
    if factor is None:
        refuse(text, what, f"has a unit I do not know ({show(unit)})" if unit else "has no unit", hint)
    return within(number * factor, 60.0, text, what, hint, "more than any liquid holds")


def parse_equiv(text: str) -> float:
    """Return equivalents to the substrate: `1.5 equiv`, `1,5 eq`, `1.5`, `5 mol%` (0.05).

    Raises:
        QuantityError: unreadable, negative, or more than 10 000.

    >>> parse_equiv("1,5 eq")
    1.5
    """
    what, hint = "number of equivalents", "Write it like 1.5 or 1.5 equiv."
    number, unit = number_and_unit(text, what, hint)
    if _is_mol_pct(unit):
        number /= 100
    elif unit.rstrip(".") not in _EQUIV_WORDS:
        refuse(text, what, f"has a unit I do not know ({show(unit)})", hint)
    return within(number, 10_000.0, text, what, hint, "more than anyone adds")


def parse_loading_mol_pct(text: str) -> float:
    """Return a catalyst loading [mol %]: `5 mol%`, `0.5 mol %`, `0.05 equiv`.

    Raises:
        QuantityError: unreadable, no unit, negative, or more than 1000 mol %.

    >>> parse_loading_mol_pct("5 mol%")
    5.0
    """
    what, hint = "loading", "Write it like 5 mol%."
    number, unit = number_and_unit(text, what, hint)
    if unit.rstrip(".") in ("equiv", "eq", "equivalents"):
        number *= 100
    elif not _is_mol_pct(unit):
        refuse(text, what, f"has a unit I do not know ({show(unit)})" if unit else "has no unit", hint)
    return within(number, 1000.0, text, what, hint, "more than a loading can be")


def parse_percent(text: str, maximum_pct: float = 100.0, what: str = "percentage") -> float:
    """Return a percentage [%]: `88%`, `88`, `8,5 %`. "0.88" is 0.88 %, never 88 %.

    Args:
        text: as written.
        maximum_pct: largest value allowed [%].
        what: the quantity's name, for the message.

    Raises:
        QuantityError: unreadable, negative or above the maximum.

    >>> parse_percent("8,5 %")
    8.5
    """
    hint = f"Write a number from 0 to {maximum_pct:g}, such as 88 or 88 %."
    number, unit = number_and_unit(text, what, hint)
    if unit not in ("", "%", "percent", "pct", "per cent"):
        refuse(text, what, f"has a unit I do not know ({show(unit)})", hint)
    return within(number, maximum_pct, text, what, hint, f"above {maximum_pct:g} %")


def parse_amount(text: str) -> Amount:
    """Return how much: `5 mmol`, `0.2 mol`, `250 mg`, `1,2 g`, `3 mL`, `50 uL`.

    Raises:
        QuantityError: unreadable, no unit, negative, or more than a tonne, 10 000 mol or 10 000 L.

    >>> parse_amount("1,2 g").mass_mg
    1200.0
    """
    what, hint = "amount", "Write it like 5 mmol, 250 mg or 3 mL."
    number, unit = number_and_unit(text, what, hint)
    found = _AMOUNTS.get(unit.rstrip("."))
    if found is None:
        refuse(text, what, f"has a unit I do not know ({show(unit)})" if unit else "has no unit", hint)
    field, factor, most = found
    value = within(number * factor, most, text, what, hint, "more than a laboratory handles")
    return Amount(
        text=text.strip(),
        amount_mmol=value if field == "amount_mmol" else None,
        mass_mg=value if field == "mass_mg" else None,
        volume_ml=value if field == "volume_ml" else None,
    )


def parse_amount_mmol(text: str) -> float:
    """Return an amount of substance [mmol]; a mass or a volume is refused, since it needs the compound.

    Raises:
        QuantityError: as `parse_amount`, or no amount of substance.

    >>> parse_amount_mmol("0.2 mol")
    200.0
    """
    amount = parse_amount(text)
    if amount.amount_mmol is None:
        refuse(text, "scale", "is no amount of substance", "Write it in mmol or mol, like 5 mmol.")
    return amount.amount_mmol


def format_concentration(conc_molar: float) -> str:
    """Return `0.2 M`, or `5 mM` below 0.01 M."""
    if 0 < conc_molar < 0.01:
        return f"{format_number(conc_molar * 1000)} mM"
    return f"{format_number(conc_molar)} M"


def format_equiv(equiv: float) -> str:
    """Return `1.5 equiv`."""
    return f"{format_number(equiv)} equiv"


def format_amount(amount: Amount) -> str:
    """Return the figure that was given, in mmol, mg or mL (mol, g and L from 1000 up)."""
    for value, small, large in (
        (amount.amount_mmol, "mmol", "mol"),
        (amount.mass_mg, "mg", "g"),
        (amount.volume_ml, "mL", "L"),
    ):
        if value is not None:
            is_large = value >= 1000
            return f"{format_number(value / 1000 if is_large else value)} {large if is_large else small}"
    return amount.text


def _is_mol_pct(unit: str) -> bool:
    return re.sub(r"[\s.-]", "", unit) in ("mol%", "molpct", "molpercent", "mole%")
