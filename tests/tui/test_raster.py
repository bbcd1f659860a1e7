"""Braille raster: bonds and labels of 60 structures are there, none overlap, panels say what they cut."""

from __future__ import annotations

from pathlib import Path

import pytest

from kb.chem.layout import Mark, MarkKind, build_drawing
from tui.raster import MIN_BOND_DOTS, Grid, build_picture, fit, natural_picture

TABLE = Path(__file__).parents[1] / "data" / "drawings" / "structures.tsv"
ROWS = [
    line.split("\t")
    for line in TABLE.read_text(encoding="utf-8").splitlines()
    if line and not line.startswith(("#", "kind\t"))
]
SMILES = [row[2] for row in ROWS]
IDS = [row[1] for row in ROWS]

PANEL_FOR_MOST = (60, 20)


def shown(grid: Grid) -> dict[tuple[int, int], str]:
    return {(c, r): cell.char for r, row in enumerate(grid.rows) for c, cell in enumerate(row) if cell}


@pytest.mark.parametrize("numbers", [False, True], ids=["plain", "numbered"])
@pytest.mark.parametrize("smiles", SMILES, ids=IDS)
def test_every_bond_and_label_shows_and_none_overlap(smiles: str, numbers: bool) -> None:
    drawing = build_drawing(smiles)
    picture = natural_picture(drawing, numbers)
    held: dict[tuple[int, int], int] = {}
    for label in picture.labels:
        for place, char, _ in label.cells:
            assert held.setdefault(place, label.atom) == label.atom
            assert picture.cells[place].char == char
    wanted = {a.index for a in drawing.atoms if a.is_labelled or numbers}
    assert {label.atom for label in picture.labels} == wanted
    for label in picture.labels:
        text = "".join(char for _, char, _ in label.cells)
        atom = drawing.atoms[label.atom]
        for side in atom.sides:
            spelled = atom.label(side)
            parts = (spelled.before + spelled.core + spelled.after, spelled.above, spelled.below)
            if atom.is_labelled and all(part in text for part in parts if part and not numbers):
                break
        else:
            assert numbers and not atom.is_labelled
    assert len(picture.bond_dots) == len(drawing.bonds)
    assert all(dots >= MIN_BOND_DOTS for dots in picture.bond_dots)
    assert picture.clashes == []


@pytest.mark.parametrize("smiles", SMILES, ids=IDS)
def test_a_panel_shows_the_whole_structure_or_says_what_it_cut(smiles: str) -> None:
    grid = fit(build_drawing(smiles), *PANEL_FOR_MOST)
    assert len(grid.rows) == PANEL_FOR_MOST[1]
    assert {len(row) for row in grid.rows} == {PANEL_FOR_MOST[0]}
    columns, rows = grid.picture.size
    is_whole = len(shown(grid)) == len(grid.picture.cells)
    assert is_whole is (columns <= PANEL_FOR_MOST[0] and rows <= PANEL_FOR_MOST[1])
    assert ("cut" in grid.notice) is not is_whole


def test_most_of_the_structures_fit_an_ordinary_panel_whole() -> None:
    pairs = zip(IDS, SMILES, strict=True)
    cut = [name for name, smiles in pairs if fit(build_drawing(smiles), *PANEL_FOR_MOST).notice]
    assert len(cut) <= 6, cut


@pytest.mark.parametrize(("width", "height"), [(1, 1), (3, 2), (10, 3), (200, 80)])
def test_any_panel_size_is_filled_exactly(width: int, height: int) -> None:
    grid = fit(build_drawing("CC(C)(C)OC(=O)NCCBr"), width, height)
    assert [len(row) for row in grid.rows] == [width] * height


def test_a_crop_keeps_the_reacting_carbon_in_view() -> None:
    drawing = build_drawing("C" * 40 + "Br", [Mark(kind=MarkKind.CENTRE, atoms=(39,))])
    grid = fit(drawing, 20, 4)
    assert "◆" in shown(grid).values()
    assert grid.notice.startswith("cut to fit")


@pytest.mark.parametrize("kind", list(MarkKind))
def test_each_mark_shows_by_shape_on_named_and_on_bare_atoms(kind: MarkKind) -> None:
    from kb.chem.layout import MARK_GLYPHS

    picture = natural_picture(build_drawing("CC(Br)CC", [Mark(kind=kind, atoms=(1, 2))]))
    marked = [cell for cell in picture.cells.values() if cell.char == MARK_GLYPHS[kind]]
    assert len(marked) == 2
    assert {cell.ink for cell in marked} == {str(kind)}


def test_the_breaking_bond_has_a_gap() -> None:
    plain = build_picture(build_drawing("CCBr"), 12.0)
    marks = [Mark(kind=MarkKind.CENTRE, atoms=(1,)), Mark(kind=MarkKind.LEAVING, atoms=(2,))]
    broken = build_picture(build_drawing("CCBr", marks), 12.0)
    assert broken.bond_dots[1] < plain.bond_dots[1]
    assert broken.bond_dots[1] >= MIN_BOND_DOTS


def test_a_triple_bond_has_more_dots_than_a_double_and_that_more_than_a_single() -> None:
    dots = [build_picture(build_drawing(f"C{order}C"), 12.0).bond_dots[0] for order in ("", "=", "#")]
    assert dots[0] < dots[1]
    assert build_picture(build_drawing("NC#CN"), 14.0).bond_dots[1] > dots[0]


def test_a_wedge_is_filled_and_a_hash_is_rungs() -> None:
    drawings = [build_drawing(s) for s in ("CC[C@@H](C)O", "CC[C@H](C)O")]
    counts = []
    for drawing in drawings:
        number = next(i for i, b in enumerate(drawing.bonds) if b.style != "plain")
        counts.append((str(drawing.bonds[number].style), build_picture(drawing, 13.0).bond_dots[number]))
    by_style = dict(counts)
    assert set(by_style) == {"wedge", "hash"}
    assert by_style["wedge"] > by_style["hash"]


def test_the_text_of_a_grid_reads_like_the_picture() -> None:
    text = fit(build_drawing("CC(Br)C"), 20, 6).plain_text()
    assert "Br" in text
    assert len(text.splitlines()) == 6


@pytest.mark.speed
def test_drawing_time_beyond_the_layout() -> None:
    """Reports milliseconds per molecule; never asserts a clock."""
    import time

    times = []
    for smiles in SMILES:
        drawing = build_drawing(smiles)
        started = time.perf_counter()
        fit(drawing, *PANEL_FOR_MOST)
        times.append(1000 * (time.perf_counter() - started))
    middle = sorted(times)[len(times) // 2]
    print(f"raster: median {middle:.2f} ms, worst {max(times):.2f} ms of {len(times)}")
