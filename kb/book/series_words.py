"""Splits of one series at several temperatures, from words: the line of ln(ratio) against 1/T and the way to a target.

It owns the grammar TEMPERATURE:LABEL=VALUE/COUNT,LABEL=VALUE/COUNT and the uncertainty; the line is
`kb.physorg.energetics`, the integrals `kb.book.split_words`. The interval of a figure is that of lines through splits
drawn within the error of their integrals, with a fixed seed: it knows nothing of runs that were not alike.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from kb.book.split_words import SplitAnswer, split_from_words
from kb.errors import QuantityError
from kb.record.finding import Interval
from kb.record.split import RELATIVE_ERROR

DRAWS = 2000
_SEED = 20
_COLDEST_C, _HOTTEST_C = -120.0, 300.0
"""Temperatures beyond which a target counts as out of reach; judgement."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SeriesAnswer:
    """What a series says of heat.

    Attributes:
        points: (temperature [degC], split) in order of temperature.
        compared: (first, second) labels, whose ratio second/first runs with 1/T.
        delta_delta_h_kj_mol: activation enthalpy, second less first, with 80 % interval; positive = heat favours
            the second.
        delta_delta_s_j_mol_k: likewise for the entropy [J/(mol K)].
        residual: root mean square deviation of ln(ratio) from the line; 0 for two temperatures, which cannot show one.
        target: (label, share 0..1 of the two compared) asked for; None = none.
        target_c: temperature at which the line reaches it [degC], with 80 % interval; None = not asked, or never.
        measured_c: lowest and highest temperature measured.
    """

    points: tuple[tuple[float, SplitAnswer], ...]
    compared: tuple[str, str]
    delta_delta_h_kj_mol: Interval
    delta_delta_s_j_mol_k: Interval
    residual: float
    target: tuple[str, float] | None = None
    target_c: Interval | None = None
    measured_c: tuple[float, float]

    @property
    def is_extrapolated(self) -> bool:
        """Return whether the target lies outside what was measured."""
        low, high = self.measured_c
        return self.target_c is not None and not low <= self.target_c.mean <= high

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {
            "points": [{"temperature_c": at_c, "shares": split.as_dict()["shares"]} for at_c, split in self.points],
            "compared": list(self.compared),
            "delta_delta_h_kj_mol": self.delta_delta_h_kj_mol.as_dict(),
            "delta_delta_s_j_mol_k": self.delta_delta_s_j_mol_k.as_dict(),
            "residual": self.residual,
            "target": {"label": self.target[0], "share": self.target[1]} if self.target else None,
            "target_c": self.target_c.as_dict() if self.target_c else None,
            "extrapolated": self.is_extrapolated,
            "measured_c": list(self.measured_c),
        }


