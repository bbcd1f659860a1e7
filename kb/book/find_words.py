"""Search criteria from words: the flags of `find` and the fields of a search form."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from kb.book.words import parse_date
from kb.errors import QuantityError, QueryError
from kb.plain import excerpt
from kb.record.failure_modes import parse_failure_mode
from kb.vocabulary import CarbonClass, LeavingGroup, Role, Verdict

if TYPE_CHECKING:
    from kb.search.criteria import Criteria

_ROLES = {"any": None, "": None} | {str(r): r for r in (Role.SUBSTRATE, Role.PRODUCT, Role.REAGENT)}
_AS_GIVEN = ("substructure", "similar", "at_least", "exact", "transformation", "words", "solvent", "base", "verdict")
_ALSO_AS_GIVEN = ("carbon_class", "leaving_group", "limit", "page", "project", "reagent", "at_centre", "ignore_stereo")
_TOP_ONLY = ("limit", "page", "order", "any_of", "none_of")
"""What only a whole search has, not the criteria inside it."""
_WORDS_OF = {"verdict": Verdict, "carbon_class": CarbonClass, "leaving_group": LeavingGroup}
_FIELD = re.compile(r"(?:^|\s+and\s+)\s*([a-z]+(?:[-_][a-z]+)*)\s*=(?!=)")


def criteria_from_words(**words: Any) -> Criteria:
    """Build criteria; None and "" mean not asked.

    Args:
        words: fields of Criteria; `any_of` and `none_of` as lists of "field=value and field=value"; `role` as
            "substrate", "product", "reagent" or "any"; `temp_from`, `temp_to` with units; `since`, `until` as ISO
            days; `failed` as a failure mode.

    Raises:
        QueryError: an unknown role or field. QuantityError, InvalidRecord: a value that cannot be read.
    """
    from kb.search.criteria import Criteria

    given = {k: v for k, v in words.items() if v is not None and v != ""}
    fields = {k: given.pop(k) for k in (*_AS_GIVEN, *_ALSO_AS_GIVEN) if k in given}
    role = str(given.pop("role", "any"))
    if role not in _ROLES:
        raise QueryError(f"{role!r} is no role to search in.", "Use substrate, product, reagent or any.", role)
    fields["role"] = _ROLES[role]
    fields |= _bounds(given)
    if "order" in given:
        fields["order"] = given.pop("order")
    for name in ("any_of", "none_of"):
        if name in given:
            fields[name] = tuple(_inner_criteria(text) for text in given.pop(name))
    if "failed" in given:
        fields["failed"] = parse_failure_mode(given.pop("failed"))
    if given:
        raise QueryError(f"A search has no field {min(given)!r}.", "See `sidepath find --help`.", min(given))
    return Criteria(**fields)


def _inner_criteria(text: str) -> Criteria:
    """Read "solvent=DMF and temp-to=40C": criteria inside others, the values in the words of the options of `find`.

    Raises:
        QueryError: no field is named, or one that a search does not have.
    """
    found = list(_FIELD.finditer(text))
    if not found or found[0].start() != 0:
        raise QueryError(
            f"{excerpt(text, 60)!r} names no field to search by.", "Write it as FIELD=VALUE, such as solvent=DMF.", text
        )
    words: dict[str, Any] = {}
    for match, after in zip(found, [*found[1:], None], strict=True):
        name, value = match[1].replace("-", "_"), text[match.end() : after.start() if after else None].strip()
        if name in _TOP_ONLY or name in words or not value:
            what = "has no value" if not value else "stands twice" if name in words else "does not go inside"
            raise QueryError(f"{match[1]} {what} in {excerpt(text, 60)!r}.", "Write FIELD=VALUE once for each.", text)
        words[name] = _value_of(match[1], name, value)
    return criteria_from_words(**words)


def _value_of(shown: str, name: str, text: str) -> Any:
    """Return a value given as text, of the kind that a field holds."""
    if name == "at_least":
        try:
            return float(text)
        except ValueError:
            raise QueryError(f"{shown} is {excerpt(text, 40)!r}.", "Give a number from 0 to 1.", text) from None
    if name == "ignore_stereo":
        if text not in ("yes", "no"):
            raise QueryError(f"{shown} is {excerpt(text, 40)!r}.", "Say yes or no.", text)
        return text == "yes"
    if name in _WORDS_OF:
        try:
            return _WORDS_OF[name](text)
        except ValueError:
            known = ", ".join(map(str, _WORDS_OF[name]))
            raise QueryError(f"{excerpt(text, 40)!r} is no word for {shown}.", f"Use one of: {known}.", text) from None
    return text


def _bounds(given: dict[str, Any]) -> Mapping[str, Any]:
    from kb.quantity import parse_temperature

    found: dict[str, Any] = {}
    for word in ("temp_from", "temp_to"):
        if word in given:
            text = given.pop(word)
            value = parse_temperature(text).high_c
            if value is None:
                raise QuantityError(f"{text!r} gives no number to search by.", "Give degrees, such as 60C.", text)
            found[f"{word}_c"] = value
    for word in ("since", "until"):
        if word in given:
            found[word] = parse_date(given.pop(word))
    return found
