"""Which atoms of a drawing to mark, from a reading and a finding: plain graph walking, no chemistry.

A leaving group is marked whole: everything that comes off with the leaving atom when its bond to the centre
is cut. Where both stay joined (an epoxide) only the leaving atom is marked.
"""

from __future__ import annotations

from dataclasses import replace

from kb.chem.facts import Reading
from kb.chem.layout import Drawing, Mark, MarkKind, Piece, SchemeDrawing
from kb.record.finding import Finding


def departing_atoms(drawing: Drawing, centre: int, leaving: int) -> tuple[int, ...]:
    """Return the leaving atom and all that leaves with it.

    Where that is the larger part of the molecule (an ester that loses its alkyl cation) only the atom
    itself is
    returned: what is lost is then better seen from the other side.
    """
    around: dict[int, list[int]] = {}
    for bond in drawing.bonds:
        around.setdefault(bond.begin, []).append(bond.end)
        around.setdefault(bond.end, []).append(bond.begin)
    seen, open_atoms = {leaving}, [leaving]
    while open_atoms:
        atom = open_atoms.pop()
        for other in around.get(atom, ()):
            if other == centre:
                if atom != leaving:
                    return (leaving,)
                continue
            if other not in seen:
                seen.add(other)
                open_atoms.append(other)
    return tuple(sorted(seen)) if 2 * len(seen) <= len(drawing.atoms) + 1 else (leaving,)


def marks_for(drawing: Drawing, component: int, reading: Reading | None, finding: Finding | None) -> tuple[Mark, ...]:
    """Return the marks of one left-side fragment."""
    marks: list[Mark] = []
    for centre in reading.centres[:1] if reading else ():
        if centre.component != component or centre.atom >= len(drawing.atoms):
            continue
        marks.append(Mark(kind=MarkKind.CENTRE, atoms=(centre.atom,)))
        if centre.leaving_atom is not None and centre.leaving_atom < len(drawing.atoms):
            leaving = departing_atoms(drawing, centre.atom, centre.leaving_atom)
            marks.append(Mark(kind=MarkKind.LEAVING, atoms=leaving))
    if finding is not None and finding.component == component and finding.atoms:
        marks.append(Mark(kind=MarkKind.MOTIF, atoms=finding.atoms))
    if finding is not None and finding.component is not None and finding.atoms:
        # While a finding is looked at its motif comes first, or the leaving group would hide it.
        marks = [m for m in marks if m.kind is not MarkKind.LEAVING]
    return tuple(marks)


def mark_scheme(scheme: SchemeDrawing, reading: Reading | None, finding: Finding | None = None) -> SchemeDrawing:
    """Return the scheme with the reacting carbon, the leaving group and the motif of a finding marked."""
    pieces = []
    for number, piece in enumerate(scheme.left + scheme.agents):
        if piece.drawing is not None:
            marks = marks_for(piece.drawing, number, reading, finding)
            piece = replace(piece, drawing=replace(piece.drawing, marks=marks))
        pieces.append(piece)
    cut = len(scheme.left)
    return replace(scheme, left=tuple(pieces[:cut]), agents=tuple(pieces[cut:]))


def mark_match(
    scheme: SchemeDrawing, smiles: str, atoms: tuple[int, ...], kind: MarkKind = MarkKind.MATCH
) -> SchemeDrawing:
    """Return the scheme with the atoms of a match marked, in the fragment that is written as `smiles`."""
    if not atoms:
        return scheme
    mark = Mark(kind=kind, atoms=atoms)

    def marked(pieces: tuple[Piece, ...]) -> tuple[Piece, ...]:
        return tuple(
            replace(piece, drawing=replace(piece.drawing, marks=(mark,)))
            if piece.drawing is not None and piece.smiles == smiles
            else piece
            for piece in pieces
        )

    return replace(scheme, left=marked(scheme.left), agents=marked(scheme.agents), right=marked(scheme.right))
