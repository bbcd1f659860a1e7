"""The interval of a counted share.

It owns one formula. Source: E. B. Wilson, J. Am. Stat. Assoc. 1927, 22, 209 (score interval),
doi:10.1080/01621459.1927.10502953; chosen because it stays within 0..1 and says something sensible of 0 out of 3.
"""

from __future__ import annotations

import math

from kb.record.finding import Interval

Z80 = 1.2815515655446004
"""90th centile of the normal distribution, so that 80 % lie within."""


def counted_share(hits: float, total: float, z: float = Z80) -> Interval | None:
    """Return hits / total with its Wilson interval (0..1); None where nothing was counted.

    >>> counted_share(0, 3).high < 0.4
    True
    """
    if total <= 0:
        return None
    share = hits / total
    shrink = 1 + z * z / total
    middle = (share + z * z / (2 * total)) / shrink
    half = z / shrink * math.sqrt(share * (1 - share) / total + z * z / (4 * total * total))
    return Interval(mean=round(share, 4), low=round(max(middle - half, 0.0), 4), high=round(min(middle + half, 1.0), 4))