def series_from_words(
    texts: Sequence[str], *, areas: bool = False, target: str | None = None, error: str | None = None
) -> SeriesAnswer:
    """Work out a series.

    Args:
        texts: "TEMPERATURE:LABEL=VALUE/COUNT,LABEL=VALUE/COUNT" each; the first two labels are compared.
        areas: the values are areas, and a missing count is 1.
        target: "LABEL=PERCENT", the share of one of the two that is wanted; None = none.
        error: standard deviation of one integral, percent of itself; None = RELATIVE_ERROR.

    Raises:
        QuantityError: anything that cannot be read, labels that differ between temperatures, a product not seen, or
            fewer than two temperatures.
    """
    import numpy as np

    from kb.physorg.energetics import fit_temperature_line
    from kb.quantity import parse_percent

    points = sorted((_point(text, areas=areas, error=error) for text in texts), key=lambda pair: pair[0])
    compared = _compared(points)
    ratios = [_ratio(split, compared, at_c) for at_c, split in points]
    measured = [(at_c, ratio) for (at_c, _), ratio in zip(points, ratios, strict=True)]
    line = fit_temperature_line(measured)
    relative = RELATIVE_ERROR if error is None else parse_percent(error, 50, "error of an integral") / 100
    noise = np.random.default_rng(_SEED).standard_normal((DRAWS, len(measured))) * relative * 2**0.5
    drawn = [
        fit_temperature_line([(t, ratio * float(np.exp(e))) for (t, ratio), e in zip(measured, row, strict=True)])
        for row in noise
    ]
    wanted = _target(target, compared) if target is not None else None
    reached: Interval | None = None
    if wanted is not None:
        of_second = wanted[1] if wanted[0] == compared[1] else 1 - wanted[1]
        aim = of_second / (1 - of_second)
        best = line.temperature_for(aim)
        if best is not None and _COLDEST_C <= best <= _HOTTEST_C:
            others = [t if (t := one.temperature_for(aim)) is not None else _HOTTEST_C for one in drawn]
            reached = _interval(best, [min(max(t, _COLDEST_C), _HOTTEST_C) for t in others], 1)
    return SeriesAnswer(
        points=tuple(points),
        compared=compared,
        delta_delta_h_kj_mol=_interval(line.delta_delta_h_kj_mol, [one.delta_delta_h_kj_mol for one in drawn], 2),
        delta_delta_s_j_mol_k=_interval(line.delta_delta_s_j_mol_k, [one.delta_delta_s_j_mol_k for one in drawn], 1),
        residual=round(line.residual, 4),
        target=wanted,
        target_c=reached,
        measured_c=(line.lowest_c, line.highest_c),
    )


def _point(text: str, *, areas: bool, error: str | None) -> tuple[float, SplitAnswer]:
    at, colon, signals = text.partition(":")
    if not colon or not signals.strip():
        raise QuantityError(
            f"{text!r} is no point of a series.", "Write 25C:substitution=83.2,elimination=16.8 for each.", text
        )
    answer = split_from_words([signals], areas=areas, temperature=at, error=error)
    return answer.temperature_c, answer


def _compared(points: Sequence[tuple[float, SplitAnswer]]) -> tuple[str, str]:
    if not points:
        raise QuantityError("There is no point.", "Write 25C:substitution=83.2,elimination=16.8 for each.")
    labels = [tuple(label for label, _ in split.shares) for _, split in points]
    if len(labels[0]) < 2:
        raise QuantityError("A series compares two products.", "Write both at every temperature.", labels[0])
    first, second = labels[0][:2]
    for (at_c, _), found in zip(points, labels, strict=True):
        if not {first, second} <= set(found):
            raise QuantityError(
                f"At {at_c:g} °C {first} and {second} are not both given.", "Use the same labels throughout.", found
            )
    return first, second


def _ratio(split: SplitAnswer, compared: tuple[str, str], at_c: float) -> float:
    shares = dict(split.shares)
    first, second = (shares[label].mean for label in compared)
    if first <= 0 or second <= 0:
        seen = compared[0] if first <= 0 else compared[1]
        raise QuantityError(
            f"At {at_c:g} °C no {seen} was seen, which gives no ratio.", "Leave that temperature out.", seen
        )
    return second / first


def _target(text: str, compared: tuple[str, str]) -> tuple[str, float]:
    from kb.quantity import parse_percent

    label, equals, value = text.rpartition("=")
    label = label.strip()
    if not equals or label not in compared:
        raise QuantityError(f"{text!r} is no target.", f"Write {compared[1]}=10 for 10 % of the two.", text)
    share = parse_percent(value, 100, "target") / 100
    if not 0 < share < 1:
        raise QuantityError(f"A target of {100 * share:g} % is never reached.", "Give it between 0 and 100.", text)
    return label, share


def _interval(mean: float, drawn: Sequence[float], digits: int) -> Interval:
    import numpy as np

    low, high = np.quantile(np.asarray(drawn), [0.1, 0.9])
    return Interval(
        mean=round(mean, digits),
        low=round(min(float(low), mean), digits),
        high=round(max(float(high), mean), digits),
    )
