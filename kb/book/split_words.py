"""Integrals and areas from words: "substitution=1.00/2" into signals, a split, an assay yield and a barrier difference.

It owns the grammar LABEL=VALUE/COUNT; the arithmetic is `kb.record.split`, RT ln(ratio) is `kb.physorg.energetics`.
By NMR the count is that of the protons under the integral. Forgetting one of several is the commonest way to a wrong
split, so that is refused; where none at all is given the values are taken for relative amounts, and a front end says
so.
For areas (GC, HPLC) the count is the response per amount relative to the other signals, 1 where not given.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from kb.errors import QuantityError
from kb.record.finding import Interval
from kb.record.split import RELATIVE_ERROR, Signal, assay_yield, split_from_signals
from kb.vocabulary import Fate

ROOM_TEMPERATURE_C = 25.0
"""Temperature of a barrier difference where none was given [degC]; said to be assumed wherever it is shown."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SplitAnswer:
    """What a set of signals amounts to.

    Attributes:
        shares: molar share per label, 0..1 with 80 % intervals, in the order given.
        assay_yield_pct: against the standard; None = no standard.
        assay_of: label of the product whose yield that is.
        recovered_pct: everything that was integrated, against the substrate charged; None = no standard.
        compared: the two labels whose barriers are compared; None = fewer than two products seen.
        delta_delta_g_kj_mol: RT ln(first/second of `compared`) [kJ/mol], positive where the first is favoured.
        temperature_c: at which [degC].
        is_temperature_assumed: no temperature was given.
        is_uncounted: no protons were given, so the values were taken for relative amounts.
    """

    shares: tuple[tuple[str, Interval], ...]
    assay_yield_pct: Interval | None = None
    assay_of: str | None = None
    recovered_pct: Interval | None = None
    compared: tuple[str, str] | None = None
    delta_delta_g_kj_mol: Interval | None = None
    temperature_c: float = ROOM_TEMPERATURE_C
    is_temperature_assumed: bool = True
    is_uncounted: bool = False

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object; the bare figures are means, their intervals stand beside them."""
        assay, ddg = self.assay_yield_pct, self.delta_delta_g_kj_mol
        return {
            "shares": {label: share.as_dict() for label, share in self.shares},
            "assay_yield_pct": assay.mean if assay else None,
            "assay_yield_interval_pct": assay.as_dict() if assay else None,
            "assay_of": self.assay_of,
            "recovered_pct": self.recovered_pct.as_dict() if self.recovered_pct else None,
            "delta_delta_g_kj_mol": ddg.mean if ddg else None,
            "delta_delta_g_interval_kj_mol": ddg.as_dict() if ddg else None,
            "compared": list(self.compared) if self.compared else None,
            "temperature_c": self.temperature_c,
            "temperature_assumed": self.is_temperature_assumed,
        }


def split_from_words(
    texts: Sequence[str],
    *,
    areas: bool = False,
    standard: str | None = None,
    standard_mmol: str | None = None,
    scale: str | None = None,
    of: str | None = None,
    temperature: str | None = None,
    error: str | None = None,
) -> SplitAnswer:
    """Work out a split.

    Args:
        texts: "LABEL=VALUE/COUNT" each, or several of them with commas between; a label is any word, best a fate.
        areas: the values are areas, and a missing count is 1.
        standard: "VALUE/COUNT" of a weighed internal standard.
        standard_mmol, scale: amounts of the standard and of the substrate charged; a bare number is mmol.
        of: label of the product whose assay yield is wanted; None = the first.
        temperature: at which the split was set.
        error: standard deviation of one integral, percent of itself; None = RELATIVE_ERROR.

    Raises:
        QuantityError: anything that cannot be read, a standard without its amounts, or a label given twice.
    """
    from kb.quantity import parse_percent

    if not texts:
        raise QuantityError("There are no signals.", "Write them like substitution=1.00/2 elimination=0.15/1.")
    relative = RELATIVE_ERROR if error is None else parse_percent(error, 50, "error of an integral") / 100
    texts = [part for text in texts for part in _parts(text)]
    is_uncounted = not areas and not any("/" in text.rpartition("=")[2] for text in texts)
    signals: dict[str, Signal] = {}
    for text in texts:
        label, equals, value = text.rpartition("=")
        label = label.strip()
        if not equals or not label:
            raise QuantityError(f"{text!r} is no signal.", "Write LABEL=VALUE/PROTONS, such as ether=1.00/2.", text)
        if label in signals:
            raise QuantityError(f"{label!r} is given twice.", "Add its integrals up, or use two labels.", text)
        signals[label] = _signal(value, label, areas=areas or is_uncounted)
    split = split_from_signals(signals, relative)
    assay, assay_of, recovered = _assay(signals, standard, standard_mmol, scale, of, relative, areas=areas)
    at_c, is_assumed = _temperature(temperature)
    compared = _compared(split.shares)
    return SplitAnswer(
        shares=split.shares,
        assay_yield_pct=assay,
        assay_of=assay_of,
        recovered_pct=recovered,
        compared=compared,
        delta_delta_g_kj_mol=_barriers(signals, compared, relative, at_c),
        temperature_c=at_c,
        is_temperature_assumed=is_assumed,
        is_uncounted=is_uncounted,
    )


def _parts(text: str) -> list[str]:
    """Return the signals of one argument; a comma that may be a decimal comma does not divide."""
    parts = text.split(",")
    return parts if all("=" in part for part in parts) else [text]


def _signal(text: str, label: str, *, areas: bool) -> Signal:
    from kb.quantity import parse_number

    value, slash, count = text.partition("/")
    what = f"{'area' if areas else 'integral'} of {label}"
    number = parse_number(value, what, "Write it like 1.00/2: the value, then the protons under it.")
    if slash:
        return Signal(value=number, per_molecule=parse_number(count, f"count of {label}", "Write it like 1.00/2."))
    if not areas:
        raise QuantityError(
            f"{label}={text.strip()} does not say how many protons it counts.",
            f"Write {label}={text.strip()}/2 for two protons; with --areas nothing is counted.",
            text,
        )
    return Signal(value=number)


def _assay(
    signals: Mapping[str, Signal],
    standard: str | None,
    standard_mmol: str | None,
    scale: str | None,
    of: str | None,
    relative: float,
    *,
    areas: bool,
) -> tuple[Interval | None, str | None, Interval | None]:
    given = {"--standard": standard, "--standard-mmol": standard_mmol, "--scale": scale}
    missing = [flag for flag, value in given.items() if value is None]
    if len(missing) == len(given) and of is None:
        return None, None, None
    if standard is None or standard_mmol is None or scale is None:
        raise QuantityError(f"An assay yield also needs {' and '.join(missing)}.", "Give all of them, or none.", None)
    label = next(iter(signals)) if of is None else of.strip()
    if label not in signals:
        raise QuantityError(f"There is no signal {label!r}.", f"Use one of: {', '.join(signals)}.", label)
    weighed, charged = _mmol(standard_mmol), _mmol(scale)
    reference = _signal(standard, "standard", areas=areas)
    each = {name: assay_yield(signal, reference, weighed, charged, relative) for name, signal in signals.items()}
    return each[label], label, _recovered(list(each.values()))


def _recovered(parts: Sequence[Interval]) -> Interval:
    """Return the sum of assay yields [%]; their common error, that of the standard, is taken as the whole of it."""
    mean, low, high = (round(sum(getattr(p, name) for p in parts), 2) for name in ("mean", "low", "high"))
    return Interval(mean=mean, low=low, high=high)


def _mmol(text: str) -> float:
    """Return an amount [mmol]; a bare number is mmol already, as the flag says."""
    from kb.quantity import parse_amount_mmol, parse_number

    try:
        return parse_number(text)
    except QuantityError:
        return parse_amount_mmol(text)


def _temperature(text: str | None) -> tuple[float, bool]:
    from kb.quantity import parse_temperature

    if text is None:
        return ROOM_TEMPERATURE_C, True
    value = parse_temperature(text).high_c
    if value is None:
        raise QuantityError(f"{text!r} gives no number to reckon with.", "Give degrees, such as 25C.", text)
    return value, False


def _compared(shares: Sequence[tuple[str, Interval]]) -> tuple[str, str] | None:
    """Return the two largest products, starting material left out, in the order given."""
    products = [(label, share.mean) for label, share in shares if share.mean > 0 and label != Fate.UNREACTED]
    largest = sorted(products, key=lambda pair: -pair[1])[:2]
    if len(largest) < 2:
        return None
    first, second = sorted(largest, key=products.index)
    return first[0], second[0]


def _barriers(
    signals: Mapping[str, Signal], compared: tuple[str, str] | None, relative: float, at_c: float
) -> Interval | None:
    """Return RT ln(first/second) with an 80 % interval [kJ/mol] by first-order error propagation."""
    from kb.physorg.energetics import delta_delta_g

    if compared is None:
        return None
    pair = split_from_signals({label: signals[label] for label in compared}, relative).shares
    first, second = (share for _, share in pair)
    mean = delta_delta_g(signals[compared[0]].amount / signals[compared[1]].amount, at_c)
    bounds = [
        delta_delta_g(max(share, 1e-4) / max(1 - share, 1e-4), at_c)
        for share in (min(first.low, 1 - second.high), max(first.high, 1 - second.low))
    ]
    low, high = (round(b, 2) for b in (min(*bounds, mean), max(*bounds, mean)))
    return Interval(mean=round(mean, 3), low=low, high=high)
