"""Schemes in cells: arrow, plus signs and words; what is given up is said; marks land on the right atoms."""

from __future__ import annotations

import pytest

from kb.chem.layout import MarkKind, build_drawing, build_scheme
from tests.tui.fake_book import AZIDE_SCHEME, MESYLATE, FakeBook
from tui.marks import departing_atoms, mark_match, mark_scheme
from tui.scheme_raster import fit_scheme


def test_a_scheme_is_drawn_from_left_to_right() -> None:
    text = fit_scheme(build_scheme(AZIDE_SCHEME), 140, 14, "NaN3 (1.5)", "DMF, 80 °C").plain_text()
    assert "▶" in text
    assert "NaN3 (1.5)" in text
    assert "DMF, 80 °C" in text
    assert text.count("+") == 2
    assert "Na⁺" in text


@pytest.mark.parametrize(
    ("width", "notice"),
    [(140, ""), (52, "other reactants not drawn"), (38, "only the substrate is drawn")],
)
def test_what_is_given_up_for_room_is_said(width: int, notice: str) -> None:
    panel = fit_scheme(build_scheme(AZIDE_SCHEME), width, 11, "NaN3", "DMF")
    assert panel.notice == notice
    assert {len(row) for row in panel.rows} == {width}


def test_a_tiny_panel_shows_the_substrate_and_says_so() -> None:
    panel = fit_scheme(build_scheme(AZIDE_SCHEME), 14, 5, "NaN3", "DMF")
    assert "only the substrate is drawn" in panel.notice


def test_text_that_is_no_structure_stands_as_text() -> None:
    panel = fit_scheme(build_scheme("XYZ"), 30, 4)
    assert "XYZ" in panel.plain_text()
    assert panel.notice.startswith("not drawn")


def test_a_leaving_group_is_marked_whole() -> None:
    drawing = build_drawing(MESYLATE)
    assert departing_atoms(drawing, 1, 2) == (2, 3, 4, 5, 6)


def test_an_epoxide_and_a_larger_half_mark_the_leaving_atom_alone() -> None:
    assert departing_atoms(build_drawing("C1CO1"), 0, 2) == (2,)
    boc = build_drawing("CC(C)(C)OC(=O)N1CCC(c2ccccc2)CC1")
    assert departing_atoms(boc, 1, 4) == (4,)


def test_the_motif_of_a_finding_comes_before_the_leaving_group() -> None:
    book = FakeBook()
    reading = book.read_scheme(MESYLATE)
    from tui.plan_state import read_plan

    finding = book.check(read_plan({"scheme": MESYLATE, "solvent": "EtOH"}, book).plan).findings[0]
    marked = mark_scheme(build_scheme(MESYLATE), reading, finding).left[0].drawing
    assert marked is not None
    assert marked.mark_kinds == (MarkKind.CENTRE, MarkKind.MOTIF)


def test_a_match_is_marked_in_the_fragment_it_was_found_in() -> None:
    scheme = build_scheme("CCBr.CCO>>CCOCC")
    marked = mark_match(scheme, "CCO", (2,))
    assert [bool(p.drawing and p.drawing.marks) for p in marked.left + marked.right] == [False, True, False]
