"""Recurring failures on the demo book, against what was planted, and on small books made by hand."""

from __future__ import annotations

import dataclasses
import datetime as dt
from typing import Any

import pytest

from kb.assess.predicate import parse_predicate
from kb.audit.places import GROUPS, centre_place, group_query, groups_in
from kb.audit.recurrence import find_recurring
from kb.audit.recurrence_values import Circumstance, Cluster, Recurrence
from kb.book import Book
from kb.store.values import HouseRule
from kb.vocabulary import Severity


@pytest.fixture(scope="module")
def found(demo: Book) -> Recurrence:
    circumstances = {
        str(run.code): Circumstance(project=run.project, scale_mmol=run.conditions.scale_mmol)
        for run in demo.store.iter_runs()
    }
    return find_recurring(demo.view(), circumstances)


def _best(found: Recurrence, mode: str, members: set[str]) -> Cluster:
    return max((c for c in found.clusters if c.mode == mode), key=lambda c: len(members & set(c.runs)))


def test_planted_failures_are_found_as_clusters_with_few_strangers(
    found: Recurrence, planted: dict[str, Any], references: dict[str, str]
) -> None:
    """At least 90 % of planted members in the one cluster meant for them, at most 10 % strangers; issue F."""
    members_found = members_planted = strangers = counted = 0
    for truth in planted["cluster"]:
        members = {references[r] for r in truth["members"]}
        tolerated = {references[r] for r in truth["tolerated"]}
        runs = set(_best(found, truth["mode"], members).runs)
        members_found += len(members & runs)
        members_planted += len(members)
        strangers += len(runs - members - tolerated)
        counted += len(runs - tolerated)
        assert len(members & runs) >= 0.7 * len(members), truth["id"]
    assert members_found >= 0.9 * members_planted
    assert strangers <= 0.1 * counted


def test_most_planted_repeats_show_the_earlier_run_that_should_have_warned(
    found: Recurrence, planted: dict[str, Any], references: dict[str, str]
) -> None:
    """The tool also asks for a base and an acid as strong, which the plant does not; hence not all."""
    preventable = {references[r] for truth in planted["cluster"] for r in truth["preventable"]}
    repeats = {run for c in found.clusters for run, _ in c.repeats}
    assert len(preventable & repeats) >= 0.8 * len(preventable)


def test_the_earlier_record_is_always_of_an_earlier_day(found: Recurrence, demo: Book) -> None:
    for cluster in found.clusters:
        for run, earlier in cluster.repeats:
            assert demo.get(earlier).date < demo.get(run).date  # type: ignore[operator]


def test_cost_counts_only_what_is_recorded(found: Recurrence, demo: Book) -> None:
    cluster = next(c for c in found.clusters if c.name == "group-loss/tertiary-alkyl-ester")
    lost, days = 0.0, 0.0
    for code in cluster.runs:
        run = demo.get(code)
        if run.conditions.scale_mmol is not None:
            lost += run.conditions.scale_mmol * (1 - min(run.outcome.yield_pct or 0, 100) / 100)
        if run.conditions.time is not None and run.conditions.time.h is not None:
            days += run.conditions.time.h / 24
    assert cluster.lost_mmol == pytest.approx(lost, abs=0.01)
    assert cluster.days == pytest.approx(days, abs=0.01)
    assert sum(n for _, n in cluster.projects) <= len(cluster.runs)


def test_a_proposed_rule_can_be_adopted_and_does_on_the_book_what_it_says(found: Recurrence, demo: Book) -> None:
    cluster = next(c for c in found.clusters if c.name == "group-loss/tertiary-alkyl-ester")
    assert cluster.proposal is not None
    trial = demo.try_rule(cluster.proposal.rule)
    assert trial == cluster.proposal.trial
    assert set(cluster.runs) <= set(trial.hits)
    assert "acidity" in cluster.proposal.rule.when
    assert parse_predicate(cluster.proposal.rule.when).as_sentence()


