"""How much is left after a time: shares of everything, the starting material among them.

It owns that arithmetic, first order at 1 M of reagent, and its words. The rates are those that made the shares, sample
by sample, so that all shares still add up to 1 in every one. Times are in hours.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

DEFAULT_TIME_H = 24.0
"""Taken where no time is recorded; a day, said wherever it is used."""


def unreacted(rates: NDArray[np.float64], time_h: float) -> NDArray[np.float64]:
    """Return what is left (samples), 0..1, of channels with these rates (channels, samples) [1/s]."""
    return np.asarray(np.exp(-np.clip(rates.sum(axis=0) * 3600 * time_h, 0.0, 700.0)))


def in_words(time_h: float) -> str:
    """Return a time to two figures in the unit that a person would use.

    >>> in_words(743.0), in_words(0.02), in_words(17_000)
    ('740 h', '1.2 min', '17,000 h')
    """
    if time_h < 1 / 60:
        return "less than a minute"
    value, unit = (time_h * 60, "min") if time_h < 1 else (time_h, "h")
    if value >= 1e6:
        return "more than a million h"
    rounded = float(f"{value:.2g}")
    return f"{rounded:,.0f} {unit}" if rounded >= 10 else f"{rounded:g} {unit}"
