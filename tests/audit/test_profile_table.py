"""Condition lines asked of many runs at once: the same answers as asked of each whole profile, one by one."""

from __future__ import annotations

import numpy as np
import pytest

from kb.assess.forcing import force_of
from kb.assess.predicate import parse_predicate
from kb.audit.condition_line import _sets
from kb.audit.profile_table import ProfileTable
from kb.book import Book
from kb.store.values import HouseRule
from kb.vocabulary import Severity

LINES = (
    "acidity >= strong",
    "base_pkah >= 12 and temperature_c >= 40",
    "base_bulk == hindered or not water",
    "solvent in (amide, ether) and (nucleophile_class == azide or prolonged)",
    "reagent not in (hydroxide, alkoxide)",
    "base_pkah < 9",
    "fluoride",
    "time_h >= 12 and bp_c >= 60",
)


@pytest.mark.parametrize("line", LINES)
def test_a_line_is_answered_as_for_each_whole_profile(demo: Book, line: str) -> None:
    view = demo.view()
    rows = np.arange(len(view.table))
    code = {True: 1, False: 0, None: -1}
    predicate = parse_predicate(line)
    expected = [code[predicate.evaluate(view.profile(row))] for row in rows.tolist()]
    assert ProfileTable(view).told(line, rows).tolist() == expected
    assert len(set(expected)) > 1, "a line that tells nothing apart tests nothing"


def test_facts_and_forces_are_those_of_the_profile(demo: Book) -> None:
    view = demo.view()
    rows = np.arange(len(view.table))
    table = ProfileTable(view)
    for fact in ("solvent_classes", "base_pkah", "water", "temperature_c", "nucleophile_class"):
        assert table.values(fact, rows) == [getattr(view.profile(row), fact) for row in rows.tolist()]
    forcing = ("acidity", "lewis_acid", "base_pkah", "ionising", "temperature_c", "has_unknown_reagent")
    alike = table.alike(forcing, rows)
    forces = [force_of(view.profile(row)) for row in rows.tolist()]
    assert [force_of(profile) for _, profile in alike] == forces
    assert len({(number, force) for (number, _), force in zip(alike, forces, strict=True)}) == len(
        {number for number, _ in alike}
    )
    assert len(set(forces)) > 10


def test_a_trial_of_a_rule_does_not_depend_on_who_answers(demo: Book) -> None:
    from kb.assess.house_rules import try_rule

    view = demo.view()
    for line in LINES:
        rule = HouseRule(title="x", motif="[CX4]Br", when=line, severity=Severity.CAUTION, why="", author="MK")
        assert try_rule(rule, view, ProfileTable(view).told) == try_rule(rule, view)


def test_candidates_that_are_met_equally_often_stand_by_name() -> None:
    """Sets have no order of their own: without one, two sittings would propose two rules for one book."""
    words = ["sulfoxide", "amide", "ether", "nitrile", "alcohol", "ketone"]
    assert _sets("solvent", [frozenset(words)] * 3)[: len(words)] == [f"solvent in ({w})" for w in sorted(words)]
