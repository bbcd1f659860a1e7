"""Temperatures: text to degC and back, single values and programmes.

It refuses what lies below absolute zero or above 1000 degC, and a bare number above 250, which may be kelvin.

Conventions (common practice, not measurements): room temperature is 22 degC (20 to 25 is meant), an ice bath
0, dry ice in acetone -78; a bare number of 250 or less is in degC. "reflux" has no number until a solvent gives
one; "reflux (66 C)" has.
Factors: 0 degC = 273.15 K exactly (SI); degF by its definition.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from kb.quantity.numbers import NUMBER, format_number, plain_text, refuse, to_float, without_remarks

ROOM_TEMPERATURE_C = 22.0  # common practice: 20 to 25 degC
ABSOLUTE_ZERO_C = -273.15
HIGHEST_C = 1000.0  # flash pyrolysis stays below; more is a slip of the pen
HIGHEST_BARE_C = 250.0  # above it a number without a unit may well be kelvin

_BATHS = {
    "ice": 0.0,
    "ice bath": 0.0,
    "ice-bath": 0.0,
    "ice water": 0.0,
    "ice-water": 0.0,
    "ice/water": 0.0,
    "ice water bath": 0.0,
    "dry ice": -78.0,
    "dry ice/acetone": -78.0,
    "dry ice acetone": -78.0,
}
_ROOM = re.compile(r"(?:room|ambient)(?: temp(?:erature)?)?|r\.? ?t|rt|r\.t|amb")
_REFLUX = re.compile(r"(?:at |heat(?:ed|ing)? (?:at |to )?)?(?:reflux(?:ing|ed)?|rfx)")
_TEMPERATURE = re.compile(
    rf"({NUMBER})\s*(?:(?:°|deg(?:rees?)?\.?|o(?=[cfk]\b))\s*)?(celsius|c|kelvin|k|fahrenheit|f)?"
)
_REFLUX_WITH_NUMBER = re.compile(
    r"(?:reflux(?:ing)?|rfx)\s*[,;(@]\s*([^()]*\d[^()]*?)\)?|([^()]*\d[^()]*?)\s*[,;(]\s*reflux\)?"
)
_RANGE = re.compile(rf"({NUMBER})\s*-\s*({NUMBER})(\D.*)?")


@dataclass(frozen=True, slots=True, kw_only=True)
class Temperature:
    """A bath temperature or a programme of several.

    Attributes:
        text: as written ("0C to rt"); shown wherever the value is.
        start_c: first temperature [degC]; None where only words were given ("reflux").
        end_c: last temperature [degC]; equals start_c for a single value; None as above.
        is_reflux: the text says reflux, so the solvent's boiling point is meant for a stage without a number.
        between_c: temperatures between the first and the last [degC], for a programme of three or more.
    """

    text: str
    start_c: float | None = None
    end_c: float | None = None
    is_reflux: bool = False
    between_c: tuple[float, ...] = ()

    @property
    def known_c(self) -> tuple[float, ...]:
        """Return every temperature that has a number [degC], in order; empty for "reflux"."""
        return tuple(t for t in (self.start_c, *self.between_c, self.end_c) if t is not None)

    @property
    def high_c(self) -> float | None:
        """Return the most forcing temperature [degC]; None where no number says it, as at reflux."""
        return None if self.is_reflux else max(self.known_c, default=None)

    @property
    def low_c(self) -> float | None:
        """Return the least forcing temperature that has a number [degC], or None."""
        return min(self.known_c, default=None)


def parse_temperature(text: str) -> Temperature:
    """Return a temperature or a programme: `60C`, `333 K`, `140 F`, `rt`, `reflux`, `0C to rt`, `rt/60`.

    A unit given once serves its neighbours ("0 -> 25 °C"). Remarks in brackets and "ca." are passed over.

    Raises:
        QuantityError: unreadable, not finite, below absolute zero, above 1000 degC, or bare and above 250.

    >>> parse_temperature("0C to rt").end_c
    22.0
    """
    what, hint = "temperature", "Write it like 60C, 333 K, rt, reflux or 0C to rt."
    plain = plain_text(text, what, hint)
    if found := _REFLUX_WITH_NUMBER.fullmatch(plain):
        plain = found[1] or found[2]
    plain = re.sub(r"\s*-\s*(?=(?:rt|r\.t|room|ambient|reflux)\b)", " to ", without_remarks(plain))
    if plain in _BATHS:
        return Temperature(text=text.strip(), start_c=_BATHS[plain], end_c=_BATHS[plain])
    stages: list[tuple[float | None, str | None]] = []
    for piece in re.split(r"\s*(?:->|=>|→|⇒|➔|\bthen\b|\bto\b|/|;|\band\b)\s*", plain):
        stages.extend(_temperature_stages(piece.strip(" ,"), text))
    units = [unit for value, unit in stages if unit in ("c", "k", "f")]
    values: list[float | None] = []
    for position, (value, unit) in enumerate(stages):
        if value is None or unit == "word":
            values.append(value)
            continue
        if unit is None and units:
            following = [u for v, u in stages[position:] if u in ("c", "k", "f")]
            unit = following[0] if following else units[-1]
        values.append(_celsius(value, unit, text))
    is_reflux = any(value is None for value in values)
    inner = tuple(v for v in values[1:-1] if v is not None)
    return Temperature(
        text=text.strip(), start_c=values[0], end_c=values[-1], is_reflux=is_reflux, between_c=inner
    )


def format_temperature(temperature: Temperature) -> str:
    """Return the temperature in degC, words kept beside: `60 °C`, `rt (22 °C)`, `0C to rt (0 to 22 °C)`."""
    known = temperature.known_c
    if not known or temperature.is_reflux:
        return temperature.text
    numbers = [format_number(round(v, 6)) for v in known]
    if len(known) > 1 and len(set(known)) == 1 and not temperature.between_c:
        numbers = numbers[:1]
    figure = " to ".join(numbers) + " °C"
    words = re.sub(r"\b(to|then|and|deg\w*)\b", "", temperature.text.casefold())
    if not re.search(r"[a-z]\.?[a-z]", words):
        return figure
    return temperature.text if figure in temperature.text else f"{temperature.text} ({figure})"


def _temperature_stages(piece: str, text: str) -> list[tuple[float | None, str | None]]:
    """Return (value, unit) of one piece, two for a range; unit "word" = already degC, value None = reflux."""
    if _ROOM.fullmatch(piece.rstrip(".")):
        return [(ROOM_TEMPERATURE_C, "word")]
    if _REFLUX.fullmatch(piece):
        return [(None, "word")]
    if piece in _BATHS:
        return [(_BATHS[piece], "word")]
    piece = re.sub(r"\s*(?:oil )?bath$", "", piece)
    if (found := _RANGE.fullmatch(piece)) and (last := _TEMPERATURE.fullmatch(found[2] + (found[3] or ""))):
        unit = last[2][0] if last[2] else None
        return [
            (to_float(found[1], text, "temperature"), unit),
            (to_float(last[1], text, "temperature"), unit),
        ]
    if single := _TEMPERATURE.fullmatch(piece):
        return [(to_float(single[1], text, "temperature"), single[2][0] if single[2] else None)]
    refuse(text, "temperature", "is not one I can read", "Write it like 60C, 333 K, rt, reflux or 0C to rt.")


def _celsius(value: float, unit: str | None, text: str) -> float:
    if unit is None and value > HIGHEST_BARE_C:
        number = format_number(value)
        refuse(
            text,
            "temperature",
            "has no unit and is too high to take for degrees Celsius",
            f"Write {number} K or {number} C, whichever is meant.",
        )
    celsius = value - 273.15 if unit == "k" else (value - 32) / 1.8 if unit == "f" else value
    if celsius < ABSOLUTE_ZERO_C - 1e-9:
        refuse(
            text, "temperature", "is below absolute zero (-273.15 °C, 0 K)", "Check the sign and the unit."
        )
    if celsius > HIGHEST_C:
        refuse(
            text,
            "temperature",
            f"is above {HIGHEST_C:g} °C, hotter than any flask",
            "Check the number and the unit.",
        )
    return round(celsius, 9)
