"""Search criteria from words: the flags of `find` and the fields of a search form."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from kb.book.words import parse_date
from kb.errors import QuantityError, QueryError
from kb.record.failure_modes import parse_failure_mode
from kb.vocabulary import Role

if TYPE_CHECKING:
    from kb.search.criteria import Criteria

_ROLES = {"any": None, "": None} | {str(r): r for r in (Role.SUBSTRATE, Role.PRODUCT, Role.REAGENT)}
_AS_GIVEN = ("substructure", "similar", "at_least", "exact", "transformation", "words", "solvent", "base", "verdict")
_ALSO_AS_GIVEN = ("carbon_class", "leaving_group", "limit", "page", "project", "reagent", "at_centre")


def criteria_from_words(**words: Any) -> Criteria:
    """Build criteria; None and "" mean not asked.

    Args:
        words: fields of Criteria; `role` as "substrate", "product", "reagent" or "any"; `temp_from`, `temp_to` with
            units; `since`, `until` as ISO days; `failed` as a failure mode.

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
    if "failed" in given:
        fields["failed"] = parse_failure_mode(given.pop("failed"))
    if given:
        raise QueryError(f"A search has no field {min(given)!r}.", "See `sidepath find --help`.", min(given))
    return Criteria(**fields)


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
