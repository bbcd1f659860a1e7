"""An entry form as text, and the run it stands for: pure reading and writing, errors by field.

Every field is read on its own, so that one bad field never hides the others. An empty field is "not
recorded", "0" is a measured zero, "seen" (or "trace") is seen but not measured. Integrals become shares by
`kb.record.split`.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from kb.chem.facts import Reading
from kb.errors import QuantityError, SidepathError
from kb.quantity import format_number, parse_number, parse_percent
from kb.record.finding import Interval
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Run
from kb.record.split import Signal, split_from_signals
from kb.vocabulary import Cause, Fate, Method, Verdict
from tui.plan_state import read_plan
from tui.ports import BookPort

INTEGRALS = "integrals"
SHARES = "shares"
ROWS_MAX = 10
"""Products that the form lists; more than these are added by hand."""

SEEN_WORDS = ("seen", "trace", "traces")

FIGURES: tuple[tuple[str, str, float], ...] = (
    ("isolated", "Isolated yield", 200.0),
    ("assay", "Assay yield", 200.0),
    ("conversion", "Conversion", 100.0),
    ("ee", "ee", 100.0),
)
"""Field, word and largest value [%]; yields above 100 are kept, since wet product happens."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ProductRow:
    """One product that may have formed."""

    fate: Fate
    smiles: str = ""
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class RowShare:
    """What one row comes to; None = not looked for or not measured."""

    share: Interval | None = None
    is_seen: bool = False
    error: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class SplitRead:
    """All rows read, and what they add up to (a share of 1 = all accounted for); None = nothing measured."""

    rows: tuple[RowShare, ...]
    total: float | None = None
    error: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class EntryRead:
    """The run, or why it cannot be built yet; `remarks` are what does not add up in it."""

    run: Run | None
    errors: Mapping[str, SidepathError] = field(default_factory=dict)
    remarks: tuple[str, ...] = ()


def possible_rows(reading: Reading | None) -> tuple[ProductRow, ...]:
    """Return the products to ask about: what could form, then the substrate left over."""
    rows: list[ProductRow] = []
    for possible in reading.possible if reading else ():
        row = ProductRow(fate=possible.fate, smiles=possible.product, note=possible.note)
        if all(row.smiles != other.smiles or row.fate != other.fate for other in rows):
            rows.append(row)
    rows = rows[: ROWS_MAX - 1]
    if all(row.fate is not Fate.UNREACTED for row in rows):
        smiles = reading.substrate or "" if reading else ""
        rows.append(ProductRow(fate=Fate.UNREACTED, smiles=smiles, note="substrate left over"))
    return tuple(rows)


def rows_in(state: Mapping[str, str]) -> tuple[ProductRow, ...]:
    """Return the rows that a state holds."""
    rows = []
    for number in range(int(state.get("p.count", "0") or 0)):
        word = state.get(f"p{number}.fate", "other")
        fate = Fate(word) if word in set(map(str, Fate)) else Fate.OTHER
        rows.append(
            ProductRow(fate=fate, smiles=state.get(f"p{number}.smiles", ""), note=state.get(f"p{number}.note", ""))
        )
    return tuple(rows)


def with_rows(state: Mapping[str, str], rows: Sequence[ProductRow]) -> dict[str, str]:
    """Return the state with these rows; what was filled in for a product that stays is kept with it."""
    filled = {}
    for number, row in enumerate(rows_in(state)):
        kept = {k: state.get(f"p{number}.{k}", "") for k in ("value", "protons")}
        if kept["value"]:
            filled[row.fate, row.smiles] = (row, kept)
    wanted = list(rows)
    for key, (row, _) in filled.items():
        if all((r.fate, r.smiles) != key for r in wanted):
            wanted.append(row)
    new = {k: v for k, v in state.items() if not (k.startswith("p") and "." in k)}
    new["p.count"] = str(len(wanted))
    for number, row in enumerate(wanted):
        kept = filled.get((row.fate, row.smiles), (row, {"value": "", "protons": ""}))[1]
        new.update({f"p{number}.fate": str(row.fate), f"p{number}.smiles": row.smiles, f"p{number}.note": row.note})
        new.update({f"p{number}.{k}": v for k, v in kept.items()})
    return new


def read_split(state: Mapping[str, str]) -> SplitRead:
    """Read the figures of all rows."""
    rows = rows_in(state)
    is_integrals = state.get("how", INTEGRALS) == INTEGRALS
    signals: dict[str, Signal] = {}
    shares: dict[int, RowShare] = {}
    for number in range(len(rows)):
        text = state.get(f"p{number}.value", "").strip()
        if not text:
            shares[number] = RowShare()
        elif text.casefold() in SEEN_WORDS:
            shares[number] = RowShare(is_seen=True)
        else:
            try:
                if is_integrals:
                    signals[str(number)] = _signal(text, state.get(f"p{number}.protons", ""))
                else:
                    share = parse_percent(text) / 100
                    shares[number] = RowShare(share=Interval(mean=share, low=share, high=share), is_seen=True)
            except QuantityError as error:
                shares[number] = RowShare(error=str(error))
    total: float | None = None
    trouble = ""
    if signals:
        try:
            for label, interval in split_from_signals(signals).shares:
                shares[int(label)] = RowShare(share=interval, is_seen=True)
            total = 1.0
        except QuantityError as error:
            trouble = str(error)
    elif not is_integrals:
        known = [s.share.mean for s in shares.values() if s.share]
        total = sum(known) if known else None
    return SplitRead(
        rows=tuple(shares.get(number, RowShare()) for number in range(len(rows))), total=total, error=trouble
    )


