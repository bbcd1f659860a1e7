"""Arithmetic of energies, rates and splits (rows AR*, KI*, TH* of tests/data/check_values.csv; CODATA 2018)."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import constants as codata

from kb.errors import QuantityError
from kb.physorg import energetics as e
from kb.physorg.constants import BOLTZMANN_J_K, PLANCK_J_S, R_J_MOL_K, get_constant

DATA = Path(__file__).resolve().parent.parent / "data" / "check_values.csv"
with DATA.open(encoding="utf-8", newline="") as _handle:
    ROWS = {row["id"]: row for row in csv.DictReader(_handle)}

RATIOS = [n for n, r in ROWS.items() if n.startswith("AR") and "ratio" in r["quantity"] and r["unit"] == "kJ/mol"]
YIELDS = [n for n, r in ROWS.items() if n.startswith("AR") and "overall yield" in r["quantity"]]


def test_physical_constants_are_codata() -> None:
    # scipy.constants (CODATA) as the reference.
    assert pytest.approx(codata.R, rel=1e-9) == R_J_MOL_K
    assert codata.k == BOLTZMANN_J_K
    assert codata.h == PLANCK_J_S


@pytest.mark.parametrize("name", RATIOS)
def test_ratio_to_energy(name: str) -> None:
    row = ROWS[name]
    ratio = float(row["quantity"].split("ratio ")[1])
    energy = e.delta_delta_g(ratio, float(row["temperature_C"]))
    assert energy == pytest.approx(float(row["value"]), abs=6e-4)
    assert e.kcal(energy) == pytest.approx(float(row["uncertainty_or_range"].split()[0]), abs=6e-4)


def test_a_thousand_to_one_is_17_12_kj_and_4_09_kcal() -> None:
    assert e.delta_delta_g(1000, 25.0) == pytest.approx(17.12, abs=0.005)
    assert e.kcal(e.delta_delta_g(1000, 25.0)) == pytest.approx(4.09, abs=0.005)


@pytest.mark.parametrize("name", YIELDS)
def test_yield_over_steps(name: str) -> None:
    words = ROWS[name]["quantity"].split()
    steps, each = int(words[words.index("of") + 1]), float(words[words.index("at") + 1])
    assert e.overall_yield_pct([each] * steps) == pytest.approx(float(ROWS[name]["value"]), abs=6e-4)


def test_rate_ratio_from_ionising_power() -> None:
    # AR22: tert-butyl chloride in water against ethanol, 10 ** (3.49 + 2.03) = 3.31e5.
    gap = get_constant("y", "water").value - get_constant("y", "ethanol").value
    assert 10**gap == pytest.approx(float(ROWS["AR22"]["value"]), rel=0.01)


@given(st.floats(1e-6, 1e6), st.floats(-100, 300))
def test_energy_and_ratio_undo_one_another(ratio: float, temperature_c: float) -> None:
    energy = e.delta_delta_g(ratio, temperature_c)
    assert e.ratio_from_delta_delta_g(energy, temperature_c) == pytest.approx(ratio, rel=1e-9)


@given(st.floats(1e-12, 1e9), st.floats(-100, 300))
def test_barrier_and_rate_undo_one_another(rate_per_s: float, temperature_c: float) -> None:
    barrier = e.barrier_from_rate(rate_per_s, temperature_c)
    assert e.rate_from_barrier(barrier, temperature_c) == pytest.approx(rate_per_s, rel=1e-9)


def test_eyring_against_its_own_formula() -> None:
    # kB T / h at 298.15 K is 6.21e12 per second (standard value); no barrier gives just that.
    assert e.rate_from_barrier(0.0, 25.0) == pytest.approx(codata.k * 298.15 / codata.h, rel=1e-12)


def test_a_barrier_of_about_93_kj_means_some_hours_at_room_temperature() -> None:
    # Common practice: 22 kcal/mol (92 kJ/mol) is a reaction of hours at 25 degC.
    assert 0.1 < e.half_life_h(e.rate_from_barrier(92.0, 25.0)) < 24


def test_the_temperature_line_goes_through_two_points_and_finds_its_target() -> None:
    # tert-Butyl chloride in 80 % ethanol: 16.8 % alkene at 25 and 36.3 % at 65.3 degC (Cooper et al. 1948, SE19, SE20).
    line = e.fit_temperature_line([(25.0, 0.168 / 0.832), (65.3, 0.363 / 0.637)])
    assert line.ratio_at(25.0) == pytest.approx(0.168 / 0.832)
    assert line.ratio_at(65.3) == pytest.approx(0.363 / 0.637)
    assert line.delta_delta_h_kj_mol > 0  # heat favours the alkene
    target = line.temperature_for(1.0)
    assert target is not None and target > 65.3
    assert line.ratio_at(target) == pytest.approx(1.0)
    assert line.residual == 0.0


@given(st.floats(-60, 60), st.floats(-100, 100), st.lists(st.floats(-50, 150), min_size=3, max_size=6, unique_by=round))
def test_a_line_without_scatter_is_found_again(h: float, s: float, temperatures: list[float]) -> None:
    true = e.TemperatureLine(delta_delta_h_kj_mol=h, delta_delta_s_j_mol_k=s, residual=0, lowest_c=0, highest_c=1)
    fitted = e.fit_temperature_line([(t, true.ratio_at(t)) for t in temperatures])
    assert fitted.delta_delta_h_kj_mol == pytest.approx(h, abs=1e-3)
    assert fitted.delta_delta_s_j_mol_k == pytest.approx(s, abs=1e-2)
    assert fitted.residual < 1e-6


def test_distance_to_a_target_split() -> None:
    # From 80 to 95 % at 25 degC: ratio 4 is 3.437 and ratio 19 is 7.299 kJ/mol (rows AR07, AR05/AR04).
    assert e.distance_to_target(0.80, 0.95, 25.0) == pytest.approx(7.299 - 3.437, abs=0.002)


def test_isotope_effects_lie_under_the_zero_point_ceiling_and_fall_with_heat() -> None:
    # Rows KI*: 2.6 to 7.1 at 30 to 50 degC, all below or about the semi-classical ceiling (7 at 25 degC, textbook).
    zero_point = get_constant("isotope", "zero point").value
    assert e.isotope_effect_bound(zero_point, 25.0) == pytest.approx(7.0, abs=0.4)
    for name in (n for n in ROWS if n.startswith("KI")):
        bound = e.isotope_effect_bound(zero_point, float(ROWS[name]["temperature_C"]))
        assert 1 < float(ROWS[name]["value"]) < bound * 1.1
    assert 1 < e.isotope_effect_at(7.11, 30.0, 80.0) < 7.11


def test_deuterium_turns_a_split_towards_substitution() -> None:
    # KI05: 2-phenylethyl bromide with NaOEt, kH/kD 7.11 at 30 degC; 94.6 % alkene (SE13) then falls below that.
    assert e.split_on_deuteration(0.946, 7.11) == pytest.approx(0.946 / 7.11 / (0.946 / 7.11 + 0.054))
    assert e.split_on_deuteration(0.5, 1.0) == 0.5


def test_heats_of_formation_in_the_table_agree_with_the_rows() -> None:
    # TH*: Active Thermochemical Tables and CRC values (chemicals 1.5.2).
    def value(name: str) -> float:
        return float(ROWS[name]["value"])

    assert get_constant("heat", "cis-disubstituted").value == pytest.approx(value("TH03") - value("TH01"), abs=0.1)
    assert get_constant("heat", "trans-disubstituted").value == pytest.approx(value("TH05") - value("TH01"), abs=0.1)
    assert get_constant("heat", "gem-disubstituted").value == pytest.approx(value("TH12") - value("TH09"), abs=0.1)
    assert get_constant("heat", "trisubstituted").value == pytest.approx(value("TH14") - value("TH09"), abs=0.1)
    assert get_constant("heat", "tetrasubstituted").value == pytest.approx(value("TH25") - value("TH15"), abs=0.1)
    assert get_constant("clash", "methyl methyl").value == pytest.approx(value("TH03") - value("TH05"), abs=0.05)


def test_more_substituted_alkenes_are_more_stable_and_trans_beats_cis() -> None:
    order = ("tetrasubstituted", "trisubstituted", "gem-disubstituted", "trans-disubstituted", "cis-disubstituted")
    heats = [get_constant("heat", k).value for k in order] + [get_constant("heat", "monosubstituted").value]
    assert heats == sorted(heats)


@pytest.mark.parametrize(
    "call",
    [
        lambda: e.delta_delta_g(0.0, 25.0),
        lambda: e.delta_delta_g(float("nan"), 25.0),
        lambda: e.delta_delta_g(10.0, -300.0),
        lambda: e.half_life_h(0.0),
        lambda: e.distance_to_target(1.0, 0.9, 25.0),
        lambda: e.fit_temperature_line([(25.0, 1.0), (25.0, 2.0)]),
        lambda: e.overall_yield_pct([120.0]),
        lambda: e.split_on_deuteration(1.2, 3.0),
    ],
)
def test_impossible_values_are_refused_in_words(call) -> None:  # type: ignore[no-untyped-def]
    with pytest.raises(QuantityError) as caught:
        call()
    assert caught.value.message.endswith(".")
    assert caught.value.hint


def test_a_flat_line_never_reaches_another_ratio() -> None:
    line = e.fit_temperature_line([(20.0, 2.0), (60.0, 2.0)])
    assert (
        line.temperature_for(5.0) is None
        or not math.isfinite(line.temperature_for(5.0) or math.inf)
        or (abs(line.delta_delta_h_kj_mol) < 1e-9)
    )
