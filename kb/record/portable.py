"""The portable form of a run: plain JSON values out, the same run back in.

One form serves history, JSON Lines and `show --json`, so what a person reads is what the record keeps. It is
lossless: `run_from_dict(run_to_dict(run)) == run` for every run. It refuses what it does not know (a key, a
word, a later form number) instead of dropping it, and refuses text that no database keeps (NUL, unpaired
surrogates) and numbers that are none (NaN, infinity). It interprets nothing: a note is carried to the letter.

The form, number 1: dates are ISO (`2024-05-17`), moments ISO in UTC (`2024-05-17T09:30:00+00:00`), controlled
words as in `kb.vocabulary`, units in the key names. `null` or a missing key = not recorded; 0 = measured
zero. In lists of components, solvents, products and failures the keys that are not recorded are left out.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from enum import StrEnum
from typing import Any
from uuid import UUID

from kb.errors import InvalidRecord
from kb.quantity import Duration, Temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.json_fields import JsonFields
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Attachment, Run
from kb.vocabulary import Cause, Fate, Method, Role, Verdict

FORM = 1
"""Number of the form, written under the key `sidepath_run`."""


def run_to_dict(run: Run) -> dict[str, Any]:
    """Return the run as JSON values, in the order in which a person would read them."""
    conditions, outcome = run.conditions, run.outcome
    return {
        "sidepath_run": FORM,
        "code": run.code,
        "scheme": run.scheme,
        "verdict": _word_out(run.verdict),
        "note": run.note,
        "by": run.by,
        "date": run.date.isoformat() if run.date else None,
        "reference": run.reference,
        "project": run.project,
        "series": run.series,
        "conditions": {
            "components": [_sparse(c) for c in conditions.components],
            "solvents": [_sparse(s) for s in conditions.solvents],
            "temperature": _sparse(conditions.temperature) if conditions.temperature else None,
            "time": _sparse(conditions.time) if conditions.time else None,
            "conc_molar": conditions.conc_molar,
            "scale_mmol": conditions.scale_mmol,
            "atmosphere": conditions.atmosphere,
            "vessel": conditions.vessel,
            "workup": conditions.workup,
        },
        "outcome": {
            "products": [_sparse(p) for p in outcome.products],
            "isolated_yield_pct": outcome.isolated_yield_pct,
            "assay_yield_pct": outcome.assay_yield_pct,
            "conversion_pct": outcome.conversion_pct,
            "ee_pct": outcome.ee_pct,
            "dr": outcome.dr,
            "failures": [_sparse(f) for f in outcome.failures],
        },
        "attachments": [_sparse(a) for a in run.attachments],
        "withdrawn_why": run.withdrawn_why,
        "run_id": str(run.run_id),
        "revision": run.revision,
        "recorded_at": run.recorded_at.isoformat() if run.recorded_at else None,
    }


def run_from_dict(data: Mapping[str, Any]) -> Run:
    """Return the run that the JSON values describe.

    Args:
        data: one object in the form above; only `scheme` must be there. Without `run_id` the run gets a new
            one.

    Raises:
        InvalidRecord: a key is unknown, a value has the wrong kind or an impossible value, or the form number
            is later than this program's. The sentence names the place ("conditions.components[2].equiv").
    """
    reader = JsonFields(data, "run")
    form = reader.integer("sidepath_run", FORM)
    if form != FORM:
        raise InvalidRecord(
            f"The run is written in form {form}; this program reads form {FORM}.", "Update the program.", form
        )
    given: dict[str, Any] = {
        "scheme": reader.text("scheme") or "",
        "conditions": _conditions_in(reader.inner("conditions")),
        "outcome": _outcome_in(reader.inner("outcome")),
        "verdict": reader.word("verdict", Verdict),
        "note": reader.text("note") or "",
        "by": reader.text("by"),
        "date": reader.parsed("date", dt.date.fromisoformat, "a date such as 2024-05-17"),
        "reference": reader.text("reference"),
        "project": reader.text("project"),
        "series": reader.text("series"),
        "code": reader.text("code"),
        "recorded_at": reader.parsed("recorded_at", _moment, "a moment with its zone, such as 2024-05-17T09:30:00Z"),
        "revision": reader.integer("revision", 1),
        "withdrawn_why": reader.text("withdrawn_why"),
        "attachments": reader.parts("attachments", _attachment_in),
    }
    run_id = reader.parsed("run_id", UUID, "a UUID")
    reader.finish()
    return Run(**given, run_id=run_id) if run_id else Run(**given)


def _word_out(word: StrEnum | None) -> str | None:
    return str(word) if word is not None else None


def _sparse(value: Any) -> dict[str, Any]:
    """Return the recorded fields of one flat frozen value."""
    fields = {name: getattr(value, name) for name in value.__dataclass_fields__}
    recorded = {name: v for name, v in fields.items() if v is not None and v is not False and v != ()}
    return {
        n: str(v) if isinstance(v, StrEnum) else list(v) if isinstance(v, tuple) else v for n, v in recorded.items()
    }


def _moment(text: str) -> dt.datetime:
    moment = dt.datetime.fromisoformat(text)
    if moment.tzinfo is None:
        raise ValueError("no time zone")
    return moment.astimezone(dt.UTC)


def _conditions_in(reader: JsonFields) -> Conditions:
    conditions = Conditions(
        components=reader.parts("components", _component_in),
        solvents=reader.parts("solvents", _solvent_in),
        temperature=reader.maybe("temperature", _temperature_in),
        time=reader.maybe("time", _duration_in),
        conc_molar=reader.number("conc_molar"),
        scale_mmol=reader.number("scale_mmol"),
        atmosphere=reader.text("atmosphere"),
        vessel=reader.text("vessel"),
        workup=reader.text("workup"),
    )
    reader.finish()
    return conditions


def _component_in(reader: JsonFields) -> Component:
    component = Component(
        role=reader.needed_word("role", Role),
        name=reader.needed("name"),
        smiles=reader.text("smiles"),
        equiv=reader.number("equiv"),
        amount_mmol=reader.number("amount_mmol"),
        mass_mg=reader.number("mass_mg"),
        volume_ml=reader.number("volume_ml"),
        conc_molar=reader.number("conc_molar"),
        loading_mol_pct=reader.number("loading_mol_pct"),
    )
    reader.finish()
    return component


def _solvent_in(reader: JsonFields) -> SolventPart:
    solvent = SolventPart(name=reader.needed("name"), smiles=reader.text("smiles"), parts=reader.number("parts"))
    reader.finish()
    return solvent


def _temperature_in(reader: JsonFields) -> Temperature:
    temperature = Temperature(
        text=reader.needed("text"),
        start_c=reader.number("start_c"),
        end_c=reader.number("end_c"),
        between_c=reader.numbers("between_c"),
        is_reflux=reader.claim("is_reflux"),
    )
    reader.finish()
    return temperature


def _duration_in(reader: JsonFields) -> Duration:
    duration = Duration(text=reader.needed("text"), h=reader.number("h"))
    reader.finish()
    return duration


def _outcome_in(reader: JsonFields) -> Outcome:
    outcome = Outcome(
        products=reader.parts("products", _product_in),
        isolated_yield_pct=reader.number("isolated_yield_pct"),
        assay_yield_pct=reader.number("assay_yield_pct"),
        conversion_pct=reader.number("conversion_pct"),
        ee_pct=reader.number("ee_pct"),
        dr=reader.text("dr"),
        failures=reader.parts("failures", _failure_in),
    )
    reader.finish()
    return outcome


def _product_in(reader: JsonFields) -> ProductSeen:
    product = ProductSeen(
        fate=reader.needed_word("fate", Fate),
        smiles=reader.text("smiles"),
        share=reader.number("share"),
        share_low=reader.number("share_low"),
        share_high=reader.number("share_high"),
        method=reader.word("method", Method),
        protons=reader.whole("protons"),
    )
    reader.finish()
    return product


def _failure_in(reader: JsonFields) -> Failure:
    failure = Failure(mode=reader.needed("mode"), motif=reader.text("motif"), cause=reader.word("cause", Cause))
    reader.finish()
    return failure


def _attachment_in(reader: JsonFields) -> Attachment:
    size = reader.whole("size_bytes")
    if size is None:
        raise reader.refuse("size_bytes", None, "the size in bytes")
    attachment = Attachment(name=reader.needed("name"), sha256=reader.needed("sha256"), size_bytes=size)
    reader.finish()
    return attachment
