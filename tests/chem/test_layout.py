"""Layout: every atom and bond of an entry is in its drawing, roomy, in the order entered, and safe to show.

The structures are in tests/data/drawings/structures.tsv; RDKit's own counts are the reference.
"""

from __future__ import annotations

import math
import subprocess
import sys
import xml.etree.ElementTree as ET
from pathlib import Path

import pytest

from kb.chem.layout import (
    MAX_ATOMS,
    BondStyle,
    Mark,
    MarkKind,
    Side,
    build_drawing,
    build_scheme,
    build_strokes,
    split_scheme,
)
from kb.chem.layout_svg import MARK_COLOURS, render_svg
from kb.errors import StructureError

TABLE = Path(__file__).parents[1] / "data" / "drawings" / "structures.tsv"
ROWS = [
    tuple(line.split("\t"))
    for line in TABLE.read_text(encoding="utf-8").splitlines()
    if line and not line.startswith(("#", "kind\t"))
]
IDS = [row[1] for row in ROWS]
SMILES = [row[2] for row in ROWS]


def test_the_table_covers_the_kinds_that_are_promised() -> None:
    assert len(ROWS) >= 60
    assert {r[0] for r in ROWS} >= {
        "ring",
        "spiro",
        "bridged",
        "macrocycle",
        "charged",
        "stereo",
        "salt",
        "large",
    }


@pytest.mark.parametrize("smiles", SMILES, ids=IDS)
def test_every_atom_and_bond_is_drawn_where_the_entry_has_it(smiles: str) -> None:
    from rdkit import Chem

    params = Chem.SmilesParserParams()
    params.removeHs = False
    mol = Chem.MolFromSmiles(smiles, params)
    drawing = build_drawing(smiles)
    assert [a.element for a in drawing.atoms] == [a.GetSymbol() for a in mol.GetAtoms()]
    drawn = {frozenset((b.begin, b.end)) for b in drawing.bonds}
    assert drawn == {frozenset((b.GetBeginAtomIdx(), b.GetEndAtomIdx())) for b in mol.GetBonds()}
    for atom, spot in zip(mol.GetAtoms(), drawing.atoms, strict=True):
        assert spot.charge == atom.GetFormalCharge()
        if spot.is_labelled:
            assert spot.hydrogens == atom.GetTotalNumHs()
        if atom.GetSymbol() != "C" or atom.GetFormalCharge() or atom.GetDegree() == 0:
            assert spot.is_labelled


@pytest.mark.parametrize("smiles", SMILES, ids=IDS)
def test_no_atom_sits_on_another_or_on_a_strange_bond(smiles: str) -> None:
    drawing = build_drawing(smiles)
    assert drawing.nearest > 0.3
    strokes = build_strokes(drawing, [(a.x, a.y) for a in drawing.atoms], 0.2)
    assert {s.bond for s in strokes} == set(range(len(drawing.bonds)))
    for bond in drawing.bonds:
        length = math.dist(
            (drawing.atoms[bond.begin].x, drawing.atoms[bond.begin].y),
            (drawing.atoms[bond.end].x, drawing.atoms[bond.end].y),
        )
        assert 0.45 < length < 2.6


def test_the_same_entry_gives_the_same_picture() -> None:
    camphor = "CC1(C)C2CCC1(C)C(=O)C2"
    assert build_drawing(camphor) == build_drawing(camphor)


def test_bond_orders_get_as_many_lines() -> None:
    drawing = build_drawing("C#CC=CC")
    assert [len(b.lanes) for b in drawing.bonds] == [3, 1, 2, 1]


def test_the_second_line_of_a_ring_bond_lies_inside_the_ring() -> None:
    drawing = build_drawing("c1ccccc1")
    points = [(a.x, a.y) for a in drawing.atoms]
    centre = (sum(x for x, _ in points) / 6, sum(y for _, y in points) / 6)
    lines: dict[int, list[float]] = {}
    for stroke in build_strokes(drawing, points, 0.2):
        middle = ((stroke.start[0] + stroke.end[0]) / 2, (stroke.start[1] + stroke.end[1]) / 2)
        lines.setdefault(stroke.bond, []).append(math.dist(middle, centre))
    double = [away for away in lines.values() if len(away) == 2]
    assert len(double) == 3
    assert all(second < first for first, second in double)


@pytest.mark.parametrize(
    ("smiles", "styles"),
    [
        ("CC[C@@H](C)Br", {BondStyle.WEDGE, BondStyle.HASH}),
        ("CCC(C)Br", set()),
    ],
)
def test_configuration_is_drawn_with_a_wedge_or_a_hash(smiles: str, styles: set[BondStyle]) -> None:
    drawn = {b.style for b in build_drawing(smiles).bonds} - {BondStyle.PLAIN}
    assert drawn <= styles
    assert bool(drawn) is bool(styles)


def test_mirror_images_are_drawn_differently() -> None:
    def styles(smiles: str) -> list[BondStyle]:
        return [b.style for b in build_drawing(smiles).bonds]

    assert styles("CC[C@@H](C)Br") != styles("CC[C@H](C)Br")


