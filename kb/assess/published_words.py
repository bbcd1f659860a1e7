"""The published estimate as a value, and in plain sentences: what forms, how long it takes, what a drawn centre does.

It owns the shape and the words; figures are worked out by `published`. No markup, at most LINES lines.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.materials.profile import ConditionProfile
from kb.physorg.competition import AlkeneShare, Channel, Competition
from kb.physorg.conversion import DEFAULT_TIME_H, in_words
from kb.physorg.step import StepFacts
from kb.physorg.stereo import StereoOutcome
from kb.record.finding import Interval
from kb.vocabulary import Fate

LINES = 6
_WORTH_TELLING = 0.005
_SOURCES = 4
_UNNAMED = ("same", "taken", "between", "as ", "judged", "order of magnitude", "difference")
"""Sources that name no print by themselves."""


@dataclass(frozen=True, slots=True, kw_only=True)
class PublishedEstimate:
    """What published chemistry expects of a plan.

    Attributes:
        fates: shares of everything after the time of the plan, 0..1 with 80 % intervals, the unreacted among
            them, largest first; where no half-life is known, of what reacts. Empty = no honest number.
        of_what_reacts: shares with the unreacted left out, as published splits are; empty likewise.
        possible: fates that the structure allows; all of them where the step could not be put to the models.
        channels: what made them, largest share of what reacts first; each lists its terms and sources.
        alkenes: each alkene's share of all that reacts and of the alkenes.
        stereo: what becomes of a drawn centre; None = no centre drawn, or no number.
        half_life_h: to about a factor of ten, at 1 M of reagent [h]; None without a number.
        note: plain words: what it rests on, or why there is no number.
        sources: in order of appearance.
        step: the step as the models were asked; None where it could not be put so.
    """

    fates: tuple[tuple[Fate, Interval], ...] = ()
    of_what_reacts: tuple[tuple[Fate, Interval], ...] = ()
    possible: frozenset[Fate] = frozenset(Fate)
    channels: tuple[Channel, ...] = ()
    alkenes: tuple[AlkeneShare, ...] = ()
    stereo: StereoOutcome | None = None
    half_life_h: Interval | None = None
    note: str = ""
    sources: tuple[str, ...] = ()
    step: StepFacts | None = None

    def among_alkenes(self) -> tuple[tuple[str, Interval], ...]:
        """Return each alkene worth telling with its share of the alkenes, largest first."""
        shares = [(a.label, a.of_alkenes) for a in self.alkenes if a.of_alkenes.mean >= _WORTH_TELLING]
        return tuple(
            (name, Interval(mean=round(s.mean, 4), low=round(s.low, 4), high=round(s.high, 4))) for name, s in shares
        )

    def as_lines(self) -> tuple[str, ...]:
        """Return plain sentences for a person, LINES at most; the note alone where there is no number."""
        if not self.fates:
            return (self.note,) if self.note else ()
        told = [
            f"{fate} {_pct(i.mean)} ({_pct(i.low)} to {_pct(i.high)})"
            for fate, i in self.fates
            if i.high >= _WORTH_TELLING
        ]
        lines = [f"Published rates expect {', '.join(told)}."]
        main = [f"{c.name} ({_pct(c.share.mean)})" for c in self.channels if c.share.mean >= 0.05][:3]
        if main:
            lines.append(f"Of what reacts: {', '.join(main)}.")
        alkenes = [
            f"{a.label} {_pct(a.of_alkenes.mean)}" for a in self.alkenes if a.of_alkenes.mean >= _WORTH_TELLING
        ][:4]
        if alkenes and any(a.of_all.mean >= 0.01 for a in self.alkenes):
            lines.append(f"Of the alkenes: {', '.join(alkenes)}.")
        if self.stereo is not None:
            lines.append(f"The drawn centre of the substituted product: {self.stereo.word}. {self.stereo.why}")
        if self.note:
            lines.append(self.note)
        named = [s for s in self.sources if not s.startswith(_UNNAMED)]
        if named:
            more = len(named) - _SOURCES
            rest = f"; and {more} more" if more > 0 else ""
            lines.append(f"Sources: {'; '.join(named[:_SOURCES])}{rest}.")
        return tuple(lines[:LINES])


def pace_words(result: Competition, profile: ConditionProfile) -> str:
    """Return how long it takes and what that leaves, or that it cannot be told."""
    half_life, left = result.half_life_h, dict(result.fates_after).get(Fate.UNREACTED)
    if half_life is None or left is None:
        return "What sets the pace is not in the tables: shares are of what reacts, not of what was charged."
    at = f"{profile.temperature_c:g} °C" if profile.temperature_c is not None else "25 °C taken"
    hours = profile.time_h or DEFAULT_TIME_H
    time = f"after {in_words(hours)}" + ("" if profile.time_h else " (no time given)")
    if left.mean > 0.5:
        so = f"so mostly starting material {time}"
    elif left.mean > 0.1:
        so = f"so some starting material is left {time}"
    elif left.high > 0.1:
        so = f"so starting material may be left {time}"
    else:
        so = f"so nearly all has reacted {time}"
    low, high = in_words(half_life.low), in_words(half_life.high)
    spread = f" ({low} to {high})" if low != high else ""
    about = in_words(half_life.mean)
    about = about if about.startswith(("less", "more")) else f"about {about}"
    return f"At {at}, half-life {about}{spread} at 1 M of reagent, {so}."


def _pct(share: float) -> str:
    return f"{100 * share:.0f} %"
