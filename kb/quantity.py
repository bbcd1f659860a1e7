"""Quantities as chemists write them: text to degC, h, mmol, equiv, M and back, the text kept beside the value.

It refuses nonsense with the reason and guesses nothing: "reflux" has no number until a solvent gives one.
Conventions: room temperature is taken as 22 degC (common practice 20 to 25) wherever a number is needed.
"""

from __future__ import annotations

from dataclasses import dataclass

ROOM_TEMPERATURE_C = 22.0  # common practice: 20 to 25 degC


@dataclass(frozen=True, slots=True, kw_only=True)
class Temperature:
    """A bath temperature or a programme of two.

    Attributes:
        text: as written ("0C to rt"); shown wherever the value is.
        start_c: first temperature [degC]; None where only words were given ("reflux").
        end_c: last temperature [degC]; equals start_c for a single value; None as above.
        is_reflux: the text says reflux, so the solvent's boiling point is meant.
    """

    text: str
    start_c: float | None = None
    end_c: float | None = None
    is_reflux: bool = False

    @property
    def high_c(self) -> float | None:
        """Return the most forcing temperature [degC], None where no number is known."""
        known = [t for t in (self.start_c, self.end_c) if t is not None]
        return max(known) if known else None


@dataclass(frozen=True, slots=True, kw_only=True)
class Duration:
    """A reaction time.

    Attributes:
        text: as written ("overnight").
        h: hours; None where only words without a customary value were given. "overnight" is 16 h, common practice.
    """

    text: str
    h: float | None = None
