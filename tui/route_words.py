"""A route in words and cells: the order in which steps are listed, their two lines, the sums, text to copy. Pure.

The main line runs down the left edge; a branch stands indented above the step that it joins. Every text that a person
typed passes `safe`. Yields are percent with 80 % intervals, amounts mmol and g.
"""

from __future__ import annotations

import json
from dataclasses import dataclass

from kb.record.finding import Interval
from kb.route.entries import Entry, Ledger, Need
from kb.route.sequence import Route, Step
from kb.route.worth import figure_words
from kb.vocabulary import Basis, Severity
from tui.present import SEVERITY_MARKS, bar_cells, safe

SEQUENCE_HINT = "Open a route file with o, or look at the demo's with e."


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One step in the list.

    Attributes:
        number: its place in the file.
        first, second: what stands left of its two lines and draws the flow.
        joins: the step that it goes into where that is not the next one of its own line; None elsewhere.
    """

    step: Step
    number: int
    first: str
    second: str
    joins: str | None = None


def sequence_rows(route: Route) -> tuple[Row, ...]:
    """Return the steps in the order in which they are listed: each branch right above the step that takes it.

    A product that goes into more than one step is listed once, above the first of them.
    """
    numbers = {step.name: n for n, step in enumerate(route.steps, 1)}
    by_name = {step.name: step for step in route.steps}
    rows: list[Row] = []
    done: set[str] = set()

    def line(last: Step, edge: str, goes_into: str | None) -> None:
        """List the line that ends with a step; `edge` is drawn left of it, a bar for every line still running."""
        steps = [last]
        while (before := by_name.get(steps[0].inputs[0].name)) is not None and before.name not in done:
            steps.insert(0, before)
        done.update(step.name for step in steps)
        for place, step in enumerate(steps):
            runs = "│ " if place else "  "
            for one in step.inputs[1:]:
                if (branch := by_name.get(one.name)) is not None and branch.name not in done:
                    line(branch, edge + runs, step.name)
            is_last = place == len(steps) - 1
            if not is_last:
                second = edge + "│ "
            elif goes_into is None:
                second = edge + "▼ "
            else:
                second = edge[:-2] + ("├─" if edge.endswith("│ ") else "╭─") + "╯ "
            joins = goes_into if is_last else None
            rows.append(Row(step=step, number=numbers[step.name], first=edge + "● ", second=second, joins=joins))

    line(route.steps[-1], "", None)
    return tuple(rows)


def yield_words(pct: Interval) -> str:
    """Return a yield as "63 % (29–92)", without bounds where it was typed as exact."""
    if pct.low == pct.high:
        return f"{pct.mean:.3g} %"
    return f"{pct.mean:.3g} % ({pct.low:.0f}–{pct.high:.0f})"


def step_cells(row: Row, width: int) -> str:
    """Return the first line of a step in `width` cells: flow, number, name, bar, yield; bars stand under each other."""
    pct = row.step.yield_pct.pct
    room = width - 15
    names = max(min(room - 8, 26), 12)
    name = safe(f"{row.number} {safe(row.step.name)}", max(names - len(row.first), 4))
    bar = bar_cells(_share(pct), max(room - names - 1, 3))
    bounds = "" if pct.low == pct.high else f"({pct.low:.0f}–{pct.high:.0f})"
    return f"{(row.first + name).ljust(names)} {bar} {_whole(pct.mean):>5} {bounds:>8}".rstrip()


def basis_words(step: Step) -> str:
    """Return where a yield comes from, in few words."""
    known = step.yield_pct
    if known.note == "what if":
        return "typed here"
    if known.basis == "recorded":
        more = f" and {len(known.runs) - 2} more" if len(known.runs) > 2 else ""
        return f"record: {', '.join(safe(run) for run in known.runs[:2])}{more}"
    if known.basis == "estimated":
        runs = len(known.runs)
        is_published = step.assessment is not None and step.assessment.estimate.basis is Basis.PUBLISHED
        if not runs:
            return "estimate: published rates" if is_published else "estimate"
        return f"estimate: {runs} run{'' if runs == 1 else 's'}"
    return "typed in the file" if known.basis == "given" else "not known"


def findings_mark(step: Step) -> str:
    """Return the worst finding with the number of findings, "!! serious, 3"; "" where there is none."""
    if not step.findings:
        return ""
    worst = Severity(step.findings[0][0])
    return f"{SEVERITY_MARKS[worst].strip()} {worst}, {len(step.findings)}"


def step_remarks(row: Row, entry: Entry, file_yield: Interval | None, is_weakest: bool) -> list[tuple[str, str]]:
    """Return the second line of a step as (text, kind) parts, most needed first.

    Args:
        file_yield: what the file says where something else is reckoned with now; None = as in the file.

    Returns:
        Kind is "" or the name of a severity, "weak", "changed".
    """
    parts: list[tuple[str, str]] = []
    if is_weakest:
        parts.append(("◀ weakest", "weak"))
    if mark := findings_mark(row.step):
        parts.append((mark, row.step.findings[0][0]))
    if row.step.forgiven:
        parts.append((f"may be poor: {row.step.forgiven[0]}", ""))
    if file_yield is not None:
        parts.append((f"≠ {file_yield.mean:.3g} % in the file", "changed"))
    else:
        parts.append((basis_words(row.step), ""))
    if row.joins is not None:
        parts.append((f"into {safe(row.joins, 14)}", ""))
    parts.append((f"{figure_words(entry.input_mmol)} → {figure_words(entry.product_mmol)} mmol", ""))
    return parts


def target_words(ledger: Ledger) -> str:
    """Return the amount wanted, "2 g (8.68 mmol)"."""
    mass = ledger.route.target_molar_mass
    mmol = f"{figure_words(ledger.target_mmol)} mmol"
    return mmol if mass is None else f"{figure_words(ledger.target_mmol * mass / 1000)} g ({mmol})"


def money_words(value: float, ledger: Ledger) -> str:
    """Return an amount of money with the file's word for it."""
    return f"{figure_words(value)} {safe(ledger.route.money or 'cost units', 12)}"


