"""A run, a list of runs, and a history as text."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from typing import Any

from kb.cli.render import heading, split_words, table, wrapped
from kb.cli.render_assessment import conditions_line
from kb.plain import excerpt, plain, shortened
from kb.record.run import Run

_HEADS = ("name", "text", "mode", "fate")
"""Fields of a portable value that say what it is, shown first and without their names."""
_UNTOLD = ("smiles", "role", "start_c", "end_c", "between_c", "h")
"""Fields that only repeat what such a field says."""
LONGEST_VALUE = 200
"""Longest old or new value of a history that is shown [characters]; --json shows the whole."""


def render_run(run: Run, reading: str = "") -> str:
    """Return one run in full.

    Args:
        run: to show.
        reading: what its scheme was read as, in words; "" = not told.
    """
    withdrawn = " (withdrawn)" if run.is_withdrawn else ""
    lines = [heading(f"{run.code or 'new run'}{withdrawn}")]
    lines += wrapped(run.scheme, 2)
    lines += _field("read as", reading)
    lines += _field("conditions", conditions_line(run.conditions))
    for label, value in (
        ("atmosphere", run.conditions.atmosphere),
        ("vessel", run.conditions.vessel),
        ("work-up", run.conditions.workup),
        ("conc.", None if run.conditions.conc_molar is None else f"{run.conditions.conc_molar:g} M"),
        ("scale", None if run.conditions.scale_mmol is None else f"{run.conditions.scale_mmol:g} mmol"),
    ):
        lines += _field(label, value)
    lines += _outcome(run)
    when = run.date.isoformat() if run.date else "date not recorded"
    lines += _field("run by", f"{run.by or 'not recorded'}, {when}")
    for label, value in (("reference", run.reference), ("project", run.project), ("series", run.series)):
        lines += _field(label, value)
    if run.note:
        lines += _field("note", run.note)
    for attachment in run.attachments:
        lines += _field("attached", f"{attachment.name} ({attachment.size_bytes:,} bytes)")
    if run.withdrawn_why is not None:
        lines += _field("withdrawn", run.withdrawn_why)
    if run.revision > 1:
        lines += _field("revision", f"{run.revision}; see `history {run.code}`")
    return "\n".join(lines)


def render_runs(runs: Sequence[Run], total: int, first: int) -> str:
    """Return a page of runs, a line each."""
    if not runs:
        return "No runs." if not total else f"No runs on this page; there are {total}."
    rows = [
        (
            run.code or "",
            run.date.isoformat() if run.date else "",
            str(run.verdict or ""),
            split_words(sorted(run.outcome.split.items(), key=lambda p: -p[1]), 1),
            "" if run.outcome.yield_pct is None else f"{run.outcome.yield_pct:.0f} %",
            conditions_line(run.conditions),
        )
        for run in runs
    ]
    lines = table(rows, ("run", "date", "verdict", "main fate", "yield", "conditions"), (7, 10, 7, 15, 5, 26))
    lines.append(f"{first + 1} to {first + len(runs)} of {total}")
    return "\n".join(lines)


def render_history(entries: Sequence[Mapping[str, Any]]) -> str:
    """Return a history, oldest first."""
    lines: list[str] = []
    for entry in entries:
        stamp = dt.datetime.fromisoformat(entry["at"]).strftime("%Y-%m-%d %H:%M UTC")
        lines.append(f"{entry['revision']:>3}  {stamp}  {plain(str(entry['action']))} by {plain(str(entry['who']))}")
        if entry.get("why"):
            lines += wrapped(excerpt(str(entry["why"]), LONGEST_VALUE), 5)
        for change in entry["changed"]:
            lines += wrapped(change_words(change), 5)
    return "\n".join(lines) or "No history."


def change_words(change: Mapping[str, Any]) -> str:
    """Return one changed field in words: "isolated yield pct: 76 → 72"."""
    label = change["field"].rpartition(".")[2].replace("_", " ")
    return f"{label}: {_short(change['from'])} → {_short(change['to'])}"


def _short(value: Any) -> str:
    """Return a portable value in few words: "NaN3, 3 equiv; K2CO3" for a list of components."""
    if value is None or value == []:
        return "not recorded"
    if isinstance(value, list):
        text = "; ".join(_short(item) for item in value)
    elif isinstance(value, dict):
        heads = [str(value[k]) for k in _HEADS if k in value]
        rest = [(k, v) for k, v in value.items() if k not in _HEADS and k not in (_UNTOLD if heads else ())]
        text = ", ".join([*heads, *(f"{k.replace('_', ' ')} {_short(v)}" for k, v in rest)])
    elif isinstance(value, float):
        text = f"{value:g}"
    else:
        text = str(value)
    return shortened(plain(text), LONGEST_VALUE)


def _field(label: str, value: str | None) -> list[str]:
    return wrapped(value, 14, first=f"  {label:<12}") if value else []


def _outcome(run: Run) -> list[str]:
    outcome = run.outcome
    lines = _field("verdict", str(run.verdict) if run.verdict else None)
    for product in outcome.products:
        share = "seen" if product.share is None else f"{100 * product.share:g} %"
        how = f" by {product.method}" if product.method else ""
        lines += wrapped(f"{product.fate} {share}{how} {product.smiles or ''}".strip(), 14, first=f"  {'outcome':<12}")
    for label, value in (
        ("isolated", outcome.isolated_yield_pct),
        ("assay", outcome.assay_yield_pct),
        ("conversion", outcome.conversion_pct),
        ("ee", outcome.ee_pct),
    ):
        lines += _field(label, None if value is None else f"{value:g} %")
    lines += _field("dr", outcome.dr)
    for failure in outcome.failures:
        words = (
            failure.mode
            + (f", {failure.cause}" if failure.cause else "")
            + (f", motif {failure.motif}" if failure.motif else "")
        )
        lines += _field("failed by", words)
    return lines
