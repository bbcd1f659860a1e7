"""Numbers as typed: one spelling for dashes and degrees, decimal commas, and how a quantity is refused.

It knows no units. A comma is a decimal comma; "1,500" could be 1500 or 1.5 and is refused. Only finite
numbers pass. Messages show the text shortened and without control characters.
"""

from __future__ import annotations

import math
import re
import unicodedata
from typing import NoReturn

from kb.errors import QuantityError

_LONGEST_TEXT = 200

NUMBER = r"[+-]?(?:\d+(?:[.,]\d+)?|[.,]\d+)(?:e[+-]?\d+)?"
"""A number as chemists type it, with sign and exponent; the text is lower case with plain dashes."""

_MINUS = str.maketrans(dict.fromkeys("‐‑‒–—−﹣-", "-"))
_DEGREES = str.maketrans({"º": "°", "˚": "°", "µ": "u", "μ": "u"})
_CONTROL = re.compile(r"[\x00-\x1f\x7f-\x9f]")


def parse_number(text: str, what: str = "number", hint: str = "Write a plain number such as 1.5.") -> float:
    """Return a finite number written with a point or a decimal comma.

    Args:
        text: the number alone, no unit.
        what: the quantity's name, for the message.
        hint: what to write instead, for the message.

    Raises:
        QuantityError: no number, not finite, or a comma that may be a thousands separator.

    >>> parse_number("1,5")
    1.5
    """
    plain = plain_text(text, what, hint)
    if not re.fullmatch(NUMBER, plain):
        refuse(text, what, "is not a number", hint)
    return to_float(plain, text, what)


def format_number(value: float) -> str:
    """Return a number without noise digits or trailing zeros; `parse_number` reads it back to 1 in 10^9."""
    return f"{value + 0.0:.10g}"


def show(text: str) -> str:
    """Return the text fit for a message: no control characters, not long."""
    clean = _CONTROL.sub("?", str(text))
    return clean if len(clean) <= 40 else clean[:37] + "..."


def refuse(text: str, what: str, why: str, hint: str) -> NoReturn:
    """Raise the refusal: which quantity, what was written, why not, what to write."""
    raise QuantityError(f'The {what} "{show(text)}" {why}.', hint, text)


def plain_text(text: str, what: str, hint: str) -> str:
    """Return the text in one spelling: compatibility forms folded, one dash, one degree sign, lower case."""
    if len(text) > _LONGEST_TEXT:
        refuse(text, what, f"is {len(text)} characters long", hint)
    if _CONTROL.search(text.strip()):
        refuse(text, what, "holds control characters", hint)
    folded = unicodedata.normalize("NFKC", text.translate(_DEGREES)).translate(_DEGREES).translate(_MINUS)
    plain = re.sub(r"\s+", " ", folded).strip().casefold()
    if not plain:
        raise QuantityError(f"The {what} is empty.", hint, text)
    return plain


def without_remarks(plain: str) -> str:
    """Return the text without bracketed remarks and "about"."""
    bare = re.sub(r"\s*\([^()]*\)\s*", " ", plain).strip()
    return re.sub(r"^(?:ca\.?|approx\.?|about|around|~|≈)\s*", "", bare or plain)


def to_float(number: str, text: str, what: str) -> float:
    """Return the number; refused when a comma may be a thousands separator, or when it is not finite."""
    if re.fullmatch(r"[+-]?[1-9]\d{0,2},\d{3}", number):
        plain = number.replace(",", "")
        refuse(
            text,
            what,
            "can be read in two ways",
            f"Write {plain} or {number.replace(',', '.')}, whichever is meant.",
        )
    value = float(number.replace(",", "."))
    if not math.isfinite(value):
        refuse(text, what, "is not finite", "Write a number of ordinary size.")
    return value


def number_and_unit(text: str, what: str, hint: str) -> tuple[float, str]:
    """Return the number and what follows it, lower case; refused where the text does not start with a number."""
    plain = without_remarks(plain_text(text, what, hint))
    found = re.fullmatch(rf"({NUMBER})\s*(\D.*)?", plain)
    if not found:
        refuse(text, what, "is not one I can read", hint)
    return to_float(found[1], text, what), (found[2] or "").strip()


def within(value: float, most: float, text: str, what: str, hint: str, too_much: str) -> float:
    """Return the value without float noise; refused below zero or above `most`."""
    if value < 0:
        refuse(text, what, "is negative", hint)
    if value > most:
        refuse(text, what, f"is {too_much}", hint)
    return float(f"{value:.12g}")
