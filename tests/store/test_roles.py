"""Readers read, contributors record and amend, curators keep rules and settle; nobody but the owner touches history.

The grants are those that `migrations/roles.sql` ships, run as its head says.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import pytest

import kb.paths
from kb.errors import StoreRefused
from kb.store.checking import verify
from kb.store.merging import merge
from kb.store.moving import copy_all
from kb.store.store import Store
from kb.store.values import HouseRule
from kb.vocabulary import Severity
from tests.engines import Schemas, Server
from tests.factories import CHEMISTRY, a_book, a_run

GRANTS = kb.paths.shipped("migrations") / "roles.sql"
PEOPLE = {"rita": "reader", "carl": "contributor", "cora": "curator"}
RULE = HouseRule(
    title="No hot acid on the ether", motif="[OX2]", when="acidity >= strong", severity=Severity.SERIOUS, why="lost it",
    author="MK",
)  # fmt: skip


@pytest.fixture(scope="module")
def people(server: Server) -> None:
    """Let three people log in."""
    for person in PEOPLE:
        server.admin.execute(f"CREATE ROLE {person} LOGIN")


@pytest.fixture
def book(schemas: Schemas, people: None) -> Iterator[Schemas]:
    """Give a book with a few runs and the shipped grants, run twice as a careful person may."""
    with a_book(schemas, **CHEMISTRY) as store:
        for n in range(3):
            store.add(a_run(note=f"run {n}"), "MK")
    schemas.reshaped("book.sidepath")
    for _ in range(2):
        schemas.execute("book.sidepath", GRANTS.read_text(encoding="utf-8"))
    for person, role in PEOPLE.items():
        schemas.server.admin.execute(f"GRANT sidepath_{role} TO {person}")
    yield schemas
    schemas.server.cut_off()


def opened(book: Schemas, person: str) -> Store:
    return Store.open(book.server.address(book.schema_of("book.sidepath"), person), **CHEMISTRY)


def test_a_reader_reads_and_searches_and_changes_nothing(book: Schemas) -> None:
    with opened(book, "rita") as store:
        assert store.count() == 3 and store.history("1") and store.words("run")
        assert len(store.derived_columns()["code"]) == 3
        assert [c for c in verify(store) if not c.ok] == []
        for attempt in (
            lambda: store.add(a_run(), "RR"),
            lambda: store.amend("1", {"note": "mine"}, "RR", "x"),
            lambda: store.drafts.save("form", {}),
            lambda: store.attachments.put("nmr.pdf", b"%PDF"),
            lambda: store.house_rules.add(RULE),
        ):
            with pytest.raises(StoreRefused, match="may not"):
                attempt()
        assert store.count() == 3


def test_a_contributor_records_and_amends_and_leaves_rules_alone(book: Schemas) -> None:
    with opened(book, "carl") as store:
        assert store.add(a_run(), "CC").code == "R-0004"
        assert store.amend("1", {"note": "looked again"}, "CC", "typo").revision == 2
        store.withdraw("2", "wrong flask", "CC")
        store.reinstate("2", "right flask after all", "CC")
        store.attachments.attach("1", "nmr.pdf", b"%PDF", "CC", "spectrum")
        store.acknowledgements.add("some-rule", "a plan", "CC", "small scale")
        store.drafts.save("form", {"scheme": "CC"})
        store.drafts.discard("form")
        assert [c for c in verify(store, sample=None) if not c.ok] == []
        with pytest.raises(StoreRefused, match="may not"):
            store.house_rules.add(RULE)


@pytest.mark.parametrize(
    "statement",
    [
        "UPDATE history SET who = 'XX' WHERE seq = 1",
        "DELETE FROM history",
        "DELETE FROM run WHERE run_key = 1",
        "UPDATE event SET detail = 'x'",
        "DELETE FROM event",
        "DELETE FROM attachment_blob",
        "UPDATE attachment_blob SET content = ''",
        "DELETE FROM house_rule",
        "DELETE FROM meta",
        "UPDATE alembic_version SET version_num = '0'",
        "DROP TABLE run",
        "CREATE TABLE mine (x integer)",
        "TRUNCATE history",
    ],
)
@pytest.mark.parametrize("person", ["carl", "cora"])
def test_history_and_what_was_recorded_stay_as_they_are(book: Schemas, person: str, statement: str) -> None:
    with opened(book, person) as store, pytest.raises(StoreRefused, match="may not"):  # noqa: SIM117
        with store.book.writing() as connection:
            connection.exec_driver_sql(statement)


def test_a_curator_keeps_rules_merges_and_settles_and_a_contributor_does_not(book: Schemas) -> None:
    laptop = book.folder / "laptop.sidepath"
    with Store.open(book / "book.sidepath", **CHEMISTRY) as group:
        copy_all(group, laptop)
        group.amend("1", {"project": "ours"}, "MK", "x")
    with Store.open(laptop, **CHEMISTRY) as away:
        away.amend("1", {"project": "mine"}, "TB", "x")
    with opened(book, "carl") as store, pytest.raises(StoreRefused, match="may not"):
        merge(store, laptop, who="CC")
    with opened(book, "cora") as store:
        report = merge(store, laptop, who="CO")
        assert len(report.conflicts) == 1
        with opened(book, "carl") as contributor, pytest.raises(StoreRefused, match="may not"):
            contributor.settle("1", {"project": "ours"}, "CC", "asked")
        assert store.settle("1", {"project": "ours"}, "CO", "asked").project == "ours"
        rule = store.house_rules.add(RULE)
        assert store.house_rules.retire(rule.rule_id, "CO", "too broad").is_retired
        assert store.conflicts() == ()
        assert [c for c in verify(store, sample=None) if not c.ok] == []


def test_a_curator_reads_the_book_again_by_another_recipe(book: Schemas) -> None:
    derive = CHEMISTRY["derive"]
    later = {**CHEMISTRY, "recipe": "stand-in/2", "derive": lambda run: replace(derive(run), recipe="stand-in/2")}
    address = book.server.address(book.schema_of("book.sidepath"), "cora")
    with Store.open(address, **later) as store:
        assert store.rebuild() == 3
        assert [c for c in verify(store, sample=None) if not c.ok] == []
