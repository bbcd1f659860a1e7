"""Short words that several pages share: conditions in a line, intervals, shares, where a page came from.

It owns wording, no layout.
"""

from __future__ import annotations

import datetime as dt

from kb.plain import counted as counted
from kb.record.conditions import Conditions
from kb.record.finding import Interval


def conditions_words(conditions: Conditions) -> str:
    """Return conditions in one line: components with amounts, solvents, temperature, time."""
    words = []
    for component in conditions.components:
        amounts = [
            f"{value:g} {unit}"
            for value, unit in (
                (component.equiv, "equiv"),
                (component.loading_mol_pct, "mol %"),
                (component.amount_mmol, "mmol"),
                (component.mass_mg, "mg"),
                (component.volume_ml, "mL"),
                (component.conc_molar, "M"),
            )
            if value is not None
        ]
        words.append(component.name + (f" ({', '.join(amounts)})" if amounts else ""))
    if conditions.solvents:
        parts = [s.parts for s in conditions.solvents]
        ratio = ":".join(f"{p:g}" for p in parts if p is not None) if len(parts) > 1 and None not in parts else ""
        words.append("/".join(s.name for s in conditions.solvents) + (f" {ratio}" if ratio else ""))
    words += [value.text for value in (conditions.temperature, conditions.time) if value is not None]
    return ", ".join(words) or "no conditions recorded"


def interval_words(interval: Interval | None, scale: float = 100.0, unit: str = " %") -> str:
    """Return "78 % (60 to 92)", or "not known"."""
    if interval is None:
        return "not known"
    mean, low, high = (scale * v for v in (interval.mean, interval.low, interval.high))
    if low == high:
        return f"{_figure(mean)}{unit}"
    return f"{_figure(mean)}{unit} ({_figure(low)} to {_figure(high)})"


def made_from(book: str, runs: int, day: dt.date) -> str:
    """Return where a page came from, for its foot."""
    return f"From the record book {book} ({runs:,} runs), {day.isoformat()}."


def _figure(value: float) -> str:
    return f"{value:.0f}" if abs(value) >= 10 or value == 0 else f"{value:.2g}"