@pytest.mark.parametrize(
    ("smiles", "side", "text"),
    [
        ("[NH3+]C", Side.EAST, "NH₃⁺"),
        ("[NH3+]C", Side.WEST, "H₃N⁺"),
        ("[O-]C", Side.EAST, "O⁻"),
        ("[Ca+2]", Side.EAST, "Ca²⁺"),
        ("[13CH3]C", Side.EAST, "¹³CH₃"),
        ("[CH3]", Side.EAST, "CH₃·"),
        ("O", Side.WEST, "H₂O"),
    ],
)
def test_labels_read_as_the_trade_writes_them(smiles: str, side: Side, text: str) -> None:
    label = build_drawing(smiles).atoms[0].label(side)
    assert label.before + label.core + label.after == text


def test_a_lone_hydride_puts_its_hydrogens_first() -> None:
    assert build_drawing("O").atoms[0].sides[0] is Side.WEST


def test_a_carbon_between_two_straight_bonds_is_named_so_that_it_shows() -> None:
    allene = build_drawing("CC=C=CC")
    assert [a.index for a in allene.atoms if a.is_labelled] == [2]


def test_marks_are_told_in_words_and_the_centre_wins() -> None:
    drawing = build_drawing(
        "CC(Br)C",
        [
            Mark(kind=MarkKind.MATCH, atoms=(1, 2, 99)),
            Mark(kind=MarkKind.CENTRE, atoms=(1,)),
            Mark(kind=MarkKind.LEAVING, atoms=(2,)),
        ],
    )
    assert drawing.mark_of(1) is MarkKind.CENTRE
    assert drawing.mark_of(99) is None
    assert "reacting carbon ◆: C1" in drawing.text_alternative
    assert "leaving group ○: Br2" in drawing.text_alternative
    points = [(a.x, a.y) for a in drawing.atoms]
    assert [s.bond for s in build_strokes(drawing, points, 0.2) if s.is_breaking] == [1]


@pytest.mark.parametrize("text", ["", "not a molecule", "C(", "C" * (MAX_ATOMS + 1), "F(C)(C)(C)C"])
def test_what_cannot_be_drawn_is_refused_in_words(text: str) -> None:
    with pytest.raises(StructureError) as caught:
        build_drawing(text)
    assert caught.value.hint


def test_rdkit_says_nothing_of_its_own_when_it_cannot_read(capfd: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(StructureError):
        build_drawing("C1CC")
    assert capfd.readouterr() == ("", "")


def test_a_scheme_is_split_into_its_sides_and_marks_count_over_left_and_agents() -> None:
    scheme = build_scheme(
        "CCBr.[N-]=[N+]=[N-]>[Na+]>CCN=[N+]=[N-]", {0: [Mark(kind=MarkKind.CENTRE, atoms=(1,))]}
    )
    assert [len(side) for side in (scheme.left, scheme.agents, scheme.right)] == [2, 1, 1]
    assert scheme.has_arrow
    first = scheme.left[0].drawing
    assert first is not None
    assert first.mark_of(1) is MarkKind.CENTRE


def test_a_dative_arrow_is_no_reaction_arrow() -> None:
    assert split_scheme("CN->[B]")[3] is False


def test_a_fragment_that_cannot_be_drawn_is_kept_as_text_with_the_reason() -> None:
    scheme = build_scheme("CCBr.XYZ>>")
    assert scheme.left[0].drawing is not None
    assert scheme.left[1].drawing is None
    assert "XYZ" in scheme.left[1].reason


def test_one_arrow_sign_is_refused() -> None:
    with pytest.raises(StructureError, match="'>'"):
        build_scheme("CCBr>CCO")


@pytest.mark.parametrize("smiles", SMILES, ids=IDS)
def test_the_svg_is_well_formed_and_holds_every_bond_and_label(smiles: str) -> None:
    drawing = build_drawing(smiles)
    root = ET.fromstring(render_svg(drawing))
    space = "{http://www.w3.org/2000/svg}"
    bonds = {e.get("data-bond") for e in root.iter() if e.get("data-bond") is not None}
    labels = {e.get("data-atom") for e in root.iter(f"{space}g")}
    assert bonds == {str(i) for i in range(len(drawing.bonds))}
    assert labels == {str(a.index) for a in drawing.atoms if a.is_labelled}
    assert root.find(f"{space}title") is not None
    assert root.get("role") == "img"


def test_the_svg_refers_to_nothing_outside_and_escapes_what_was_typed() -> None:
    text = render_svg(build_drawing("CCBr", [Mark(kind=MarkKind.CENTRE, atoms=(1,))]), title='<script>"&')
    assert "<script" not in text
    assert "href" not in text
    assert "url(" not in text
    assert text.count("http") == 1  # the namespace
    assert 'class="mark-centre"' in text


def test_mark_colours_can_be_read_on_white() -> None:
    """Contrast by the WCAG 2 formula, at least 4.5 to 1 as that guideline asks of text."""

    def luminance(colour: str) -> float:
        parts = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
        linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    assert all(1.05 / (luminance(c) + 0.05) >= 4.5 for c in MARK_COLOURS.values())


def test_importing_the_layout_does_not_load_rdkit() -> None:
    script = "import sys, kb.chem.layout, kb.chem.layout_svg; print('rdkit' in sys.modules)"
    result = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert result.stdout.strip() == "False"
