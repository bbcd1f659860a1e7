"""Reading the project's rule tables: TOML to `Rule` values, each checked as it is read.

It owns the field names of `kb/data/liabilities/*.toml` and says which rule and field is wrong. It
compiles no SMARTS (that waits until a rule's conditions are met) and keeps what it read.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache
from typing import Any

from kb import kept
from kb.assess.liability_rule import SIDES, WAYS, Rule
from kb.assess.predicate import parse_predicate
from kb.errors import QueryError
from kb.paths import PACKAGE
from kb.vocabulary import Fate, Severity

_KNOWN = {
    "id",
    "title",
    "motif",
    "product",
    "side",
    "group",
    "where",
    "at",
    "partner",
    "partner_from",
    "when",
    "severity",
    "gives",
    "yields_to",
    "also_caution",
    "mechanism",
    "do_instead",
    "source",
    "source_basis",
    "note",
}
_LEAVING = "Cl,Br,I,$([OX2]S(=O)(=O)[#6])"
"""What `<lg>` in a table stands for: halide or sulfonate."""

_NEEDED = ("id", "title", "when", "severity", "mechanism")


@lru_cache(maxsize=1)
def load_rules() -> tuple[Rule, ...]:
    """Return every shipped rule, in file order; read once.

    Raises:
        QueryError: where a table is wrong; the message names the file and the rule.
    """
    return kept.once("liabilities", _read_rules)


def _read_rules() -> tuple[Rule, ...]:
    import tomllib

    rules: list[Rule] = []
    for path in sorted((PACKAGE / "data" / "liabilities").iterdir(), key=lambda p: p.name):
        if path.name.endswith(".toml"):
            table = tomllib.loads(path.read_text(encoding="utf-8"))
            rules += [build_rule(entry, place=path.name) for entry in table.get("liability", [])]
    seen: set[str] = set()
    for rule in rules:
        if rule.rule_id in seen:
            raise QueryError(f"Two liability rules are called {rule.rule_id}.", "Rename one.", rule.rule_id)
        seen.add(rule.rule_id)
    return tuple(rules)


def build_rule(entry: Mapping[str, Any], *, place: str) -> Rule:
    """Build one rule from its fields.

    Args:
        entry: fields as in the tables.
        place: where it was read, for messages ("house rule").

    Returns:
        The rule; SMARTS are compiled on first use (`compile_motif` checks them beforehand).

    Raises:
        QueryError: where a field is missing, unknown or not of its kind.
    """
    name = str(entry.get("id", "?"))

    def refuse(what: str, hint: str) -> QueryError:
        return QueryError(f"{place}, rule {name}: {what}", hint, name)

    if unknown := sorted(set(entry) - _KNOWN):
        raise refuse(f"{unknown[0]} is no field of a rule.", f"Fields are {', '.join(sorted(_KNOWN))}.")
    if missing := [f for f in _NEEDED if not entry.get(f)]:
        raise refuse(f"{missing[0]} is missing.", "Fill it in.")
    motifs, side = _texts(entry.get("motif")), str(entry.get("side", "bystander"))
    if side not in SIDES or (side == "mixture") is bool(motifs):
        raise refuse(f"side {side} does not fit its motif.", "A mixture has no motif, every other side has one.")
    products = _texts(entry.get("product"))
    if len(products) > 1 and len(products) != len(motifs):
        raise refuse("products and motifs do not pair up.", "Give one product for all, or one for each.")
    yields_to = _texts(entry.get("yields_to"))
    if strange := [word for word in yields_to if word not in WAYS]:
        raise refuse(f"{strange[0]} is no way to react.", f"Ways are {', '.join(WAYS)}.")
    try:
        where = _where(_texts(entry.get("where")))
        return Rule(
            rule_id=name,
            title=str(entry["title"]),
            when=parse_predicate(str(entry["when"])),
            severity=Severity(entry["severity"]),
            mechanism=str(entry["mechanism"]),
            motifs=motifs,
            products=products,
            side=side,
            group=str(entry.get("group", "")),
            where=where,
            at=tuple(int(n) for n in entry.get("at", (1,))),
            partner="".join(_texts(entry.get("partner"))) or None,
            partner_from=str(entry.get("partner_from", "scheme")),
            gives=Fate(entry["gives"]) if entry.get("gives") else None,
            yields_to=yields_to,
            also_caution=_texts(entry.get("also_caution")),
            do_instead=_texts(entry.get("do_instead")),
            source=str(entry.get("source", "")),
            source_basis=str(entry.get("source_basis", "")),
            note=str(entry.get("note", "")),
        )
    except QueryError as error:
        raise refuse(error.message, error.hint) from error
    except ValueError as error:
        raise refuse(str(error), "Use one of the controlled words.") from error


def _where(lines: tuple[str, ...]) -> tuple[Any, ...]:
    if not lines:
        return ()
    from kb.assess.liability_structure import parse_where

    return tuple(parse_where(line) for line in lines)


def _texts(value: object) -> tuple[str, ...]:
    if not value:
        return ()
    texts = (value,) if isinstance(value, str) else tuple(str(v) for v in value)  # type: ignore[attr-defined]
    return tuple(text.replace("<lg>", _LEAVING) for text in texts)
