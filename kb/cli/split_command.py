"""`split`: integrals or areas to a molar split, an assay yield and the difference of two barriers."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Optional

import typer

from kb.cli.render import wrapped
from kb.cli.session import current_session
from kb.plain import plain, shortened

if TYPE_CHECKING:
    from kb.book import SplitAnswer

Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time


def register(app: typer.Typer) -> None:
    """Add the command of this file."""
    app.command("split")(split)


def split(
    signals: Annotated[
        list[str],
        typer.Argument(metavar="LABEL=VALUE/COUNT...", help="substitution=1.00/2: integral, then protons under it."),
    ],
    areas: Annotated[
        bool, typer.Option("--areas", help="GC or HPLC areas: COUNT is the relative response, 1 if left out.")
    ] = False,
    standard: Annotated[Word, typer.Option("--standard", metavar="VALUE/COUNT", help="Internal standard.")] = None,
    standard_mmol: Annotated[Word, typer.Option("--standard-mmol", metavar="N", help="Its amount [mmol].")] = None,
    scale: Annotated[Word, typer.Option("--scale", metavar="N", help="Substrate charged, e.g. 5 mmol.")] = None,
    of: Annotated[Word, typer.Option("--of", metavar="LABEL", help="Assay yield of which; default the first.")] = None,
    temp: Annotated[Word, typer.Option("--temp", metavar="T", help="At which the split was set; default 25C.")] = None,
    error: Annotated[Word, typer.Option("--error", metavar="PCT", help="Error of one integral; default 3 %.")] = None,
) -> None:
    """Turn integrals or areas into a molar split with its uncertainty."""
    from kb.book import split_from_words

    session = current_session()
    answer = split_from_words(
        signals,
        areas=areas,
        standard=standard,
        standard_mmol=standard_mmol,
        scale=scale,
        of=of,
        temperature=temp,
        error=error,
    )
    session.answer(answer.as_dict(), _text(answer))
    if answer.is_uncounted:
        session.say("No protons were counted: the values were taken for relative amounts. Write substitution=1.00/2.")


def _text(answer: SplitAnswer) -> str:
    lines = []
    for label, share in answer.shares:
        mean, low, high = (100 * part for part in (share.mean, share.low, share.high))
        lines.append(f"{shortened(plain(label), 24):<24} {mean:5.1f} %  ({low:.1f} to {high:.1f})")
    if answer.assay_yield_pct is not None:
        y = answer.assay_yield_pct
        lines += wrapped(f"assay yield of {answer.assay_of}: {y.mean:.1f} % ({y.low:.1f} to {y.high:.1f})")
    if answer.delta_delta_g_kj_mol is not None and answer.compared is not None:
        d = answer.delta_delta_g_kj_mol
        assumed = " assumed" if answer.is_temperature_assumed else ""
        lines += wrapped(
            f"RT ln({answer.compared[0]}/{answer.compared[1]}): {d.mean:.2f} kJ/mol ({d.low:.1f} to {d.high:.1f}) "
            f"at {answer.temperature_c:g} °C{assumed}"
        )
    lines.append("Intervals hold 80 %.")
    return "\n".join(lines)
