"""Channels in competition: their rates, the split they give, and how sure it is.

It owns which channels a step has and how their rates become shares with 80 % intervals; the rates
themselves are in `rates`, `elimination` and `cation`. Refuses a number where published chemistry gives
none, with the reason. Invariants: shares of all fates add up to 1 in every sample; a term that two channels
share moves both together, so that it cancels where it should; the sampling has a fixed seed, so the same
step always gives the same figures. `fates` are shares of what reacts; `fates_after` are shares of everything
after a time, starting material among them, from the same samples. The pace is good to about a factor of ten.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from kb.physorg.cation import Branch, partition
from kb.physorg.channels import Draft, list_channels
from kb.physorg.conversion import DEFAULT_TIME_H, unreacted
from kb.physorg.rates import NEEDS_ACTIVATION, closed_because
from kb.physorg.step import StepFacts
from kb.physorg.terms import Term, spread, total
from kb.vocabulary import Fate

LEVEL = 0.8
SAMPLES = 1500
FEW_SAMPLES = 200
_SEED = 20


@dataclass(frozen=True, slots=True, kw_only=True)
class Share:
    """A mean with the bounds of its 80 % interval (a share 0..1 unless said otherwise)."""

    mean: float
    low: float
    high: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Channel:
    """One way in which the step can go.

    Attributes:
        name: "SN2 by azide", "E2 towards C3", "ionisation, then capture by the solvent"...
        kind: "sn2", "sn2'", "closure", "solvent", "e2", "e1cb", "soft e2", "ionisation".
        fate: where its product counts.
        log10_rate: of its constant in 1/s at 1 M, central value.
        sigma: one standard deviation of it, shared terms included.
        terms: what it is made of, for "why".
        alkenes: (label, geometry, fraction of the channel).
        is_capture: a bond forms at a free cation.
        share: of all that reacts.
    """

    name: str
    kind: str
    fate: Fate
    log10_rate: float
    sigma: float
    terms: tuple[Term, ...]
    alkenes: tuple[tuple[str, str, float], ...] = ()
    is_capture: bool = False
    share: Share


@dataclass(frozen=True, slots=True, kw_only=True)
class AlkeneShare:
    """One alkene.

    Attributes:
        label, geometry: see `kb.physorg.step.Alkene`.
        of_all: share of all that reacts.
        of_alkenes: share among the alkenes.
    """

    label: str
    geometry: str
    of_all: Share
    of_alkenes: Share


@dataclass(frozen=True, slots=True, kw_only=True)
class Competition:
    """What published chemistry expects of a step.

    Attributes:
        fates: shares of what reacts, largest first; empty = no honest number, and `no_number` says why.
        fates_after: shares of everything after the time asked for, the unreacted among them, largest first; empty
            without a half-life.
        channels: largest share first.
        alkenes: largest first.
        notes: what the figure rests on and what widens it.
        no_number: why there is none; "" where there is one.
        half_life_h: at 1 M of reagent and the temperature taken [h], with 80 % interval; None without a
            number or where a promoter sets the pace.
        sources: of the terms that made the channels above 1 %, in order of appearance.
    """

    fates: tuple[tuple[Fate, Share], ...] = ()
    fates_after: tuple[tuple[Fate, Share], ...] = ()
    channels: tuple[Channel, ...] = ()
    alkenes: tuple[AlkeneShare, ...] = ()
    notes: tuple[str, ...] = ()
    no_number: str = ""
    half_life_h: Share | None = None
    sources: tuple[str, ...] = ()

    def share_of(self, fate: Fate) -> Share | None:
        """Return the share of a fate; None = no number, zero shares where the fate has no channel."""
        if not self.fates:
            return None
        return next((s for f, s in self.fates if f is fate), Share(mean=0.0, low=0.0, high=0.0))


def compete(step: StepFacts, time_h: float = DEFAULT_TIME_H) -> Competition:
    """Return the split that the channels of a step give and what it makes of a time, or why there is none."""
    reason = closed_because(step)
    if reason:
        return Competition(no_number=reason)
    ways = partition(step)
    drafts = list_channels(step, ways)
    if not drafts:
        return Competition(no_number=_nothing_reacts(step))
    (rates,) = sample_rates([(drafts, ways)])
    shares = rates / rates.sum(axis=0)
    channels = sorted(
        (
            Channel(
                name=d.name,
                kind=d.kind,
                fate=d.fate,
                log10_rate=float(np.median(np.log10(rates[i]))),
                sigma=spread(d.terms),
                terms=d.terms,
                alkenes=d.alkenes,
                is_capture=d.is_capture,
                share=_share(shares[i]),
            )
            for i, d in enumerate(drafts)
        ),
        key=lambda c: -c.share.mean,
    )
    whole = np.log(2) / rates.sum(axis=0) / 3600
    half_life = _half_life(step, whole)
    return Competition(
        fates=_fates(drafts, shares),
        fates_after=_after(drafts, shares, unreacted(rates, time_h)) if half_life else (),
        channels=tuple(channels),
        alkenes=_alkenes(drafts, shares),
        notes=_notes(step, channels),
        half_life_h=half_life,
        sources=_sources(channels),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Quick:
    """The means of a competition without intervals.

    Attributes:
        shares: per fate, 0..1, of everything after the time asked for; of what reacts where there is no half-life.
        half_life_h: as in `Competition`, central value; None likewise.
    """

    shares: tuple[tuple[Fate, float], ...]
    half_life_h: float | None


@lru_cache(maxsize=16384)
def compete_quickly(step: StepFacts, time_h: float = DEFAULT_TIME_H) -> Quick | None:
    """Return mean shares and half-life alone, for comparing many steps; None = no honest number.

    From fewer samples than `compete` (FEW_SAMPLES), good to about two points; intervals, channels and words are left
    out.
    """
    if closed_because(step):
        return None
    ways = partition(step)
    drafts = list_channels(step, ways)
    if not drafts:
        return None
    (rates,) = sample_rates([(drafts, ways)], FEW_SAMPLES)
    is_paced = not _is_paced_by_promoter(step)
    left = unreacted(rates, time_h) if is_paced else np.zeros(rates.shape[1])
    means = (rates / rates.sum(axis=0) * (1 - left)).mean(axis=1)
    shares: dict[Fate, float] = {Fate.UNREACTED: float(left.mean())} if is_paced else {}
    for draft, mean in zip(drafts, means, strict=True):
        shares[draft.fate] = shares.get(draft.fate, 0.0) + float(mean)
    half_life = float(np.log(2) / np.median(rates.sum(axis=0)) / 3600) if is_paced else None
    return Quick(shares=tuple(shares.items()), half_life_h=half_life)


Drafts = tuple[Sequence[Draft], Sequence[Branch]]
"""The channels of a step and the ways out of its cation."""


def sample_rates(steps: Sequence[Drafts], samples: int = SAMPLES) -> list[NDArray[np.float64]]:
    """Return sampled rates of some steps, each (channels, samples).

    Terms that are equal share their draw, between channels and between steps: what two steps have in common cancels
    where they are compared.
    """
    keys: dict[tuple[str, str, float], int] = {}
    for drafts, ways in steps:
        for terms in [d.terms for d in drafts] + [w.terms for w in ways]:
            for t in terms:
                if t.sigma:
                    keys.setdefault((t.because, t.source, t.sigma), len(keys))
    draws = np.random.default_rng(_SEED).standard_normal((len(keys), samples // 2))
    draws = np.concatenate([draws, -draws], axis=1)  # antithetic: the median stays where the terms put it

    def sampled(terms: Sequence[Term]) -> NDArray[np.float64]:
        value = np.full(draws.shape[1], total(terms))
        for t in terms:
            if t.sigma:
                value = value + t.sigma * draws[keys[(t.because, t.source, t.sigma)]]
        return value

    return [_rates(drafts, ways, sampled, draws.shape[1]) for drafts, ways in steps]


def _rates(
    drafts: Sequence[Draft],
    ways: Sequence[Branch],
    sampled: Callable[[Sequence[Term]], NDArray[np.float64]],
    samples: int,
) -> NDArray[np.float64]:
    used = {d.branch for d in drafts if d.branch is not None}
    log_ways = np.array([sampled(w.terms) if i in used else np.full(samples, -99.0) for i, w in enumerate(ways)])
    log_whole = np.log10((10.0**log_ways).sum(axis=0)) if len(ways) else None
    rows = []
    for d in drafts:
        value = sampled(d.terms)
        if d.branch is not None and log_whole is not None:
            value = value + log_ways[d.branch] - log_whole
        rows.append(value)
    return np.asarray(10.0 ** np.clip(np.array(rows), -60.0, 30.0))


def _share(values: NDArray[np.float64]) -> Share:
    low, high = np.quantile(values, [(1 - LEVEL) / 2, (1 + LEVEL) / 2])
    mean = float(values.mean())
    return Share(mean=mean, low=min(float(low), mean), high=max(float(high), mean))


def _half_life(step: StepFacts, hours: NDArray[np.float64]) -> Share | None:
    """Return the half-life, None where a promoter sets the pace and its amount is not known."""
    if _is_paced_by_promoter(step):
        return None
    low, high = np.quantile(hours, [(1 - LEVEL) / 2, (1 + LEVEL) / 2])
    return Share(mean=float(np.exp(np.log(hours).mean())), low=float(low), high=float(high))


def _is_paced_by_promoter(step: StepFacts) -> bool:
    medium = step.medium
    if medium.lewis_acid == "strong" or medium.activates_hydroxyl or medium.halophile in ("silver", "mercury"):
        return True
    return step.leaving_group in NEEDS_ACTIVATION


def _fates(drafts: Sequence[Draft], shares: NDArray[np.float64]) -> tuple[tuple[Fate, Share], ...]:
    found = []
    for fate in dict.fromkeys(d.fate for d in drafts):
        rows = [i for i, d in enumerate(drafts) if d.fate is fate]
        found.append((fate, _share(shares[rows].sum(axis=0))))
    return tuple(sorted(found, key=lambda pair: -pair[1].mean))


def _after(
    drafts: Sequence[Draft], shares: NDArray[np.float64], left: NDArray[np.float64]
) -> tuple[tuple[Fate, Share], ...]:
    """Return shares of everything, given what is left in each sample."""
    found = [*_fates(drafts, shares * (1 - left)), (Fate.UNREACTED, _share(left))]
    return tuple(sorted(found, key=lambda pair: -pair[1].mean))


def _alkenes(drafts: Sequence[Draft], shares: NDArray[np.float64]) -> tuple[AlkeneShare, ...]:
    sums: dict[tuple[str, str], NDArray[np.float64]] = {}
    for i, d in enumerate(drafts):
        for label, geometry, fraction in d.alkenes:
            key = (label, geometry)
            sums[key] = sums.get(key, np.zeros(shares.shape[1])) + fraction * shares[i]
    if not sums:
        return ()
    whole = np.sum(list(sums.values()), axis=0)
    safe = np.where(whole > 0, whole, 1.0)
    return tuple(
        sorted(
            (
                AlkeneShare(label=label, geometry=geometry, of_all=_share(v), of_alkenes=_share(v / safe))
                for (label, geometry), v in sums.items()
            ),
            key=lambda a: -a.of_alkenes.mean,
        )
    )


def _notes(step: StepFacts, channels: Sequence[Channel]) -> tuple[str, ...]:
    medium, notes = step.medium, []
    notes.append("Published relative rates put together as a sum.")
    if medium.temperature_c is None:
        notes.append("Temperature not recorded: 25 °C taken.")
    if not medium.solvent_kinds:
        notes.append("Solvent not known: solvolysis left out, base and nucleophile strength less sure.")
    if not medium.is_complete:
        notes.append("A component could not be classified; what it does is not in the figure.")
    if step.closure is not None and step.closure.is_aligned is False:
        notes.append("As drawn, the attacking atom cannot stand behind the leaving group: no ring closes.")
    if medium.activates_hydroxyl:
        notes.append("The group is activated in the flask; which activated species reacts is not modelled.")
    if any(t.because.startswith("published figures") for c in channels for t in c.terms):
        notes.append("Published figures for this kind of step disagree; the interval is meant to hold both.")
    return tuple(notes)


def _sources(channels: Sequence[Channel]) -> tuple[str, ...]:
    found = (t.source for c in channels if c.share.mean >= 0.01 for t in c.terms)
    return tuple(s for s in dict.fromkeys(found) if s and not s.startswith("reference"))


def _nothing_reacts(step: StepFacts) -> str:
    if not step.medium.solvent_kinds and step.medium.nucleophile is None and step.medium.base is None:
        return "No nucleophile, base or solvent is known, so there is nothing to set against the leaving group."
    return (
        "Nothing in the flask that these tables know attacks this centre or takes a hydrogen from it, "
        "and it does not ionise here. No honest number."
    )