def overall_lines(ledger: Ledger, base: Ledger, width: int) -> list[tuple[str, str]]:
    """Return the overall yield as (word, line) with bars in `width` cells, word included: both ways of reckoning.

    Args:
        base: as the file has it; shown too where something was changed.
    """
    rows = [("Monte Carlo", ledger.overall_pct), ("closed form", ledger.closed_form_pct)]
    if ledger.overall_pct != base.overall_pct:
        rows.append(("in the file", base.overall_pct))
    room = max(width - 12 - 17, 4)
    lines = []
    for word, pct in rows:
        mean, _, bounds = yield_words(pct).partition(" (")
        figures = f"{mean:>6} ({bounds}" if bounds else f"{mean:>6}"
        lines.append((word, f"{bar_cells(_share(pct), room)} {figures}"))
    if ledger.counted_pct is not None:
        lines.append(("that counts", f"{ledger.counted_pct:.3g} %, steps that may be poor left out"))
    return lines


def need_cells(need: Need, ledger: Ledger) -> tuple[str, ...]:
    """Return a row: material, mass, amount with its interval, cost."""
    if need.cost is not None:
        cost = money_words(need.cost, ledger)
    else:
        cost = "no price" if need.material in ledger.unpriced else ""
    return (
        safe(need.material, 18),
        "" if need.grams is None else f"{figure_words(need.grams)} g",
        f"{figure_words(need.mmol)} mmol ({figure_words(need.low, 2)}–{figure_words(need.high, 2)})",
        cost,
    )


def need_remarks(ledger: Ledger) -> list[str]:
    """Return sentences on what goes in: what suffices nine times in ten, the closed form, the cost."""
    first = ledger.needed[0]
    if first.grams_high is not None:
        enough = f"{figure_words(first.grams_high)} g of {safe(first.material, 18)}"
    else:
        enough = f"{figure_words(first.high)} mmol of {safe(first.material, 18)}"
    lines = [f"{enough} suffices nine times in ten"]
    if first.closed_low is not None and first.closed_high is not None:
        lines[0] += f"; in closed form {figure_words(first.closed_low)}–{figure_words(first.closed_high)} mmol."
    else:
        lines[0] += "."
    if ledger.cost is not None:
        without = f"; no price for {', '.join(safe(m, 18) for m in ledger.unpriced)}" if ledger.unpriced else ""
        lines.append(f"Costs {money_words(ledger.cost, ledger)}{without}.")
    return lines


