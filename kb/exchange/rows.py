"""One row of text fields made into one Run, or refused with its column and its reason.

It owns what the fields of `headings.py` mean together: which column gives which part of the run, how columns that share
a part are joined, and the identity of a row. It refuses a row that cannot be understood as a whole; it never drops the
part it did not understand. Two things are kept rather than refused, since a record wants them: a material whose name
the catalogue does not hold (its name stays, without a structure, and is counted), and words where a number was asked
for ("trace", "<5"), which go to the note in square brackets.

A row without a UUID gets one made from its content (RFC 9562 version 5), so the same row read twice, on any machine, is
the same run: that is what finds duplicates and lets an interrupted import be run again.
"""

from __future__ import annotations

import json
import re
from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import lru_cache
from typing import Any
from uuid import UUID, uuid5

from kb.errors import InvalidRecord, SidepathError
from kb.exchange import cells
from kb.exchange.entry_rules import check_run_date
from kb.exchange.headings import AMOUNT_FIELD, IGNORED_FIELDS, ColumnMapping
from kb.exchange.lookups import check_scheme, checked_motif, materials_in, products_seen, solvents_in
from kb.quantity import parse_amount_mmol, parse_concentration, parse_duration, parse_percent, parse_temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.failure_modes import parse_failure_mode
from kb.record.json_fields import UNKEEPABLE
from kb.record.outcome import Failure, Outcome
from kb.record.run import Run
from kb.vocabulary import Fate, Role

CONTENT_NAMESPACE = UUID("7b0c5d3e-52f4-5a0a-9a53-6d1a1c6f2b77")
"""Namespace of the UUIDs made from content; fixed for ever, or old imports would double."""

MATERIAL_FIELDS: dict[str, Role] = {
    "reagents": Role.REAGENT,
    "bases": Role.BASE,
    "acids": Role.ACID,
    "additives": Role.ADDITIVE,
}

