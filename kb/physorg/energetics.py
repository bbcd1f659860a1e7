"""Energies, rates and splits into one another: RT ln ratio, Eyring, isotope effects, yields over steps.

It owns exact arithmetic only; no table of chemistry and no judgement. Temperatures come in degC, energies
in kJ/mol, rate constants in 1/s (or per molar second, which Eyring's equation treats alike at 1 M), shares
in 0..1. Constants: CODATA 2018. Transmission coefficient 1 throughout.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from kb.errors import QuantityError
from kb.physorg.constants import BOLTZMANN_J_K, J_PER_CAL, PLANCK_J_S, R_J_MOL_K, ZERO_CELSIUS_K


@dataclass(frozen=True, slots=True, kw_only=True)
class TemperatureLine:
    """How ln(ratio) of two products runs with 1/T.

    Attributes:
        delta_delta_h_kj_mol: difference of activation enthalpies, second product less first [kJ/mol];
            positive = heat favours the second.
        delta_delta_s_j_mol_k: difference of activation entropies, second less first [J/(mol K)].
        residual: root mean square deviation of ln(ratio) from the line; 0 for two points, which cannot
            show one.
        lowest_c, highest_c: range that was measured [degC].
    """

    delta_delta_h_kj_mol: float
    delta_delta_s_j_mol_k: float
    residual: float
    lowest_c: float
    highest_c: float

    def ratio_at(self, temperature_c: float) -> float:
        """Return second over first at a temperature [degC]."""
        t_k = kelvin(temperature_c)
        exponent = self.delta_delta_s_j_mol_k / R_J_MOL_K - 1000 * self.delta_delta_h_kj_mol / (R_J_MOL_K * t_k)
        return math.exp(exponent)

    def temperature_for(self, ratio: float) -> float | None:
        """Return the temperature [degC] at which the ratio is reached; None = the line never gets there.

        Whoever shows it must say how far it lies outside `lowest_c` to `highest_c`.
        """
        _require_positive("ratio", ratio)
        denominator = self.delta_delta_s_j_mol_k - R_J_MOL_K * math.log(ratio)
        if denominator == 0 or self.delta_delta_h_kj_mol == 0:
            return None
        t_k = 1000 * self.delta_delta_h_kj_mol / denominator
        return t_k - ZERO_CELSIUS_K if t_k > 0 else None


def kelvin(temperature_c: float) -> float:
    """Return a temperature in K.

    Raises:
        QuantityError: below absolute zero, or no finite number.
    """
    if not math.isfinite(temperature_c) or temperature_c <= -ZERO_CELSIUS_K:
        raise QuantityError(
            f"A temperature of {temperature_c:g} °C cannot be.",
            "Give it in °C, above -273.15.",
            temperature_c,
        )
    return temperature_c + ZERO_CELSIUS_K


def delta_delta_g(ratio: float, temperature_c: float) -> float:
    """Return RT ln(ratio) [kJ/mol]: how far apart the two barriers are.

    Args:
        ratio: first product over second, > 0; a ratio below 1 gives a negative difference.
        temperature_c: at which the split was set [degC].

    Raises:
        QuantityError: a ratio of zero or less (a product not seen sets only a bound), or an impossible
            temperature.

    >>> round(delta_delta_g(1000, 25.0), 3)
    17.124
    """
    _require_positive("ratio", ratio)
    return R_J_MOL_K * kelvin(temperature_c) * math.log(ratio) / 1000


def ratio_from_delta_delta_g(delta_delta_g_kj_mol: float, temperature_c: float) -> float:
    """Return the ratio that a difference of barriers [kJ/mol] gives at a temperature [degC]."""
    return math.exp(1000 * delta_delta_g_kj_mol / (R_J_MOL_K * kelvin(temperature_c)))


def kcal(energy_kj_mol: float) -> float:
    """Return an energy in kcal/mol (thermochemical calorie)."""
    return energy_kj_mol / J_PER_CAL


def distance_to_target(share: float, wanted_share: float, temperature_c: float) -> float:
    """Return how many kJ/mol the barrier difference must still move for a wanted split.

    Args:
        share: of the wanted product now, 0 < share < 1 (of the two that compete).
        wanted_share: aimed at, 0 < wanted_share < 1.
        temperature_c: of the reaction [degC].
    """
    for what, value in (("share", share), ("wanted share", wanted_share)):
        if not 0 < value < 1:
            raise QuantityError(
                f"A {what} of {value:g} has no finite distance.",
                "Give it between 0 and 1, both left out.",
                value,
            )
    now = delta_delta_g(share / (1 - share), temperature_c)
    then = delta_delta_g(wanted_share / (1 - wanted_share), temperature_c)
    return then - now


def barrier_from_rate(rate_per_s: float, temperature_c: float) -> float:
    """Return the free energy of activation [kJ/mol] of a rate constant [1/s, or 1/(M s) at 1 M] by Eyring."""
    _require_positive("rate constant", rate_per_s)
    t_k = kelvin(temperature_c)
    return R_J_MOL_K * t_k * math.log(BOLTZMANN_J_K * t_k / (PLANCK_J_S * rate_per_s)) / 1000


def rate_from_barrier(barrier_kj_mol: float, temperature_c: float) -> float:
    """Return the rate constant [1/s] over a free energy of activation [kJ/mol] by Eyring."""
    t_k = kelvin(temperature_c)
    return BOLTZMANN_J_K * t_k / PLANCK_J_S * math.exp(-1000 * barrier_kj_mol / (R_J_MOL_K * t_k))


def half_life_h(rate_per_s: float) -> float:
    """Return the half-life [h] of a first-order (or pseudo-first-order) reaction."""
    _require_positive("rate constant", rate_per_s)
    return math.log(2) / rate_per_s / 3600


def shift_log10_rate(activation_kj_mol: float, from_c: float, to_c: float) -> float:
    """Return log10 of how much faster a reaction runs at `to_c` than at `from_c`, by Arrhenius."""
    return 1000 * activation_kj_mol / (R_J_MOL_K * math.log(10)) * (1 / kelvin(from_c) - 1 / kelvin(to_c))


def fit_temperature_line(points: Sequence[tuple[float, float]]) -> TemperatureLine:
    """Fit ln(ratio) against 1/T by least squares.

    Args:
        points: (temperature [degC], ratio of second product over first) of a series in which nothing else
            changed.

    Raises:
        QuantityError: fewer than two different temperatures, or a ratio that is not positive.
    """
    if len({t for t, _ in points}) < 2:
        raise QuantityError(
            "A line needs splits at two different temperatures at least.",
            "Add a run of the series at another one.",
        )
    xs = [1 / kelvin(t) for t, _ in points]
    for _, ratio in points:
        _require_positive("ratio", ratio)
    ys = [math.log(ratio) for _, ratio in points]
    mean_x, mean_y = math.fsum(xs) / len(xs), math.fsum(ys) / len(ys)
    slope = math.fsum((x - mean_x) * (y - mean_y) for x, y in zip(xs, ys, strict=True)) / math.fsum(
        (x - mean_x) ** 2 for x in xs
    )
    intercept = mean_y - slope * mean_x
    squares = math.fsum((y - intercept - slope * x) ** 2 for x, y in zip(xs, ys, strict=True))
    return TemperatureLine(
        delta_delta_h_kj_mol=-slope * R_J_MOL_K / 1000,
        delta_delta_s_j_mol_k=intercept * R_J_MOL_K,
        residual=math.sqrt(squares / len(xs)) if len(xs) > 2 else 0.0,
        lowest_c=min(t for t, _ in points),
        highest_c=max(t for t, _ in points),
    )


def isotope_effect_bound(zero_point_kj_mol: float, temperature_c: float) -> float:
    """Return the primary kH/kD when the whole zero-point difference [kJ/mol] is lost in the transition state.

    It is the semi-classical ceiling: a larger measured value hints at tunnelling, a smaller one at a
        hydrogen moved
    little or almost wholly, or at a step that does not decide the rate.
    """
    return math.exp(1000 * zero_point_kj_mol / (R_J_MOL_K * kelvin(temperature_c)))


def isotope_effect_at(effect: float, from_c: float, to_c: float) -> float:
    """Return kH/kD at another temperature [degC], its logarithm scaling with 1/T."""
    _require_positive("isotope effect", effect)
    return math.exp(math.log(effect) * kelvin(from_c) / kelvin(to_c))


def split_on_deuteration(elimination_share: float, effect: float) -> float:
    """Return the share of elimination once the beta hydrogens are deuterium.

    Args:
        elimination_share: with hydrogen, 0..1, substitution being the rest and not slowed.
        effect: primary kH/kD of the elimination, > 0.
    """
    if not 0 <= elimination_share <= 1:
        raise QuantityError(
            f"A share of {elimination_share:g} cannot be.", "Give it between 0 and 1.", elimination_share
        )
    _require_positive("isotope effect", effect)
    slowed = elimination_share / effect
    return slowed / (slowed + 1 - elimination_share)


def overall_yield_pct(step_yields_pct: Sequence[float]) -> float:
    """Return the yield over all steps [%]; 100 for no step.

    >>> round(overall_yield_pct([90.0] * 5), 3)
    59.049
    """
    overall = 1.0
    for value in step_yields_pct:
        if not 0 <= value <= 100:
            raise QuantityError(f"A yield of {value:g} % cannot be.", "Give it between 0 and 100.", value)
        overall *= value / 100
    return 100 * overall


def _require_positive(what: str, value: float) -> None:
    if not (math.isfinite(value) and value > 0):
        raise QuantityError(
            f"A {what} of {value:g} cannot be used here.",
            "Give a number above zero; a product not seen is a bound.",
            value,
        )
