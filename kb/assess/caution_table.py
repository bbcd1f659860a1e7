"""Reading the hazard table: TOML to frozen values.

It owns the field names of `kb/data/cautions.toml`; what they mean for a mixture is `caution`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

from kb import kept
from kb.assess.predicate import Predicate, parse_predicate
from kb.errors import QueryError
from kb.paths import PACKAGE
from kb.vocabulary import Severity


@dataclass(frozen=True, slots=True, kw_only=True)
class CautionRule:
    """One row of the table; all that is given must hold.

    Attributes:
        rule_id, group, title, severity: as shown; of one group the most severe is told.
        consequence: what may happen.
        do: the usual precautions.
        source: where it stands written, with "(memory)" where it was not opened.
        when: condition line; None = none.
        motifs: SMARTS, each to be found somewhere in the mixture or the product.
        workup, workup_when: words in the work-up that count as an alternative to `when`, and its own condition.
        any_acid: where `workup_when` holds, an acid in the flask counts even if it is taken up.
        needs_closed_vessel: the vessel must be said to be closed.
        min_scale_mmol: least scale [mmol].
    """

    rule_id: str
    group: str
    title: str
    severity: Severity
    consequence: str
    do: tuple[str, ...]
    source: str
    when: Predicate | None = None
    motifs: tuple[str, ...] = ()
    workup: tuple[str, ...] = ()
    workup_when: Predicate | None = None
    any_acid: bool = False
    needs_closed_vessel: bool = False
    min_scale_mmol: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class AzideOverride:
    """A motif that makes an organic azide worse than its carbon-nitrogen ratio says."""

    motif: str
    why: str
    severity: Severity


@dataclass(frozen=True, slots=True, kw_only=True)
class PeroxideFormer:
    """A liquid that forms peroxides; class A explodes as it is, B when concentrated; test after `months`."""

    name: str
    smiles: str
    peroxide_class: str
    months: int


@dataclass(frozen=True, slots=True, kw_only=True)
class CautionTable:
    """The whole table."""

    rules: tuple[CautionRule, ...]
    azide_overrides: tuple[AzideOverride, ...]
    peroxide_formers: tuple[PeroxideFormer, ...]
    peroxide_text: Mapping[str, str]
    defer: str


@lru_cache(maxsize=1)
def load_cautions() -> CautionTable:
    """Return the table, read once.

    Raises:
        QueryError: where a row is wrong; the message names it.
    """
    return kept.once("cautions", _read_table)


def _read_table() -> CautionTable:
    import tomllib

    table = tomllib.loads((PACKAGE / "data" / "cautions.toml").read_text(encoding="utf-8"))
    return CautionTable(
        rules=tuple(_rule(row) for row in table["caution"]),
        azide_overrides=tuple(
            AzideOverride(motif=r["motif"], why=r["why"], severity=Severity(r["severity"]))
            for r in table["azide_override"]
        ),
        peroxide_formers=tuple(
            PeroxideFormer(name=r["name"], smiles=r["smiles"], peroxide_class=r["class"], months=r["months"])
            for r in table["peroxide_former"]
        ),
        peroxide_text=table["peroxide_text"],
        defer=table["texts"]["defer"],
    )


def _rule(row: Mapping[str, Any]) -> CautionRule:
    try:
        basis = row.get("source_basis", "")
        return CautionRule(
            rule_id=row["id"],
            group=row["group"],
            title=row["title"],
            severity=Severity(row["severity"]),
            consequence=row["consequence"],
            do=tuple(row["do"]),
            source=f"{row['source']} ({basis})" if basis else row["source"],
            when=parse_predicate(row["when"]) if "when" in row else None,
            motifs=tuple(row.get("motifs", ())),
            workup=tuple(row.get("workup", ())),
            workup_when=parse_predicate(row["workup_when"]) if "workup_when" in row else None,
            any_acid=bool(row.get("any_acid", False)),
            needs_closed_vessel=bool(row.get("closed_vessel", False)),
            min_scale_mmol=row.get("min_scale_mmol"),
        )
    except (KeyError, ValueError) as error:
        raise QueryError(f"cautions.toml, {row.get('id', '?')}: {error}", "Mend the row.", row.get("id")) from error