def read_entry(state: Mapping[str, str], book: BookPort, who: str) -> EntryRead:
    """Read the whole form; names are resolved by the book, so call it from a worker."""
    scheme = book.scheme_text(state.get("scheme", "").strip())
    plan = read_plan({**state, "scheme": scheme or " "}, book)
    errors: dict[str, SidepathError] = dict(plan.errors)
    if not scheme:
        errors["scheme"] = QuantityError("The scheme is empty.", "Give a reaction SMILES or a substrate.")
    figures: dict[str, float | None] = {}
    for name, word, top in FIGURES:
        text = state.get(name, "").strip()
        try:
            figures[name] = parse_percent(text, top, word.lower()) if text else None
        except QuantityError as error:
            errors[name] = error
    date: dt.date | None = None
    if text := state.get("date", "").strip():
        try:
            date = dt.date.fromisoformat(text)
        except ValueError:
            errors["date"] = QuantityError(f"{text!r} is no date.", "Write it as 2026-03-01.", text)
    split = read_split(state)
    for number, row in enumerate(split.rows):
        if row.error:
            errors[f"p{number}.value"] = QuantityError(row.error)
    if split.error:
        errors["p.total"] = QuantityError(split.error)
    if errors:
        return EntryRead(run=None, errors=errors)
    motif = state.get("motif", "").strip() or None
    cause = Cause(state["cause"]) if state.get("cause") else None

    def words(name: str) -> str | None:
        return state.get(name, "").strip() or None

    outcome = Outcome(
        products=_products(state, split),
        isolated_yield_pct=figures["isolated"],
        assay_yield_pct=figures["assay"],
        conversion_pct=figures["conversion"],
        ee_pct=figures["ee"],
        dr=words("dr"),
        failures=tuple(Failure(mode=mode, motif=motif, cause=cause) for mode in failures_in(state)),
    )
    run = Run(
        scheme=scheme,
        conditions=plan.plan.conditions,
        outcome=outcome,
        verdict=Verdict(state["verdict"]) if state.get("verdict") else None,
        note=state.get("note", ""),
        by=state.get("by", "").strip() or who or None,
        date=date,
        reference=words("reference"),
        project=words("project"),
        series=words("series"),
    )
    return EntryRead(run=run)


def failures_in(state: Mapping[str, str]) -> tuple[str, ...]:
    """Return the failure modes that are ticked."""
    return tuple(word for word in state.get("failures", "").split(",") if word)


def state_of_outcome(run: Run) -> dict[str, str]:
    """Return the fields that stand for what came out of a run, shares as percent."""
    outcome = run.outcome
    figures = {
        "isolated": outcome.isolated_yield_pct,
        "assay": outcome.assay_yield_pct,
        "conversion": outcome.conversion_pct,
        "ee": outcome.ee_pct,
    }
    state = {name: "" if value is None else format_number(value) for name, value in figures.items()}
    first = outcome.failures[0] if outcome.failures else None
    methods = [p.method for p in outcome.products if p.method]
    state.update(
        {
            "how": SHARES,
            "method": str(methods[0]) if methods else "",
            "dr": outcome.dr or "",
            "verdict": str(run.verdict or ""),
            "failures": ",".join(f.mode for f in outcome.failures),
            "motif": (first.motif or "") if first else "",
            "cause": str(first.cause or "") if first else "",
            "note": run.note,
            "reference": run.reference or "",
            "series": run.series or "",
            "date": run.date.isoformat() if run.date else "",
            "by": run.by or "",
            "p.count": str(len(outcome.products)),
        }
    )
    for number, seen in enumerate(outcome.products):
        state[f"p{number}.fate"] = str(seen.fate)
        state[f"p{number}.smiles"] = seen.smiles or ""
        state[f"p{number}.value"] = "seen" if seen.share is None else f"{100 * seen.share:.4g}"
    return state


def changes_between(old: Run, new: Run) -> dict[str, Any]:
    """Return the fields of a run that an amendment changes."""
    names = ("scheme", "conditions", "outcome", "verdict", "note", "by", "date", "reference", "project", "series")
    return {name: getattr(new, name) for name in names if getattr(new, name) != getattr(old, name)}


def _signal(value: str, protons: str) -> Signal:
    count = parse_number(protons, "number of protons", "Write a number such as 2.") if protons.strip() else 1.0
    return Signal(value=parse_number(value, "integral", "Write a number such as 1.24."), per_molecule=count)


def _products(state: Mapping[str, str], split: SplitRead) -> tuple[ProductSeen, ...]:
    method = Method(state["method"]) if state.get("method") else None
    is_integrals = state.get("how", INTEGRALS) == INTEGRALS
    seen = []
    for number, (row, read) in enumerate(zip(rows_in(state), split.rows, strict=True)):
        if not read.is_seen:
            continue
        protons = state.get(f"p{number}.protons", "").strip()
        has_interval = read.share is not None and is_integrals
        seen.append(
            ProductSeen(
                fate=row.fate,
                smiles=row.smiles or None,
                share=read.share.mean if read.share else None,
                share_low=read.share.low if has_interval and read.share else None,
                share_high=read.share.high if has_interval and read.share else None,
                method=method,
                protons=int(float(protons)) if protons and is_integrals and method is Method.NMR else None,
            )
        )
    return tuple(seen)