def weakest_words(ledger: Ledger) -> str:
    """Return the weakest step and what improving it buys, a sentence or two."""
    if ledger.weakest is None:
        return "No step is weak: each is perfect, or may be poor."
    return f"Weakest is {safe(ledger.weakest.step, 24)}. {improvement_words(ledger, ledger.weakest.step)}"


def improvement_words(ledger: Ledger, step: str) -> str:
    """Return what a better yield in a step buys, a sentence; "" where nothing can be bettered."""
    entry = next((e for e in ledger.entries if e.step.name == step), None)
    better = entry.improvement if entry else None
    if entry is None or better is None:
        return ""
    first = ledger.needed[0]
    then = f"{figure_words(better.needed_mmol)} mmol"
    if better.needed_g is not None:
        then = f"{figure_words(better.needed_g)} g"
    in_money = better.unit not in ("g", "mmol")
    saved = money_words(better.saves, ledger) if in_money else f"{figure_words(better.saves)} {better.unit} of material"
    return (
        f"At {better.at_pct:.3g} % instead of {entry.step.yield_pct.pct.mean:.3g} % it would take {then} of "
        f"{safe(first.material, 18)} and save {saved}."
    )


def rests_words(step: Step) -> str:
    """Return in full what a yield rests on."""
    known = step.yield_pct
    if known.note == "what if":
        return f"{yield_words(known.pct)}, typed here."
    runs = f" ({', '.join(safe(run) for run in known.runs[:6])}{', …' if len(known.runs) > 6 else ''})"
    return f"{yield_words(known.pct)}: {safe(known.note)}{runs if known.runs else ''}."


def route_texts(ledger: Ledger, chosen: Step | None) -> dict[str, str]:
    """Return a reckoned route as Markdown and JSON, and the scheme of the chosen step as SMILES."""
    entries = {e.step.name: e for e in ledger.entries}
    lines = [
        f"## {_cell(ledger.route.title)}",
        "",
        f"Overall {yield_words(ledger.overall_pct)} by Monte Carlo, {yield_words(ledger.closed_form_pct)} in closed "
        f"form, with 80 % intervals; for {target_words(ledger)}.",
        "",
        "| step | from | yield | rests on | in → out | findings |",
        "|---|---|---|---|---|---|",
    ]
    for row in sequence_rows(ledger.route):
        step, entry = row.step, entries[row.step.name]
        taken = ", ".join(_cell(i.name) + (f" ({i.equiv:g} equiv)" if i.equiv != 1 else "") for i in step.inputs)
        poor = f"; may be poor: {', '.join(step.forgiven)}" if step.forgiven else ""
        flow = f"{figure_words(entry.input_mmol)} → {figure_words(entry.product_mmol)} mmol"
        worries = "; ".join(f"{severity}: {_cell(title)}" for severity, title in step.findings)
        lines.append(
            f"| {row.number} {_cell(step.name)} | {taken} | {yield_words(step.yield_pct.pct)} "
            f"| {_cell(basis_words(step))}{poor} | {flow} | {worries or 'none'} |"
        )
    lines += ["", "| goes in | mass | amount | cost |", "|---|---|---|---|"]
    lines += ["| " + " | ".join(_cell(c) for c in need_cells(need, ledger)) + " |" for need in ledger.needed]
    lines += ["", *(_cell(words) for words in need_remarks(ledger)), "", _cell(weakest_words(ledger)), ""]
    lines.append("An estimate is no permission: local safety rules and qualified people decide.")
    texts = {
        "Markdown": "\n".join(lines),
        "JSON": json.dumps(ledger.as_dict(), ensure_ascii=False, indent=2),
    }
    if chosen is not None and chosen.plan is not None:
        texts["SMILES"] = chosen.plan.scheme
    return texts


def _whole(pct: float) -> str:
    return f"{pct:.0f} %" if pct >= 9.5 else f"{pct:.2g} %"


def _share(pct: Interval) -> Interval:
    return Interval(mean=pct.mean / 100, low=pct.low / 100, high=pct.high / 100)


def _cell(text: str) -> str:
    return safe(text).replace("|", "\\|").replace("<", "&lt;")
