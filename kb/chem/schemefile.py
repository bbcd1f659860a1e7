"""A drawn scheme or structure in a file (RXN or molfile, V2000 or V3000) as scheme text.

It reads one reaction or one molecule and writes nothing. Coordinates serve only to tell wedges and double-
bond geometry, and are then forgotten; atom maps are kept. Files of many records are `kb.exchange`. The text
it gives is what a chemist could have typed, so everything above knows one form of scheme only.

Source of the layout: the published CTfile formats document (BIOVIA), RXN and molfile chapters.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path

from rdkit import Chem

from kb.chem.structure import make_visible, parse_molblock
from kb.errors import StructureError

LARGEST_FILE = 4_000_000
"""Most bytes of a file that are read."""

MAX_MOLECULES = 200
"""Most molecules of one RXN block."""

_SIDES = ("REACTANT", "PRODUCT", "AGENT")
_HEAD_V3000 = "\n\n\n  0  0  0     0  0            999 V3000\n"


def read_scheme_file(path: Path) -> str:
    """Return the scheme text of an RXN file or molfile.

    Args:
        path: the file.

    Raises:
        StructureError: when it is missing, unreadable, too large, or holds no structure that we can use.
    """
    shown = make_visible(str(path), limit=300)
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise StructureError(f"The file '{shown}' is too large for one scheme.", "Export one reaction.", shown)
        block = path.read_text(encoding="utf-8", errors="replace")
    except OSError as problem:
        raise StructureError(
            f"The file '{shown}' cannot be read: {problem.strerror or 'unknown reason'}.", "Check the path.", shown
        ) from problem
    return scheme_of_block(block)


def scheme_of_block(block: str) -> str:
    """Return reaction SMILES of an RXN block, or SMILES of a molfile block.

    Args:
        block: the text of one RXN file, molfile, or the first record of an SDF.

    Raises:
        StructureError: when the block is damaged or one of its molecules is impossible; the sentence says which.
    """
    text = block.replace("\r\n", "\n").replace("\r", "\n")
    if not text.lstrip("\n\ufeff").startswith("$RXN"):
        return _smiles(text, "The molecule")
    text = text.lstrip("\n\ufeff")
    sides: dict[str, list[str]] = {side: [] for side in _SIDES}
    molecules = _iter_v3000(text) if text.startswith("$RXN V3000") else _iter_v2000(text)
    for side, molecule in molecules:
        sides[side].append(_smiles(molecule, f"{side.capitalize()} {len(sides[side]) + 1}"))
        if sum(map(len, sides.values())) > MAX_MOLECULES:
            raise StructureError(
                f"The RXN block holds more than {MAX_MOLECULES} molecules.", "Export one reaction.", None
            )
    if not sides["REACTANT"]:
        raise StructureError("The RXN block has no reactants.", "Draw the substrate before the arrow.", None)
    reactants, products, agents = (".".join(sides[side]) for side in _SIDES)
    return f"{reactants}>{agents}>{products}"


def _iter_v2000(text: str) -> Iterator[tuple[str, str]]:
    """Yield (side, molfile) of an RXN block; the counts line (3-character fields) says how many stand on each side."""
    head, *molecules = re.split(r"^\$MOL[ \t]*\n", text, flags=re.MULTILINE)
    lines = head.split("\n")
    fields = [lines[4][i : i + 3].strip() for i in (0, 3, 6)] if len(lines) > 4 else []
    if len(fields) < 2 or not all(f.isdigit() for f in fields[:2]) or not (fields[2] or "0").isdigit():
        raise StructureError("The RXN block has no counts line that can be read.", "Export it again.", None)
    counts = [int(f or 0) for f in fields]
    if sum(counts) != len(molecules):
        raise StructureError(
            f"The RXN block announces {sum(counts)} molecules and holds {len(molecules)}.", "Export it again.", None
        )
    sides = [side for side, count in zip(_SIDES, counts, strict=True) for _ in range(count)]
    yield from zip(sides, molecules, strict=True)


def _iter_v3000(text: str) -> Iterator[tuple[str, str]]:
    """Yield (side, molfile) of an extended RXN block, each connection table wrapped as a molfile of its own."""
    for side in _SIDES:
        for part in re.findall(rf"^M  V30 BEGIN {side}$(.*?)^M  V30 END {side}$", text, flags=re.M | re.S):
            for table in re.findall(r"^M  V30 BEGIN CTAB.*?^M  V30 END CTAB$", part, flags=re.M | re.S):
                yield side, f"{_HEAD_V3000}{table}\nM  END\n"


def _smiles(block: str, what: str) -> str:
    """Return SMILES of a molfile; a refusal names which molecule it was."""
    try:
        mol = parse_molblock(block)
    except StructureError as problem:
        raise StructureError(f"{what}: {problem.message}", problem.hint, problem.value) from problem
    return str(Chem.MolToSmiles(mol))
