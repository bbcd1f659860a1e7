"""One change at a time: directions are common practice; shared uncertainty must cancel."""

from __future__ import annotations

import dataclasses

import pytest

from kb.physorg.competition import compete
from kb.physorg.step import Alkene, Centre, Medium, Neighbour, StepFacts
from kb.physorg.what_if import contrasts
from kb.vocabulary import CarbonClass, Fate, LeavingGroup

DIPOLAR = frozenset({"polar-aprotic", "amide"})
METHYL = Neighbour(label="the methyl", hydrogens=3, anti_hydrogens=3.0, alkenes=(Alkene(label="C=CC"),))
SECONDARY = Centre(label="CC(C)Br", carbon_class=CarbonClass.SECONDARY, neighbours=(METHYL, METHYL))


def step(**changes: object) -> StepFacts:
    medium = {
        "nucleophile": "cyanide",
        "base": "cyanide",
        "base_pkah": 9.2,
        "solvent_kinds": DIPOLAR,
        "temperature_c": 80.0,
        "acid": "none",
    }
    leaving = changes.pop("leaving_group", LeavingGroup.BROMIDE)
    return StepFacts(
        centre=SECONDARY,
        leaving_group=leaving,  # type: ignore[arg-type]
        medium=Medium(**(medium | changes)),  # type: ignore[arg-type]
    )


def test_nothing_changed_changes_nothing() -> None:
    (same,) = contrasts(step(), [step()], Fate.SUBSTITUTION)
    assert same is not None
    assert (same.effect.mean, same.effect.low, same.effect.high) == (0.0, 0.0, 0.0)
    assert same.pace == pytest.approx(1)
    assert same.because == ()


def test_cooling_favours_substitution_and_slows_it_down() -> None:
    # Common practice: elimination has the higher activation enthalpy.
    (cooler,) = contrasts(step(), [step(temperature_c=30.0)], Fate.SUBSTITUTION)
    assert cooler is not None
    assert cooler.effect.mean > 0
    assert cooler.pace < 0.5
    assert cooler.half_life_h > 0


def test_a_weaker_base_of_the_same_nucleophilicity_helps() -> None:
    (azide,) = contrasts(step(), [step(nucleophile="azide", base="azide", base_pkah=4.7)], Fate.SUBSTITUTION)
    assert azide is not None
    assert azide.effect.mean > 0
    assert any("azide" in words for words in azide.because)
    assert azide.sources


def test_what_both_steps_share_is_no_uncertainty_of_the_difference() -> None:
    alone = [compete(s).share_of(Fate.SUBSTITUTION) for s in (step(), step(temperature_c=60.0))]
    (together,) = contrasts(step(), [step(temperature_c=60.0)], Fate.SUBSTITUTION)
    assert together is not None
    widths = [s.high - s.low for s in alone if s is not None]
    assert together.effect.high - together.effect.low < 0.5 * max(widths)


def test_many_changes_are_answered_in_order() -> None:
    changes = [step(temperature_c=t) for t in (20.0, 50.0, 110.0)]
    paces = [c.pace for c in contrasts(step(), changes, Fate.SUBSTITUTION) if c is not None]
    assert paces == sorted(paces)
    assert len(paces) == 3


def test_where_either_side_has_no_number_there_is_no_contrast() -> None:
    bridgehead = dataclasses.replace(step(), centre=Centre(carbon_class=CarbonClass.BRIDGEHEAD))
    assert contrasts(bridgehead, [step()], Fate.SUBSTITUTION) == [None]
    assert contrasts(step(), [bridgehead], Fate.SUBSTITUTION) == [None]


def test_what_the_solvent_takes_is_no_gain_where_a_nucleophile_was_brought() -> None:
    # Common practice: water for an aprotic solvent hydrolyses a tertiary chloride rather than giving its azide.
    tertiary = Centre(label="CC(C)(C)Cl", carbon_class=CarbonClass.TERTIARY, neighbours=(METHYL, METHYL, METHYL))
    dry = StepFacts(
        centre=tertiary,
        leaving_group=LeavingGroup.CHLORIDE,
        medium=Medium(nucleophile="azide", solvent_kinds=DIPOLAR, temperature_c=25.0),
    )
    wet = dataclasses.replace(
        dry, medium=dataclasses.replace(dry.medium, solvent_kinds=frozenset({"protic", "water"}))
    )
    before, after = (compete(s).share_of(Fate.SUBSTITUTION) for s in (dry, wet))
    found = contrasts(dry, [wet], Fate.SUBSTITUTION)[0]
    assert before is not None and after is not None and found is not None
    assert after.mean - before.mean > 0.3
    assert found.effect.mean < after.mean - before.mean - 0.2
