"""`split`: integrals or areas to a molar split, an assay yield, a mass balance and the difference of two barriers.

With --series also what heat does to a split: the line of ln(ratio) against 1/T and the temperature for a target.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Optional

import typer

from kb.cli.render import wrapped
from kb.cli.session import current_session
from kb.plain import plain, shortened

if TYPE_CHECKING:
    from kb.book import SplitAnswer
    from kb.book.series_words import SeriesAnswer

Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time
Words = Optional[list[str]]  # noqa: UP045
SHORT_PCT, OVER_PCT = 90.0, 110.0
"""Recoveries outside these are remarked on (common practice)."""


def register(app: typer.Typer) -> None:
    """Add the command of this file."""
    app.command("split")(split)


def split(
    signals: Annotated[
        Words,
        typer.Argument(metavar="LABEL=VALUE/COUNT...", help="substitution=1.00/2: integral, then protons under it."),
    ] = None,
    areas: Annotated[
        bool, typer.Option("--areas", help="GC or HPLC areas: COUNT is the relative response, 1 if left out.")
    ] = False,
    standard: Annotated[Word, typer.Option("--standard", metavar="VALUE/COUNT", help="Internal standard.")] = None,
    standard_mmol: Annotated[Word, typer.Option("--standard-mmol", metavar="N", help="Its amount [mmol].")] = None,
    scale: Annotated[Word, typer.Option("--scale", metavar="N", help="Substrate charged, e.g. 5 mmol.")] = None,
    of: Annotated[Word, typer.Option("--of", metavar="LABEL", help="Assay yield of which; default the first.")] = None,
    temp: Annotated[Word, typer.Option("--temp", metavar="T", help="At which the split was set; default 25C.")] = None,
    error: Annotated[Word, typer.Option("--error", metavar="PCT", help="Error of one integral; default 3 %.")] = None,
    series: Annotated[
        Words,
        typer.Option(
            "--series", metavar="T:SIGNALS", help="One temperature: 25C:substitution=83,elimination=17; repeatable."
        ),
    ] = None,
    target: Annotated[
        Word, typer.Option("--target", metavar="LABEL=PCT", help="With --series: the temperature for that share.")
    ] = None,
) -> None:
    """Turn integrals or areas into a molar split with its uncertainty."""
    from kb.book import split_from_words

    session = current_session()
    if series or target is not None:
        _answer_series(signals or [], series or [], target, areas=areas, error=error)
        return
    if not signals:
        raise typer.BadParameter("Give signals such as substitution=1.00/2, or --series.")
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
    if answer.recovered_pct is not None:
        lines += wrapped(_balance(answer.recovered_pct.mean, answer.recovered_pct.low, answer.recovered_pct.high))
    if answer.delta_delta_g_kj_mol is not None and answer.compared is not None:
        d = answer.delta_delta_g_kj_mol
        assumed = " assumed" if answer.is_temperature_assumed else ""
        lines += wrapped(
            f"RT ln({answer.compared[0]}/{answer.compared[1]}): {d.mean:.2f} kJ/mol ({d.low:.1f} to {d.high:.1f}) "
            f"at {answer.temperature_c:g} °C{assumed}"
        )
    lines.append("Intervals hold 80 %.")
    return "\n".join(lines)


def _balance(mean: float, low: float, high: float) -> str:
    """Return the mass balance in words."""
    said = f"mass balance: {mean:.0f} % ({low:.0f} to {high:.0f}) of what was charged is accounted for"
    if high < SHORT_PCT:
        return f"{said}; the rest is in no signal that was given: volatile, lost in work-up, or something not seen"
    if low > OVER_PCT:
        return f"{said}; more than was charged: look at the standard's weight, its relaxation and the proton counts"
    return said


def _answer_series(
    signals: list[str], series: list[str], target: str | None, *, areas: bool, error: str | None
) -> None:
    from kb.book.series_words import series_from_words

    if signals:
        raise typer.BadParameter("With --series every split is given there, as 25C:substitution=83,elimination=17.")
    session = current_session()
    answer = series_from_words(series, areas=areas, target=target, error=error)
    session.answer(answer.as_dict(), _series_text(answer))


def _series_text(answer: SeriesAnswer) -> str:
    first, second = (shortened(plain(label), 24) for label in answer.compared)
    lines = []
    for at_c, split in answer.points:
        shares = ", ".join(f"{shortened(plain(label), 24)} {100 * share.mean:.1f} %" for label, share in split.shares)
        lines += wrapped(f"{at_c:>6g} °C  {shares}")
    h, s = answer.delta_delta_h_kj_mol, answer.delta_delta_s_j_mol_k
    lines += wrapped(
        f"barrier of {second} less that of {first}: enthalpy {h.mean:.1f} kJ/mol ({h.low:.1f} to {h.high:.1f}), "
        f"entropy {s.mean:.0f} J/(mol K) ({s.low:.0f} to {s.high:.0f}); heat favours {second if h.mean > 0 else first}."
    )
    if len(answer.points) > 2:
        lines += wrapped(f"Deviation of ln(ratio) from the line: {answer.residual:.3f}.")
    if answer.target is not None:
        label, share = answer.target
        what = f"{100 * share:g} % {shortened(plain(label), 24)} of the two"
        if answer.target_c is None:
            lines += wrapped(f"{what}: no temperature in reach gives that.")
        else:
            t = answer.target_c
            low, high = answer.measured_c
            out = f", outside the {low:g} to {high:g} °C that were measured" if answer.is_extrapolated else ""
            lines += wrapped(f"{what}: at {t.mean:.0f} °C ({t.low:.0f} to {t.high:.0f}){out}.")
    lines.append("Intervals hold 80 % as far as the integrals go.")
    return "\n".join(lines)
