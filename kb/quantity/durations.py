"""Reaction times: text to hours and back.

It refuses a time without a unit, a negative one, and one longer than a year.

Conventions (common practice): "overnight" is 16 h, "over the weekend" 64 h (Friday evening to Monday
morning); a range ("2-3 h") becomes its middle. "until ..." keeps its words and has no hours.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from kb.quantity.numbers import NUMBER, format_number, plain_text, refuse, show, to_float, without_remarks

OVERNIGHT_H = 16.0  # common practice
WEEKEND_H = 64.0  # common practice
LONGEST_H = 8760.0  # a year

_TIME_WORDS: dict[str, float] = {
    "overnight": OVERNIGHT_H,
    "over night": OVERNIGHT_H,
    "o/n": OVERNIGHT_H,
    "on": OVERNIGHT_H,
    "weekend": WEEKEND_H,
    "over weekend": WEEKEND_H,
    "over the weekend": WEEKEND_H,
    "half an hour": 0.5,
    "an hour": 1.0,
    "one hour": 1.0,
}
_HOURS: dict[str, float] = {
    **dict.fromkeys(("s", "sec", "secs", "second", "seconds"), 1 / 3600),
    **dict.fromkeys(("min", "mins", "minute", "minutes"), 1 / 60),
    **dict.fromkeys(("h", "hr", "hrs", "hour", "hours"), 1.0),
    **dict.fromkeys(("d", "day", "days"), 24.0),
    **dict.fromkeys(("w", "wk", "wks", "week", "weeks"), 168.0),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Duration:
    """A reaction time.

    Attributes:
        text: as written ("overnight").
        h: hours; None where only words without a customary value were given. "overnight" is 16 h, common
            practice.
    """

    text: str
    h: float | None = None


def parse_duration(text: str) -> Duration:
    """Return a reaction time: `4 h`, `30 min`, `1 h 30 min`, `2 d`, `2-3 h` (its middle), `overnight`.

    "until ..." keeps its words and has no hours.

    Raises:
        QuantityError: unreadable, no unit, negative, or longer than a year.

    >>> parse_duration("90 min").h
    1.5
    """
    what, hint = "time", "Write it like 4 h, 30 min, 2 d or overnight."
    plain = without_remarks(plain_text(text, what, hint))
    words = re.sub(r"[\s.-]+", " ", plain).strip()
    if words in _TIME_WORDS:
        return Duration(text=text.strip(), h=_TIME_WORDS[words])
    if words.startswith("until "):
        return Duration(text=text.strip(), h=None)
    if re.fullmatch(NUMBER, plain):
        refuse(text, what, "has no unit", hint)
    if found := re.fullmatch(rf"({NUMBER})\s*(?:-|to)\s*({NUMBER})\s*([a-z]+)\.?", plain):
        low, high = (to_float(found[i], text, what) for i in (1, 2))
        hours = (low + high) / 2 * _hours_per(found[3], text)
        if high < low:
            refuse(text, what, "runs backwards", hint)
    else:
        pieces = re.findall(rf"({NUMBER})\s*([a-z]+)\.?", plain)
        rest = re.sub(rf"({NUMBER})\s*([a-z]+)\.?", "", plain).replace("and", "").strip(" ,")
        if not pieces or rest:
            refuse(text, what, "is not one I can read", hint)
        numbers = [(to_float(number, text, what), _hours_per(unit, text)) for number, unit in pieces]
        if len({unit for _, unit in numbers}) < len(numbers):
            refuse(text, what, "names a unit twice", hint)
        if any(number < 0 for number, _ in numbers):
            refuse(text, what, "is negative", hint)
        hours = sum(number * unit for number, unit in numbers)
    if hours < 0:
        refuse(text, what, "is negative", hint)
    if hours > LONGEST_H:
        refuse(text, what, "is longer than a year", hint)
    return Duration(text=text.strip(), h=hours)


def format_duration(duration: Duration) -> str:
    """Return the time in the unit that suits it, words kept: `30 min`, `4 h`, `2 d`, `overnight (16 h)`."""
    if duration.h is None:
        return duration.text
    if 0 < duration.h < 1:
        figure = f"{format_number(duration.h * 60)} min"
    elif duration.h >= 48 and (duration.h / 24).is_integer():
        figure = f"{format_number(duration.h / 24)} d"
    else:
        figure = f"{format_number(duration.h)} h"
    return figure if re.search(r"\d", duration.text) or not duration.text else f"{duration.text} ({figure})"


def _hours_per(unit: str, text: str) -> float:
    hours = _HOURS.get(unit)
    if hours is None:
        refuse(text, "time", f"has a unit I do not know ({show(unit)})", "Write s, min, h, d or weeks.")
    return hours
