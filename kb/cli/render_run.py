"""A run, a list of runs, and a history as text."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from typing import Any

from kb.cli.render import heading, split_words, table, wrapped
from kb.cli.render_assessment import conditions_line
from kb.plain import plain
from kb.record.run import Run


def render_run(run: Run) -> str:
    """Return one run in full."""
    withdrawn = " (withdrawn)" if run.is_withdrawn else ""
    lines = [heading(f"{run.code or 'new run'}{withdrawn}")]
    lines += wrapped(plain(run.scheme), 2)
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
            lines += wrapped(str(entry["why"]), 5)
        for change in entry["changed"]:
            lines += wrapped(f"{change['field']}: {_short(change['from'])} → {_short(change['to'])}", 5)
    return "\n".join(lines) or "No history."


def _short(value: Any) -> str:
    text = plain(str(value))
    return "not recorded" if value is None else text if len(text) <= 160 else text[:159] + "…"


def _field(label: str, value: str | None) -> list[str]:
    return wrapped(value, 14, first=f"  {label:<12}") if value else []


def _outcome(run: Run) -> list[str]:
    outcome = run.outcome
    lines = _field("verdict", str(run.verdict) if run.verdict else None)
    for product in outcome.products:
        share = "seen" if product.share is None else f"{100 * product.share:.0f} %"
        how = f" by {product.method}" if product.method else ""
        lines += wrapped(f"{product.fate} {share}{how} {product.smiles or ''}".strip(), 14, first=f"  {'outcome':<12}")
    for label, value in (
        ("isolated", outcome.isolated_yield_pct),
        ("assay", outcome.assay_yield_pct),
        ("conversion", outcome.conversion_pct),
        ("ee", outcome.ee_pct),
    ):
        lines += _field(label, None if value is None else f"{value:g} %")
    for failure in outcome.failures:
        words = (
            failure.mode
            + (f", {failure.cause}" if failure.cause else "")
            + (f", motif {failure.motif}" if failure.motif else "")
        )
        lines += _field("failed by", words)
    return lines
