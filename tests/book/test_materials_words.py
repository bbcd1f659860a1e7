"""Names completed from the catalogue while they are typed."""

from __future__ import annotations

import pytest

from kb.book import complete_material, lookup_material


@pytest.mark.parametrize(
    ("start", "kind", "wanted"),
    [
        ("K2C", "reagent", "K2CO3"),
        ("k2c", "reagent", "K2CO3"),
        ("dimethyl sulf", "solvent", "dimethyl sulfoxide"),
        ("tetrahydrof", "solvent", "tetrahydrofuran"),
        ("sodium az", "reagent", "sodium azide"),
    ],
)
def test_names_begin_with_what_was_typed_and_are_names_of_the_catalogue(start: str, kind: str, wanted: str) -> None:
    offers = complete_material(start, kind)
    names = [offer["name"].replace(" ", "") for offer in offers]
    assert wanted.replace(" ", "") in names
    for offer in offers:
        assert offer["name"].casefold().startswith(start.casefold())
        match = lookup_material(offer["name"], kind)["match"]
        assert match is not None
        assert match["name"] == offer["entry"]


def test_each_entry_is_offered_once_and_no_more_than_asked() -> None:
    offers = complete_material("p", "reagent", limit=5)
    assert len(offers) == 5
    assert len({offer["entry"] for offer in offers}) == 5


def test_nothing_typed_offers_nothing() -> None:
    assert complete_material("  ") == []
    assert complete_material("xyzzy") == []
