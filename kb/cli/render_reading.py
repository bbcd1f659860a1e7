"""A reading as text: what happens where, then what else could form."""

from __future__ import annotations

from kb.chem.facts import Centre, Reading
from kb.cli.render import wrapped

MOST_POSSIBLE = 20
"""Possible products that are listed; --json lists all."""


def render_reading(reading: Reading) -> str:
    """Return a reading as text of at most 80 columns."""
    lines = wrapped(f"{reading.confidence}: {reading.fate or 'no single fate'}")
    if reading.reason:
        lines += wrapped(reading.reason, 2)
    for centre in reading.centres:
        lines += wrapped(f"component {centre.component}, atom {centre.atom}: {centre_words(centre)}", 2)
    if reading.nucleophile:
        lines += wrapped(f"nucleophile: {reading.nucleophile.nucleophile_class.replace('_', ' ')}", 2)
    if reading.possible:
        lines.append("could form")
        for possible in reading.possible[:MOST_POSSIBLE]:
            lines += wrapped(f"{possible.fate}: {possible.product}", 4)
            lines += wrapped(possible.note, 8) if possible.note else []
        if len(reading.possible) > MOST_POSSIBLE:
            lines.append(f"    and {len(reading.possible) - MOST_POSSIBLE} more (--json lists all)")
    return "\n".join(lines)


def centre_words(centre: Centre) -> str:
    """Return a centre in words: "secondary, ring, loses mesylate, 4 beta hydrogens"."""
    words = [str(centre.carbon_class), *map(str, centre.flags)]
    if centre.leaving_group:
        words.append(f"loses {centre.leaving_group}")
    n = centre.beta_hydrogens
    words.append(f"{n} beta hydrogen{'' if n == 1 else 's'}")
    return ", ".join(words)
