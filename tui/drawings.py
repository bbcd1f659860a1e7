"""Scheme text to drawings, remembered: the only slow step between typing and seeing is done once per text.

Called from worker threads. Laying out needs RDKit, which takes a second to load and holds everything up meanwhile;
where there is a back room, it is done there (`draw_elsewhere`) and this process never loads it.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache

from kb.chem.layout import Piece, SchemeDrawing, build_scheme
from kb.errors import StructureError

_elsewhere: list[Callable[[str], SchemeDrawing]] = []


def draw_elsewhere(how: Callable[[str], SchemeDrawing] | None) -> None:
    """Have drawings laid out by another; None = by this process again."""
    _elsewhere[:] = [] if how is None else [how]


@lru_cache(maxsize=256)
def scheme_drawing(text: str) -> SchemeDrawing:
    """Return the drawing of a scheme; a text that makes no sense comes back as itself with the reason."""
    if _elsewhere:
        return _elsewhere[0](text)
    return draw_here(text)


def draw_here(text: str) -> SchemeDrawing:
    """Return the drawing of a scheme, laid out in this process."""
    try:
        return build_scheme(text)
    except StructureError as error:
        return SchemeDrawing(left=(Piece(smiles=text, reason=str(error)),))
