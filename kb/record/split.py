"""Integrals or peak areas to a molar split with its uncertainty, and to an assay yield against a standard.

It owns the arithmetic, not the reading of spectra. Amount = integral / protons counted (NMR) or area x response
factor (GC, HPLC). The uncertainty of an integral is a relative part and a floor relative to the largest one; both are
common practice (some 3 % with a proper relaxation delay, 0.5 % for baseline) and can be given. Shares carry first-order
error propagation; integrals are taken as independent.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from kb.errors import QuantityError
from kb.record.finding import Interval

RELATIVE_ERROR = 0.03
FLOOR_ERROR = 0.005
_Z80 = 1.2816  # 90th centile of the normal distribution, so that 80 % lie within


@dataclass(frozen=True, slots=True, kw_only=True)
class Signal:
    """One integral or area.

    Attributes:
        value: integral or area, any scale; 0 = looked for and not there.
        per_molecule: protons counted, or 1 / response factor; > 0.
    """

    value: float
    per_molecule: float = 1.0

    def __post_init__(self) -> None:
        if not (math.isfinite(self.value) and self.value >= 0):
            raise QuantityError(f"An integral of {self.value:g} cannot be.", "Give zero or more.", self.value)
        if not (math.isfinite(self.per_molecule) and self.per_molecule > 0):
            raise QuantityError(
                f"{self.per_molecule:g} protons cannot be counted.",
                "Give a number above zero.",
                self.per_molecule,
            )

    @property
    def amount(self) -> float:
        """Return the relative molar amount."""
        return self.value / self.per_molecule


@dataclass(frozen=True, slots=True, kw_only=True)
class Split:
    """Shares per label 0..1 with 80 % intervals, in the order given, and the assay yield [%] where a standard was."""

    shares: tuple[tuple[str, Interval], ...]
    assay_yield_pct: Interval | None = None


def split_from_signals(
    signals: Mapping[str, Signal], relative_error: float = RELATIVE_ERROR, floor_error: float = FLOOR_ERROR
) -> Split:
    """Turn signals into a molar split.

    Args:
        signals: label to signal; labels are fates or names of products.
        relative_error: standard deviation of an integral relative to itself.
        floor_error: standard deviation relative to the largest integral, added in quadrature.

    Raises:
        QuantityError: no signal, or all zero.

    >>> split = split_from_signals({"ether": Signal(value=2.0, per_molecule=2), "alkene": Signal(value=1.0)})
    >>> [round(i.mean, 2) for _, i in split.shares]
    [0.5, 0.5]
    """
    total = sum(s.amount for s in signals.values())
    if total <= 0:
        raise QuantityError("All integrals are zero.", "Give at least one above zero.")
    largest = max(s.value for s in signals.values())
    variance = {
        label: ((relative_error * s.value) ** 2 + (floor_error * largest) ** 2) / s.per_molecule**2
        for label, s in signals.items()
    }
    shares = []
    for label, signal in signals.items():
        share = signal.amount / total
        rest = sum(v for other, v in variance.items() if other != label)
        sd = math.sqrt((1 - share) ** 2 * variance[label] + share**2 * rest) / total
        shares.append((label, _interval(share, sd, 1.0)))
    return Split(shares=tuple(shares))


def assay_yield(
    product: Signal,
    standard: Signal,
    standard_mmol: float,
    scale_mmol: float,
    relative_error: float = RELATIVE_ERROR,
) -> Interval:
    """Return the assay yield [%] from a product signal beside a weighed internal standard.

    Args:
        product, standard: signals of one spectrum or chromatogram.
        standard_mmol: weighed in [mmol].
        scale_mmol: substrate charged [mmol].

    Raises:
        QuantityError: an amount that is not above zero, or a standard without signal.
    """
    for what, value in (("standard", standard_mmol), ("scale", scale_mmol)):
        if not (math.isfinite(value) and value > 0):
            raise QuantityError(f"{value:g} mmol of {what} cannot be.", "Give an amount above zero.", value)
    if standard.value <= 0:
        raise QuantityError("The standard's integral is zero.", "Integrate a resolved signal of the standard.")
    yield_pct = 100 * product.amount / standard.amount * standard_mmol / scale_mmol
    return _interval(yield_pct, yield_pct * relative_error * math.sqrt(2), math.inf)


def _interval(mean: float, sd: float, top: float) -> Interval:
    half = _Z80 * sd
    return Interval(mean=round(mean, 4), low=round(max(mean - half, 0.0), 4), high=round(min(mean + half, top), 4))
