"""Scheme text to drawings, remembered: the only slow step between typing and seeing is done once per text.

Called from worker threads; RDKit is first loaded here, so the first call takes as long as that import.
"""

from __future__ import annotations

from functools import lru_cache

from kb.chem.layout import Piece, SchemeDrawing, build_scheme
from kb.errors import StructureError


@lru_cache(maxsize=256)
def scheme_drawing(text: str) -> SchemeDrawing:
    """Return the drawing of a scheme; a text that makes no sense comes back as itself with the reason."""
    try:
        return build_scheme(text)
    except StructureError as error:
        return SchemeDrawing(left=(Piece(smiles=text, reason=str(error)),))
