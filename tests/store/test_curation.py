"""House rules, acknowledgements, drafts and attached files."""

from __future__ import annotations

from dataclasses import replace

import pytest

from kb.errors import InvalidRecord, RecordConflict, RecordNotFound
from kb.store.curation import LARGEST_ATTACHMENT_BYTES, safe_file_name
from kb.store.values import HouseRule
from kb.vocabulary import Severity
from tests.engines import Books
from tests.factories import START, a_book, a_run

RULE = HouseRule(
    title="No warm HCl beside a tert-butyl ether",
    motif="[CX4]([CH3])([CH3])([CH3])O[CX4]",
    when="acidity >= strong and temperature_c >= 40",
    severity=Severity.SERIOUS,
    why="lost in R-0004 and R-0009",
    author="MK",
    source="R-0004, R-0009",
)


def test_a_rule_gets_an_id_that_every_book_would_give_it(books: Books) -> None:
    with a_book(books) as store, a_book(books, "other.sidepath") as other:
        kept = store.house_rules.add(RULE)
        assert kept == replace(RULE, rule_id=kept.rule_id, created_at=START)
        assert kept.rule_id.startswith("no-warm-hcl-beside-a-tert-butyl-ether-")
        assert other.house_rules.add(replace(RULE, author="TB")).rule_id == kept.rule_id
        assert store.house_rules.add(replace(RULE, when="acidity >= weak")).rule_id != kept.rule_id
        assert store.house_rules.get(kept.rule_id) == kept
        with pytest.raises(RecordConflict):
            store.house_rules.add(RULE)


def test_a_retired_rule_stays_with_the_reason(books: Books) -> None:
    with a_book(books) as store:
        kept = store.house_rules.add(RULE)
        retired = store.house_rules.retire(kept.rule_id, "TB", "three counterexamples")
        assert retired.is_retired and retired.retired_why == "three counterexamples"
        assert store.house_rules.list() == ()
        assert store.house_rules.list(with_retired=True) == (retired,)
        assert store.house_rules.retire(kept.rule_id, "MK", "again") == retired
        with pytest.raises(RecordNotFound):
            store.house_rules.retire("no-such-rule", "MK", "x")
        with pytest.raises(InvalidRecord):
            store.house_rules.retire(kept.rule_id, "MK", "")


@pytest.mark.parametrize(
    "changes", [{"title": " "}, {"why": ""}, {"author": ""}, {"when": "a\x00b"}, {"motif": "\ud800"}]
)
def test_a_rule_without_title_reason_or_author_is_refused(books: Books, changes: dict[str, str]) -> None:
    with a_book(books) as store, pytest.raises(InvalidRecord):
        store.house_rules.add(replace(RULE, **changes))  # type: ignore[arg-type]


def test_an_acknowledgement_says_who_and_why(books: Books) -> None:
    with a_book(books) as store:
        made = store.acknowledgements.add("n-boc-strong-acid", "CC>>CO", "MK", "0 °C, ten minutes")
        store.acknowledgements.add("n-boc-strong-acid", "other", "MK", "cold")
        assert store.acknowledgements.list("CC>>CO") == (made,)
        assert len(store.acknowledgements.list()) == 2
        with pytest.raises(InvalidRecord):
            store.acknowledgements.add("n-boc-strong-acid", "CC>>CO", "MK", "  ")


def test_a_draft_comes_back_as_it_was_left(books: Books) -> None:
    with a_book(books) as store:
        left = {"scheme": "CCBr>>", "integrals": [1.0, None, "2,5"], "note": "half a \x00 \ud800 paste"}
        store.drafts.save("form", {"scheme": "C"})
        store.drafts.save("form", left)
        store.drafts.save("second", {})
        found = store.drafts.find("form")
        assert found is not None and found.content == left
        assert [d.draft_id for d in store.drafts.list()] == ["second", "form"]
        store.drafts.discard("form")
        store.drafts.discard("form")
        assert store.drafts.find("form") is None
        with pytest.raises(InvalidRecord):
            store.drafts.save("form", {"when": object()})


def test_a_draft_does_not_count_as_a_change_of_the_book(books: Books) -> None:
    with a_book(books) as store:
        before = store.data_version()
        store.drafts.save("form", {"scheme": "C"})
        store.drafts.discard("form")
        assert store.data_version() == before, "what others have read would be read again at every word"
        store.acknowledgements.add("n-boc-strong-acid", "CC>>CO", "MK", "tried before")
        assert store.data_version() > before


def test_files_are_kept_once_and_named_by_runs(books: Books) -> None:
    with a_book(books) as store:
        store.add(a_run(), "MK")
        store.add(a_run(), "MK")
        first = store.attachments.attach("1", "/some/folder/nmr.pdf", b"%PDF", "MK", "spectrum")
        second = store.attachments.attach("2", "C:\\data\\same.pdf", b"%PDF", "MK", "spectrum")
        assert [a.name for a in (*first.attachments, *second.attachments)] == ["nmr.pdf", "same.pdf"]
        assert first.attachments[0].sha256 == second.attachments[0].sha256
        assert first.attachments[0].size_bytes == 4
        assert store.attachments.get(first.attachments[0].sha256) == b"%PDF"
        assert store.history("1")[-1].changed[0].field == "attachments"
        with store.book.reading() as connection:
            assert connection.exec_driver_sql("SELECT count(*) FROM attachment_blob").scalar() == 1
        with pytest.raises(RecordNotFound):
            store.attachments.get("0" * 64)


def test_a_file_too_large_is_refused(books: Books) -> None:
    with a_book(books) as store, pytest.raises(InvalidRecord, match="51 MB"):
        store.attachments.put("raw.zip", b"\x00" * (LARGEST_ATTACHMENT_BYTES + 2**20))


@pytest.mark.parametrize(
    ("given", "kept"),
    [
        ("nmr.pdf", "nmr.pdf"),
        ("../../etc/passwd", "passwd"),
        ("..\\..\\boot.ini", "boot.ini"),
        ("/", "file"),
        ("..", "file"),
        ("", "file"),
        ("a\x00b\x1b[2J.pdf", "ab[2J.pdf"),
        (".hidden", "hidden"),
        ("é" * 300, "é" * 200),
        ("C:evil", "evil"),
    ],
)
def test_a_file_name_cannot_point_anywhere(given: str, kept: str) -> None:
    assert safe_file_name(given) == kept
