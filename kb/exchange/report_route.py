"""The page of a route: overall yield, what must go in, the weakest step, each step with its yield and worries.

It owns the order and the words; the arithmetic is `kb.route.ledger`.
"""

from __future__ import annotations

from kb.exchange.report_blocks import Block, Facts, Page, Section, Table, Warn, Words
from kb.exchange.report_drawings import fragment
from kb.exchange.report_plots import interval_bars, stair
from kb.exchange.report_words import interval_words
from kb.route.entries import Entry, Ledger, Need
from kb.route.worth import figure_words


def route_page(ledger: Ledger, source: str = "") -> Page:
    """Lay out a ledger."""
    route = ledger.route
    bars = [(e.step.name, e.step.yield_pct.pct) for e in ledger.entries]
    line = {s.name for s in route.main_line}
    stairs = [(e.step.name, e.so_far_pct / 100) for e in ledger.entries if e.step.name in line]
    needs = Table(
        caption="What goes in, at the mean yields and with 80 % intervals by Monte Carlo and in closed form",
        header=("Material", "Needed", "Between", "In closed form", "Mass", "Cost"),
        rows=tuple(
            (
                n.material,
                f"{figure_words(n.mmol)} mmol",
                f"{figure_words(n.low)} to {figure_words(n.high)} mmol",
                _closed(n),
                "molar mass not known" if n.grams is None else f"{figure_words(n.grams)} g",
                "no price" if n.cost is None else f"{_money(n.cost)} {route.money}".strip(),
            )
            for n in ledger.needed
        ),
        figures=(1, 2, 3, 4, 5),
    )
    return Page(
        title=route.title,
        kind="route",
        lead=route_lead(ledger),
        sections=(
            Section(
                heading="Yield",
                blocks=(
                    interval_bars("Yield of each step, with 80 % intervals", bars, 1.0),
                    stair("What is left along the main line", stairs),
                ),
            ),
            Section(heading="Material", blocks=(needs, *_forgiven(ledger), *_unpriced(ledger))),
            Section(heading="What a better step would buy", blocks=(_improvements(ledger),)),
            Section(
                heading="Step by step", parts=tuple(_step(number, e) for number, e in enumerate(ledger.entries, 1))
            ),
            Section(
                heading="How this was reckoned",
                blocks=(
                    Words(
                        text=f"Monte Carlo over independent yields, {interval_words(ledger.overall_pct, 1.0)}, "
                        f"standard error {ledger.sampling_error_pct:.2g} points; in closed form "
                        f"{interval_words(ledger.closed_form_pct, 1.0)}. One bad bottle used in several steps would "
                        "make them fail together, which this does not reckon with."
                    ),
                ),
            ),
        ),
        source=source,
    )


def route_lead(ledger: Ledger) -> str:
    """Return the answer in two or three sentences."""
    first = ledger.needed[0]
    said = f"Overall {interval_words(ledger.overall_pct, 1.0)}; for {_target(ledger)} start from {_amount(first)} of "
    said += f"{first.material}."
    if ledger.weakest is not None:
        w = ledger.weakest
        then = f"{figure_words(w.needed_g)} g" if w.needed_g is not None else f"{figure_words(w.needed_mmol)} mmol"
        saving = f", saving {_money(w.saves)} {w.unit}" if w.unit not in ("g", "mmol") else ""
        said += f" Step “{w.step}” costs most; at {w.at_pct:.3g} % there you would need {then}{saving}."
    if ledger.cost is not None:
        said += f" Reckoned in cost: {_money(ledger.cost)} {ledger.route.money}".rstrip() + "."
    return said


def _target(ledger: Ledger) -> str:
    mass = ledger.route.target_molar_mass
    if mass is not None:
        return f"{figure_words(ledger.target_mmol * mass / 1000)} g ({figure_words(ledger.target_mmol)} mmol)"
    return f"{figure_words(ledger.target_mmol)} mmol"


def _money(value: float) -> str:
    return figure_words(value)


def _amount(need: Need) -> str:
    mmol = f"{figure_words(need.mmol)} mmol"
    return mmol if need.grams is None else f"{figure_words(need.grams)} g ({mmol})"


def _forgiven(ledger: Ledger) -> tuple[Block, ...]:
    flagged = [e.step for e in ledger.entries if e.step.forgiven]
    if not flagged:
        return ()
    said = "; ".join(f"{s.name} ({', '.join(s.forgiven)})" for s in flagged)
    counted = f" Without them the route yields {ledger.counted_pct:.3g} %." if ledger.counted_pct is not None else ""
    return (Words(text=f"A poor yield does not matter in: {said}.{counted}"),)


def _closed(need: Need) -> str:
    if need.closed_low is None or need.closed_high is None:
        return "goes in at several places"
    return f"{figure_words(need.closed_low)} to {figure_words(need.closed_high)} mmol"


def _unpriced(ledger: Ledger) -> tuple[Block, ...]:
    if not ledger.unpriced:
        return ()
    return (Words(text=f"No price, so not in the cost: {', '.join(ledger.unpriced)}."),)


def _improvements(ledger: Ledger) -> Block:
    rows = []
    for e in ledger.entries:
        better = e.improvement
        if better is None:
            rows.append((e.step.name, f"{e.step.yield_pct.pct.mean:.3g} %", "as good as it gets", "", ""))
            continue
        needed = f"{figure_words(better.needed_mmol)} mmol" + (
            f" ({figure_words(better.needed_g)} g)" if better.needed_g is not None else ""
        )
        forgiven = " (forgiven)" if e.step.forgiven else ""
        rows.append(
            (
                e.step.name + forgiven,
                f"{e.step.yield_pct.pct.mean:.3g} %",
                f"{better.at_pct:.3g} %",
                needed,
                f"{figure_words(better.saves)} {better.unit}",
            )
        )
    return Table(
        caption=f"One step bettered at a time; {ledger.needed[0].material} needed then, and what the whole route saves",
        header=("Step", "Now", "If", "Needed", "Saves"),
        rows=tuple(rows),
        figures=(1, 2, 3, 4),
    )


def _step(number: int, e: Entry) -> Section:
    step = e.step
    blocks: list[Block] = [
        Facts(
            pairs=(
                ("From", ", ".join(i.name + (f" ({i.equiv:g} equiv)" if i.equiv != 1 else "") for i in step.inputs)),
                ("Yield", interval_words(step.yield_pct.pct, 1.0)),
                ("Rests on", f"{step.yield_pct.basis}: {step.yield_pct.note}"),
                ("Runs", ", ".join(step.yield_pct.runs) or "none"),
                ("In and out", f"{figure_words(e.input_mmol)} mmol to {figure_words(e.product_mmol)} mmol"),
                ("Left so far", f"{e.so_far_pct:.3g} %"),
            )
        )
    ]
    if step.product and (figure := fragment(step.product, (), "Gives")) is not None:
        blocks.append(figure)
    blocks += [Warn(severity=severity, title=title) for severity, title in step.findings]
    return Section(heading=f"{number}. {step.name}", blocks=tuple(blocks))