def test_a_house_rule_that_covers_a_cluster_is_named_and_nothing_more_proposed(demo: Book) -> None:
    rule = HouseRule(
        title="No strong acid beside a tert-butyl ester",
        motif="[#6]C(=O)OC(C)(C)C",
        when="acidity >= strong",
        severity=Severity.SERIOUS,
        why="",
        author="MK",
        rule_id="H-1",
    )
    cluster = next(
        c for c in find_recurring(demo.view(), {}, [rule]).clusters if c.name == "group-loss/tertiary-alkyl-ester"
    )
    assert cluster.covered_by == (("H-1", len(cluster.runs)),)
    assert cluster.proposal is None
    retired = dataclasses.replace(rule, retired_at=dt.datetime(2025, 1, 1, tzinfo=dt.UTC))
    again = find_recurring(demo.view(), {}, [retired]).clusters
    assert not any(c.covered_by for c in again)


def test_since_counts_later_failures_and_keeps_the_earlier_record(found: Recurrence, demo: Book) -> None:
    since = dt.date(2025, 1, 1)
    later = find_recurring(demo.view(), {}, since=since)
    assert 0 < later.failures < found.failures
    for cluster in later.clusters:
        assert all(demo.get(code).date >= since for code in cluster.runs)  # type: ignore[operator]
    assert any(demo.get(earlier).date < since for c in later.clusters for _, earlier in c.repeats)  # type: ignore[operator]


def test_nobody_is_named(found: Recurrence, demo: Book) -> None:
    """No ranking of people: initials stand nowhere in the answer (issue F)."""
    import json

    initials = {run.by for run in demo.store.iter_runs() if run.by}
    words = set(json.dumps(found.as_dict()).replace('"', " ").replace(",", " ").split())
    assert initials and not initials & words


@pytest.mark.parametrize(
    ("smiles", "words"),
    [
        ("CC(C)(C)OC(=O)N1CCC(OC(C)(C)C)CC1", ["tertiary alkyl carbamate", "tertiary alkyl ether"]),
        ("CC(C)(C)OC(=O)CC", ["tertiary alkyl ester"]),
        ("CC1(C)OCC(CO)O1", ["cyclic ketal or acetal", "hydroxyl"]),
        ("CC(C)(C)[Si](C)(C)OCC", ["silyl ether"]),
        ("C1OC1CC#N", ["epoxide", "nitrile"]),
        ("CCOC1CCCCO1", ["acetal or ketal"]),
    ],
)
def test_groups_are_told_by_their_most_particular_name(smiles: str, words: list[str]) -> None:
    """Names of functional groups: common practice."""
    from rdkit import Chem

    assert [word for word, _ in groups_in(Chem.MolFromSmiles(smiles))] == words


def test_every_group_and_centre_pattern_is_a_query() -> None:
    from rdkit import Chem

    assert all(group_query(word) is not None for word, _ in GROUPS)
    for carbon in ("methyl", "primary", "secondary", "tertiary", "bridgehead", "vinyl", "aryl"):
        for flag in ("", "allylic", "benzylic", "neopentyl", "beta-branched", "homobenzylic", "alpha-carbonyl"):
            for leaving in ("bromide", "mesylate", "hydroxyl", "epoxide", "ammonium", "carboxylate", "nitro", None):
                place = centre_place("elimination", carbon, frozenset({flag} - {""}), leaving)
                assert place is not None
                assert not place.smarts or Chem.MolFromSmarts(place.smarts) is not None


@pytest.mark.parametrize(
    ("smiles", "carbon", "flag", "leaving", "matches"),
    [
        ("BrCCc1ccccc1", "primary", "homobenzylic", "bromide", True),
        ("BrCCCCc1ccccc1", "primary", "homobenzylic", "bromide", False),
        ("CC(CBr)CC", "primary", "beta-branched", "bromide", True),
        ("CC(C)(CBr)CC", "primary", "beta-branched", "bromide", False),
        ("CC(C)(COS(C)(=O)=O)CC", "primary", "neopentyl", "mesylate", True),
        ("CCC(C)OS(C)(=O)=O", "secondary", "", "mesylate", True),
        ("CCC(C)O", "secondary", "", "mesylate", False),
    ],
)
def test_the_pattern_of_a_centre_matches_such_centres(
    smiles: str, carbon: str, flag: str, leaving: str, matches: bool
) -> None:
    from rdkit import Chem

    place = centre_place("elimination", carbon, frozenset({flag} - {""}), leaving)
    assert place is not None
    query = Chem.MolFromSmarts(place.smarts)
    assert Chem.MolFromSmiles(smiles).HasSubstructMatch(query) is matches
