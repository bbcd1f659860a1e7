"""`route FILE`: a sequence of steps, what it yields, what it needs, where it is weak."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Optional

import typer

from kb.cli.audit_commands import HtmlFlag, MarkdownFlag, write_pages
from kb.cli.session import current_session

EXAMPLE = """A route file in TOML (JSON with the same words will do):

\b
    target = "2 g"                      or "5 mmol"
    product = "NCCc1ccccc1"             SMILES, for grams
    [material.bromide]
    smiles = "BrCCc1ccccc1"
    price_per_g = 0.4
    [[step]]
    name = "azide"
    from = "bromide"                    default: the step before
    run = "R-0042"                      recorded; or plan = {...}, estimated
    [[step]]
    name = "amine"
    yield = "82 (75 to 89)"             given, percent
    cheap_input = true                  a poor yield does not matter here; or
                                        easy_separation, volatile_by_product
    cost_per_mmol = 0.1                 reagents and work, per mmol put in

A `yield` may have a `plan` beside it, which is then checked for findings only. Where anything has a price, steps are
weighed in money; what a cheap_input step takes costs nothing unless it has a price. A branch joins by
`from = ["amine", { name = "acid", equiv = 1.2 }]`, main line first."""


def register(app: typer.Typer) -> None:
    """Add the command of this file."""
    app.command("route", epilog=EXAMPLE)(route)


def route(
    file: Annotated[Path, typer.Argument(metavar="FILE", help="The route, TOML or JSON; see below.")],
    what_if: Annotated[
        Optional[list[str]],  # noqa: UP045 - read at run time
        typer.Option(
            "--what-if", metavar="STEP=PCT", help='Another yield in a step, 90 or "82 (75 to 89)"; repeatable.'
        ),
    ] = None,
    target: Annotated[
        Optional[str],  # noqa: UP045 - read at run time
        typer.Option("--target", metavar="AMOUNT", help='Another amount wanted: "2 g" or "5 mmol".'),
    ] = None,
    html: HtmlFlag = None,
    md: MarkdownFlag = None,
) -> None:
    """Reckon a sequence of steps: overall yield, needed material, the weakest step."""
    from kb.book import reckon_route, route_lead
    from kb.cli.render_audit import render_route

    session = current_session()
    with session.opened(read_only=True) as book:
        with session.progress("Checking the steps") as progress:
            ledger = reckon_route(book, file, what_if or (), target or "", progress)
        write_pages(session, book, ledger, html, md)
    session.answer(ledger.as_dict(), render_route(ledger, route_lead(ledger), verbose=session.verbose))
