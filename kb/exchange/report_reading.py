"""The page of a reading: what a scheme does, at which carbons, and what else could form there.

It owns the order, what happened first. A scheme that was not understood gets a page too, with the reason.
"""

from __future__ import annotations

from kb.chem.facts import Centre, Reading
from kb.exchange.report_blocks import Block, Facts, Page, Section, Table, Words
from kb.exchange.report_drawings import scheme_blocks
from kb.exchange.report_words import counted

MOST_POSSIBLE = 40
"""Possible products that a page lists."""


def reading_page(reading: Reading, source: str = "") -> Page:
    """Lay out a reading."""
    return Page(
        title="A scheme, read",
        kind="reading",
        lead=_lead(reading),
        sections=(
            Section(heading="The scheme", blocks=scheme_blocks(reading.scheme, reading)),
            *_centres(reading),
            *_possible(reading),
        ),
        source=source,
    )


def _lead(reading: Reading) -> str:
    if not reading.ok or reading.centre is None:
        return f"Not understood: {reading.reason or 'no reacting carbon was found.'}"
    said = str(reading.fate).capitalize() if reading.fate else "No single fate"
    return f"{said} ({reading.confidence}). {reading.reason}".strip()


def _centres(reading: Reading) -> tuple[Section, ...]:
    if not reading.centres:
        return ()
    blocks: list[Block] = [
        Facts(
            pairs=tuple(
                (f"Component {c.component + 1}, atom {c.atom + 1}", _centre_words(c)) for c in reading.centres
            )
        )
    ]
    if reading.nucleophile is not None:
        blocks.append(Words(text=f"Nucleophile: {reading.nucleophile.nucleophile_class.replace('_', ' ')}."))
    if reading.stereo:
        blocks.append(Words(text=f"Configuration: {reading.stereo}."))
    return (Section(heading="Where it happens", blocks=tuple(blocks)),)


def _centre_words(centre: Centre) -> str:
    words = [f"{centre.carbon_class} carbon", *map(str, centre.flags)]
    if centre.leaving_group:
        words.append(f"loses {centre.leaving_group}")
    words.append(counted(centre.beta_hydrogens, "beta hydrogen") if centre.beta_hydrogens else "no beta hydrogens")
    return ", ".join(words)


def _possible(reading: Reading) -> tuple[Section, ...]:
    if not reading.possible:
        return ()
    shown = reading.possible[:MOST_POSSIBLE]
    left = len(reading.possible) - len(shown)
    table = Table(
        caption="Products that could form, the stated one first where it is among them",
        header=("Fate", "Product", "How"),
        rows=tuple((str(p.fate), p.product, p.note) for p in shown),
    )
    more = (Words(text=f"And {counted(left, 'product')} more.", tone="quiet"),) if left else ()
    return (Section(heading="What could form", blocks=(table, *more)),)
