"""Headings in three styles: matched, said to resemble, or left alone and said so."""

from __future__ import annotations

import pytest

from kb.errors import ImportFileError
from kb.exchange.headings import SYNONYMS, ColumnMapping, match_headings
from kb.exchange.row_out import FIELDS_OUT


def uses(*headings: str) -> dict[str, tuple[str | None, str | None, str]]:
    return {c.heading: (c.field, c.unit, c.how) for c in match_headings(["scheme", *headings]).columns}


@pytest.mark.parametrize(
    ("heading", "field", "unit"),
    [
        ("T (°C)", "temperature", "C"),
        ("T / K", "temperature", "K"),
        ("t [min]", "time", "min"),
        ("t / h", "time", "h"),
        ("Temp.", "temperature", None),
        ("Yield (%)", "isolated yield", "%"),
        ("NMR yield %", "assay yield", "%"),
        ("conc. (M)", "concentration", "M"),
        ("conc (mM)", "concentration", "mM"),
        ("Scale mmol", "scale", "mmol"),
        ("Nucleophile", "reagents", None),
        ("E2 (%)", "share elimination", "%"),
        ("SM left", "share unreacted", None),
        ("yield (fraction)", "isolated yield", "fraction"),
        ("NOTEBOOK_REF", "reference", None),
    ],
)
def test_synonyms_and_units_are_understood(heading: str, field: str, unit: str | None) -> None:
    found = uses(heading)[heading]
    assert found[:2] == (field, unit)
    assert found[2] in ("synonym", "exact")


def test_a_slip_of_the_pen_is_matched_and_said_to_resemble() -> None:
    found = uses("solvnet", "temprature", "weather", "")
    assert found["solvnet"] == ("solvent", None, "resembles")
    assert found["temprature"] == ("temperature", None, "resembles")
    assert found["weather"] == (None, None, "unknown")
    assert found[""] == (None, None, "blank")


def test_of_two_columns_for_one_field_the_better_match_wins_and_the_other_is_reported() -> None:
    mapping = match_headings(["scheme", "yield", "isolated yield"])
    assert [(c.field, c.how) for c in mapping.columns][1:] == [(None, "spare"), ("isolated yield", "exact")]
    assert [c.heading for c in mapping.unused] == ["yield"]


def test_a_table_without_a_reaction_is_refused() -> None:
    with pytest.raises(ImportFileError, match="No column tells the reaction"):
        match_headings(["date", "solvent"])


def test_a_mapping_can_be_saved_and_serves_the_next_file() -> None:
    saved = {
        "columns": {"Was geschah": {"field": "failed", "unit": None}, "Rxn": {"field": "scheme"}},
        "date_order": "dmy",
    }
    mapping = match_headings(["Rxn", "was  geschah"], saved)
    assert [(c.field, c.how) for c in mapping.columns] == [("scheme", "chosen"), ("failed", "chosen")]
    assert mapping.date_order == "dmy"
    again = match_headings(["was geschah", "Rxn"], mapping.as_dict())
    assert [c.field for c in again.columns] == ["failed", "scheme"]
    assert match_headings(["X", "Y"], {"X": "scheme", "Y": "note"}).fields == {"scheme", "note"}
    with pytest.raises(ImportFileError, match="is no field"):
        match_headings(["X"], {"columns": {"X": "colour"}})


def test_every_exported_heading_is_read_as_the_field_it_was() -> None:
    mapping: ColumnMapping = match_headings(FIELDS_OUT)
    assert [c.how for c in mapping.columns] == ["exact"] * len(FIELDS_OUT)
    assert [c.field for c in mapping.columns] == [h.removesuffix(" / %") for h in FIELDS_OUT]


def test_no_two_fields_share_a_synonym() -> None:
    names = [name for names in SYNONYMS.values() for name in names]
    assert len(names) == len(set(names))
