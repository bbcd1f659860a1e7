"""One JSON object being read: fields by kind, a bad one refused with its place, unknown keys refused at the end.

It knows kinds of values, not what they mean. It refuses text that no database keeps (NUL, unpaired surrogates) and
numbers that are none (NaN, infinity). A bad value is shown short and escaped, since anybody may have sent it.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping
from enum import StrEnum
from typing import Any, TypeVar

from kb.errors import InvalidRecord
from kb.plain import quoted

UNKEEPABLE = re.compile("[\x00\ud800-\udfff]")
"""Characters that no UTF-8 file (surrogates) or no PostgreSQL text (NUL) can hold."""

LARGEST_INTEGER = 2**53
"""Integers beyond this do not survive JSON readers that hold numbers as doubles (RFC 8259, section 6)."""

Word = TypeVar("Word", bound=StrEnum)
Part = TypeVar("Part")


class JsonFields:
    """One JSON object being read: says where a bad value stands, and knows which keys nobody asked for."""

    def __init__(self, data: object, place: str) -> None:
        if not isinstance(data, Mapping):
            raise InvalidRecord(f"{place} is {quoted(data)}, not an object.", "Write it as {...}.", data)
        self.data = data
        self.place = place
        self.asked: set[str] = set()

    def _take(self, key: str) -> Any:
        self.asked.add(key)
        return self.data.get(key)

    def refuse(self, key: str, value: object, wanted: str) -> InvalidRecord:
        return InvalidRecord(f"{self.place}.{key} is {quoted(value)}.", f"Give {wanted}.", value)

    def text(self, key: str) -> str | None:
        value = self._take(key)
        if value is None:
            return None
        if not isinstance(value, str):
            raise self.refuse(key, value, "text in quotes")
        if UNKEEPABLE.search(value):
            raise self.refuse(key, value, "text without NUL characters and unpaired surrogates, which no file keeps")
        return value

    def needed(self, key: str) -> str:
        value = self.text(key)
        if value is None:
            raise self.refuse(key, None, "a value; it cannot be left out")
        return value

    def number(self, key: str) -> float | None:
        value = self._take(key)
        if value is None:
            return None
        if isinstance(value, bool) or not isinstance(value, int | float) or abs(value) > 1e300 or math.isnan(value):
            raise self.refuse(key, value, "a number, or null where nothing was recorded")
        return float(value)

    def numbers(self, key: str) -> tuple[float, ...]:
        value = self._take(key)
        if value is None:
            return ()
        if not isinstance(value, list | tuple):
            raise self.refuse(key, value, "a list of numbers in square brackets")
        items = JsonFields({str(n): item for n, item in enumerate(value)}, f"{self.place}.{key}")
        return tuple(items.needed_number(str(n)) for n in range(len(value)))

    def needed_number(self, key: str) -> float:
        value = self.number(key)
        if value is None:
            raise self.refuse(key, None, "a number")
        return value

    def integer(self, key: str, default: int) -> int:
        value = self.whole(key)
        return default if value is None else value

    def whole(self, key: str) -> int | None:
        value = self._take(key)
        if value is None:
            return None
        if isinstance(value, bool) or not isinstance(value, int) or not 0 <= value <= LARGEST_INTEGER:
            raise self.refuse(key, value, "a whole number, zero or more")
        return value

    def claim(self, key: str) -> bool:
        value = self._take(key)
        if not isinstance(value, bool | None):
            raise self.refuse(key, value, "true or false")
        return bool(value)

    def word(self, key: str, words: type[Word]) -> Word | None:
        value = self.text(key)
        if value is None:
            return None
        if value not in set(words):
            raise self.refuse(key, value, f"one of {', '.join(words)}")
        return words(value)

    def needed_word(self, key: str, words: type[Word]) -> Word:
        value = self.word(key, words)
        if value is None:
            raise self.refuse(key, None, f"one of {', '.join(words)}")
        return value

    def parsed(self, key: str, parse: Callable[[str], Part], wanted: str) -> Part | None:
        value = self.text(key)
        if value is None:
            return None
        try:
            return parse(value)
        except (ValueError, OverflowError) as error:
            raise self.refuse(key, value, wanted) from error

    def inner(self, key: str) -> JsonFields:
        value = self._take(key)
        return JsonFields({} if value is None else value, f"{self.place}.{key}")

    def maybe(self, key: str, read: Callable[[JsonFields], Part]) -> Part | None:
        value = self._take(key)
        return None if value is None else read(JsonFields(value, f"{self.place}.{key}"))

    def parts(self, key: str, read: Callable[[JsonFields], Part]) -> tuple[Part, ...]:
        value = self._take(key)
        if value is None:
            return ()
        if not isinstance(value, list | tuple):
            raise self.refuse(key, value, "a list in square brackets")
        return tuple(read(JsonFields(item, f"{self.place}.{key}[{n}]")) for n, item in enumerate(value))

    def finish(self) -> None:
        """Refuse keys that nobody asked for: dropping them would lose what somebody wrote."""
        for key in self.data:
            if key not in self.asked:
                raise InvalidRecord(
                    f"{self.place} has a key {quoted(key)} that this program does not know.",
                    f"Known keys: {', '.join(sorted(self.asked))}.",
                    key,
                )
