"""What becomes of a drawn centre: inversion, loss of configuration, or, now and then, net retention.

It owns the words and the net inversion of each channel; the shares come from `competition`. Net inversion
is counted from -1 (all retained) over 0 (racemic) to +1 (all inverted) and is never clamped at zero: net
retention is documented (tertiary benzylic esters with water, trifluoroethanol; F. A. Carey & R. J.
Sundberg, Part A, Scheme 4.2).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from kb.physorg.competition import Channel, Competition, Share
from kb.physorg.constants import get_constant
from kb.physorg.medium import n_t_of
from kb.physorg.step import Centre, StepFacts
from kb.vocabulary import CarbonClass, Fate

_Z80 = 1.2816
_FEEBLE_N_T = -2.5
"""N_T below which the solvent does not wait behind the leaving group (TFE, HFIP); judged."""


@dataclass(frozen=True, slots=True, kw_only=True)
class StereoOutcome:
    """What to expect at the centre of the substituted product.

    Attributes:
        word: "inversion", "mostly inversion", "racemisation with some inversion", "racemisation" or
            "unsettled".
        net_inversion: -1..1 with 80 % interval, over the substituted product only.
        why: plain words.
        sources: of the figures.
    """

    word: str
    net_inversion: Share
    why: str
    sources: tuple[str, ...] = ()


def expect_stereo(step: StepFacts, result: Competition) -> StereoOutcome | None:
    """Return what becomes of the configuration in the substituted product; None where nothing substitutes."""
    made = [c for c in result.channels if c.fate is Fate.SUBSTITUTION and c.share.mean > 0]
    whole = sum(c.share.mean for c in made)
    if whole <= 0:
        return None
    key = _key(step.centre)
    row, shift = get_constant("net_inversion", key), get_constant("net_inversion", "ionising solvent")
    mean, sigma, sources = row.value, row.sigma, [row.source]
    n_t = n_t_of(step.medium)
    if n_t is not None and n_t[0] < _FEEBLE_N_T:
        mean, sigma = mean + shift.value, math.hypot(sigma, shift.sigma)
        sources.append(shift.source)
    free = sum(c.share.mean for c in made if _is_free(c)) / whole
    # From mostly by the back (free = low) to mostly by the cation, as the channels' own intervals allow.
    low_free, high_free = _bounds(made)
    net = Share(
        mean=_mixed(free, mean),
        low=max(min(_mixed(high_free, mean - _Z80 * sigma), _mixed(free, mean - _Z80 * sigma)), -1.0),
        high=min(_mixed(low_free, min(mean + _Z80 * sigma, 1.0)), 1.0),
    )
    return StereoOutcome(
        word=_word(net),
        net_inversion=net,
        why=(
            f"{100 * (1 - free):.0f} % of the substitution comes from the back and inverts; "
            f"{100 * free:.0f} % goes through a {_cation_word(step.centre)} cation or ion pair."
        ),
        sources=tuple(sources),
    )


def _key(centre: Centre) -> str:
    kind = "tertiary" if centre.carbon_class is CarbonClass.TERTIARY else "secondary"
    return f"{kind} benzylic" if centre.is_stabilised else kind


def _cation_word(centre: Centre) -> str:
    """Return what the cation is called; donor-stabilised and allylic ones share the figures of benzylic ones."""
    if centre.oxocarbenium:
        return f"{centre.oxocarbenium.removeprefix('alpha-')}-stabilised"
    if "allylic" in centre.activations and "benzylic" not in centre.activations:
        return _key(centre).replace("benzylic", "allylic")
    return _key(centre)


def _is_free(channel: Channel) -> bool:
    return channel.kind == "ionisation"


def _mixed(free: float, net_of_free: float) -> float:
    return (1 - free) + free * net_of_free


def _bounds(made: list[Channel]) -> tuple[float, float]:
    """Return the least and greatest fraction through the cation that the channels' intervals allow."""
    free_low = sum(c.share.low for c in made if _is_free(c))
    free_high = sum(c.share.high for c in made if _is_free(c))
    back_low = sum(c.share.low for c in made if not _is_free(c))
    back_high = sum(c.share.high for c in made if not _is_free(c))
    low = free_low / (free_low + back_high) if free_low + back_high > 0 else 0.0
    high = free_high / (free_high + back_low) if free_high + back_low > 0 else 1.0
    return low, high


def _word(net: Share) -> str:
    if net.low >= 0.9:
        return "inversion"
    if net.high - net.low > 0.9:
        return "unsettled"
    if net.mean >= 0.6:
        return "mostly inversion"
    if net.mean >= 0.2:
        return "racemisation with some inversion"
    return "racemisation"