_WORDS_FOR_NUMBERS = re.compile(
    r"(?:traces?|quant\.?|quantitative|[<>≤≥~]\s*\d[\d.,]*\s*%?|ca\.?\s*\d[\d.,]*\s*%?|\d+\s*[-–]\s*\d+\s*%?)", re.I
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Rejection:
    """One row that was refused.

    Attributes:
        row: its number as a person counts: the line of a CSV or JSON Lines file, the row of a sheet, the record of a
            structure file.
        column: heading of the cell at fault; None = the row as a whole.
        reason: one or two plain sentences.
    """

    row: int
    column: str | None
    reason: str

    def as_dict(self) -> dict[str, Any]:
        """Return the rejection as JSON values."""
        return {"row": self.row, "column": self.column, "reason": self.reason}


class RowRefused(InvalidRecord):
    """Raised when a row cannot become a run; `value` is (column heading or None, reason)."""

    code = "row-refused"


@dataclass(slots=True)
class RowReader:
    """Rows of one table to runs.

    Attributes:
        mapping: what each column is taken for.
        unknown_names: names that the catalogue does not hold, counted.
    """

    mapping: ColumnMapping
    unknown_names: Counter[str] = field(default_factory=Counter)

    def read(self, values: Sequence[str]) -> Run:
        """Return the run of one row.

        Args:
            values: cells in column order; missing ones at the end are empty.

        Raises:
            RowRefused: the row cannot become a run.
        """
        gathered = self._gather(values)
        return _Row(gathered, self.mapping.date_order, self.unknown_names).run()

    def _gather(self, values: Sequence[str]) -> dict[str, list[tuple[str, str, str | None]]]:
        """Return per field the (heading, text, unit) of its filled cells; amounts are joined to their material."""
        found: dict[str, list[tuple[str, str, str | None]]] = {}
        material: tuple[str, int] | None = None
        for use in self.mapping.columns:
            text = values[use.position] if use.position < len(values) else ""
            if UNKEEPABLE.search(text):
                raise _refused(use.heading, "The cell holds characters that no record can keep.", "Take them out.")
            if use.field == AMOUNT_FIELD:
                if material is not None and cells.is_recorded(text):
                    name, place = material
                    heading, before, unit = found[name][place]
                    found[name][place] = (heading, _with_amount(before, text, use.unit), unit)
                continue
            if use.field is None:
                continue
            if use.field in MATERIAL_FIELDS:
                material = None
            if use.field == "note" or use.field == "scheme":
                is_filled = bool(text.strip())
            else:
                is_filled = cells.is_recorded(text)
            if not is_filled:
                continue
            found.setdefault(use.field, []).append((use.heading, text, use.unit))
            if use.field in MATERIAL_FIELDS:
                material = (use.field, len(found[use.field]) - 1)
        return found


def content_id(content: Any) -> UUID:
    """Return the UUID that a record's text gives, whoever reads it and wherever.

    It is made from what the file says, not from what was understood of it: a later catalogue or parser that understands
    more must not turn an old file into new runs.

    Args:
        content: JSON values, as read.
    """
    return uuid5(CONTENT_NAMESPACE, json.dumps(content, sort_keys=True, ensure_ascii=True, separators=(",", ":")))


class _Row:
    """One row being read; every step names the column it stands in when it refuses."""

    def __init__(
        self,
        found: Mapping[str, list[tuple[str, str, str | None]]],
        date_order: str | None,
        unknown_names: Counter[str],
    ) -> None:
        self.found = found
        self.date_order = date_order
        self.unknown_names = unknown_names
        self.remarks: list[str] = []

    def run(self) -> Run:
        scheme = self._scheme()
        conditions, outcome = self._conditions(), self._outcome(scheme)
        given: dict[str, Any] = {
            "scheme": scheme,
            "conditions": conditions,
            "outcome": outcome,
            "verdict": self._one("verdict"),
            "by": self._text("by"),
            "date": self._one("date"),
            "reference": self._text("reference"),
            "project": self._text("project"),
            "series": self._text("series"),
            "withdrawn_why": self._text("withdrawn"),
        }
        given["note"] = "\n".join([*(text for _, text, _ in self.found.get("note", ())), *self.remarks])
        return Run(**given, run_id=self._one("uuid") or content_id(self._as_written()))

    def _as_written(self) -> dict[str, list[list[str | None]]]:
        return {
            name: [[" ".join(text.split()), unit] for _, text, unit in filled]
            for name, filled in self.found.items()
            if name not in ("uuid", *IGNORED_FIELDS)
        }

    def _scheme(self) -> str:
        heading, text, _ = self._cell("scheme") or ("", "", None)
        if not text:
            substrate, product = self._cell("substrate"), self._cell("product")
            if substrate is None:
                raise _refused(None, "The row has no scheme.", "Give a reaction SMILES or a substrate.")
            heading = substrate[0]
            text = f"{substrate[1].strip()}>>{product[1].strip() if product else ''}"
        text = text.strip()
        self._at(heading, check_scheme, text)
        return text

    def _conditions(self) -> Conditions:
        components: list[Component] = []
        for name, role in MATERIAL_FIELDS.items():
            for heading, text, _ in self.found.get(name, ()):
                components += self._at(heading, lambda t, r=role: materials_in(t, r, self.unknown_names), text)
        solvents: list[SolventPart] = []
        for heading, text, _ in self.found.get("solvent", ()):
            solvents += self._at(heading, lambda t: solvents_in(t, self.unknown_names), text)
        return Conditions(
            components=tuple(components),
            solvents=tuple(solvents),
            temperature=self._one("temperature"),
            time=self._one("time"),
            conc_molar=self._one("concentration"),
            scale_mmol=self._one("scale"),
            atmosphere=self._text("atmosphere"),
            vessel=self._text("vessel"),
            workup=self._text("workup"),
        )

    def _outcome(self, scheme: str) -> Outcome:
        method = self._one("method")
        split = list(self._one("split") or ())
        for fate in Fate:
            share = self._one(f"share {fate}")
            if share is not None:
                if fate in dict(split):
                    raise _refused(f"share {fate}", f"{fate} is in the split already.", "Give it once.")
                split.append((fate, share))
        products: list[cells.ProductText] = []
        for heading, text, unit in self.found.get("products", ()):
            products += self._at(heading, lambda t, u=unit: cells.read_products(t, per=_per(u)), text)
        return Outcome(
            products=self._at("products", lambda _: products_seen(split, products, method, scheme), ""),
            isolated_yield_pct=self._one("isolated yield"),
            assay_yield_pct=self._one("assay yield"),
            conversion_pct=self._one("conversion"),
            ee_pct=self._one("ee"),
            dr=self._text("dr"),
            failures=self._failures(),
        )

    def _failures(self) -> tuple[Failure, ...]:
        motif, cause = self._one("motif"), self._one("cause")
        modes: list[str] = []
        for heading, text, _ in self.found.get("failed", ()):
            for word in re.split(r"[;,\n]", text):
                if word.strip():
                    modes.append(self._at(heading, parse_failure_mode, word))
        if motif and not modes:
            raise _refused("motif", "A motif without a failure mode.", "Say what happened in the column `failed`.")
        return tuple(
            Failure(mode=m, motif=motif if not n else None, cause=cause) for n, m in enumerate(dict.fromkeys(modes))
        )

    def _cell(self, name: str) -> tuple[str, str, str | None] | None:
        cells_found = self.found.get(name)
        return cells_found[0] if cells_found else None

    def _text(self, name: str) -> str | None:
        cell = self._cell(name)
        return cell[1].strip() if cell else None

    def _one(self, name: str) -> Any:
        """Read the field's cell; words that stand for a number go to the note instead."""
        cell = self._cell(name)
        if cell is None:
            return None
        heading, text, unit = cell
        bare = text.strip()
        if name in _NUMBERS and _WORDS_FOR_NUMBERS.fullmatch(bare):
            self.remarks.append(f"[{heading}: {bare}]")
            return None
        if name == "date":
            return self._at(heading, lambda t: check_run_date(cells.read_date(t, self.date_order)), bare)
        return self._at(heading, lambda t: _parsed(name, t, unit), bare)

    def _at(self, heading: str, read: Any, text: str) -> Any:
        try:
            return read(text)
        except RowRefused:
            raise
        except SidepathError as error:
            raise RowRefused(error.message, error.hint, (heading or None, str(error))) from error


@lru_cache(maxsize=16_384)
def _parsed(name: str, text: str, unit: str | None) -> Any:
    """Return the value of one cell; the same few texts fill a column, so they are read once."""
    return _READERS[name](text, unit)


def _percentage(name: str, maximum: float) -> Callable[[str, str | None], float]:
    def read(text: str, unit: str | None) -> float:
        if unit == "fraction":
            return round(cells.read_share(text, per=1) * 100, 10)
        return parse_percent(text, maximum, name)

    return read


def _refused(column: str | None, reason: str, hint: str) -> RowRefused:
    return RowRefused(reason, hint, (column, f"{reason} {hint}"))


def _uuid(text: str) -> UUID:
    try:
        return UUID(text.strip())
    except ValueError as error:
        raise InvalidRecord(f"{ascii(text)[:60]} is no UUID.", "Leave it empty for a new run.", text) from error


def _per(unit: str | None) -> float:
    return 1.0 if unit == "fraction" else 100.0


def _in_unit(text: str, unit: str | None) -> str:
    """Return the text with the heading's unit behind it where it is a bare number ("60", "0,2", "10-12")."""
    bare = text.strip()
    if unit and re.fullmatch(r"-?\d+(?:[.,]\d+)?(?:\s*[-–]\s*\d+(?:[.,]\d+)?)?", bare):
        return f"{bare} {unit}"
    return text


def _with_amount(material: str, text: str, unit: str | None) -> str:
    amount = _in_unit(text, unit or "equiv").strip()
    if ";" in material or "\n" in material:
        raise _refused(AMOUNT_FIELD, "One amount for several materials.", "Write each amount behind its material.")
    return f"{material.strip()} {amount}"


_NUMBERS = frozenset({"isolated yield", "assay yield", "conversion", "ee", *(f"share {fate}" for fate in Fate)})

_READERS: dict[str, Callable[[str, str | None], Any]] = {
    "verdict": lambda text, _: cells.read_verdict(text),
    "uuid": lambda text, _: _uuid(text),
    "temperature": lambda text, unit: parse_temperature(_in_unit(text, unit)),
    "time": lambda text, unit: parse_duration(_in_unit(text, unit)),
    "concentration": lambda text, unit: parse_concentration(_in_unit(text, unit)),
    "scale": lambda text, unit: parse_amount_mmol(_in_unit(text, unit)),
    "method": lambda text, _: cells.read_method(text),
    "split": lambda text, unit: tuple(cells.read_split(text, per=_per(unit))),
    "isolated yield": _percentage("isolated yield", 200),
    "assay yield": _percentage("assay yield", 200),
    "conversion": _percentage("conversion", 100),
    "ee": _percentage("ee", 100),
    "motif": lambda text, _: checked_motif(text),
    "cause": lambda text, _: cells.read_cause(text),
    **{f"share {fate}": lambda text, unit: cells.read_share(text, per=_per(unit)) for fate in Fate},
}
"""How the cell of each field that takes one value is read: text and the heading's unit to the value."""
