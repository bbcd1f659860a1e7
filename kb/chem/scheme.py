"""A scheme: its sides, its fragments, and the way back from canonical numbering to what was typed.

It decides nothing about what reacts. A scheme is reaction SMILES (`reactants>agents>products`, products may
be empty) or structures alone, which are then all reactants. Fragments are what stands between dots; a salt
written with a dot is two fragments, each of which may react. Fragments on the left are counted reactants
first, then agents: this is the `component` of every fact. Atom numbers are 0-based positions in the fragment
as entered, explicit hydrogens counted.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from functools import lru_cache
from typing import Literal

from rdkit import Chem, rdBase

from kb.chem.molgraph import Molgraph, molgraph_of
from kb.chem.structure import check_text, make_visible, parse_molecule
from kb.errors import StructureError

Side = Literal["reactant", "agent", "product"]

MAX_FRAGMENTS = 400
"""Most fragments of a scheme that are read; a longer soup is refused rather than read in part."""

_ARROW = re.compile(r"(?<!-)>")
_CX_BLOCK = re.compile(r"\s+\|[^|]*\|\s*$")


@dataclass(frozen=True, slots=True, kw_only=True)
class Fragment:
    """What stands between two dots.

    Attributes:
        smiles_as_entered: its text as typed.
        smiles: canonical SMILES, atom maps dropped.
        side: where it stands.
        entered: canonical atom number -> position as entered.
        maps: canonical atom number -> atom map as entered; 0 = not mapped.
        graph: the molecule as lists, in canonical numbering.
    """

    smiles_as_entered: str
    smiles: str
    side: Side
    entered: tuple[int, ...]
    maps: tuple[int, ...]
    graph: Molgraph = field(compare=False, repr=False)

    @property
    def is_mapped(self) -> bool:
        """Return whether any atom carries a map."""
        return any(self.maps)


@dataclass(frozen=True, slots=True, kw_only=True)
class Scheme:
    """A scheme that was understood.

    Attributes:
        text: as entered, outer blanks dropped.
        reactants: fragments before the first arrow.
        agents: fragments over the arrow.
        products: fragments behind the arrow; empty when none was stated.
    """

    text: str
    reactants: tuple[Fragment, ...]
    agents: tuple[Fragment, ...] = ()
    products: tuple[Fragment, ...] = ()

    @property
    def left(self) -> tuple[Fragment, ...]:
        """Return reactants and agents, numbered as facts number components."""
        return self.reactants + self.agents

    @property
    def smiles(self) -> str:
        """Return the canonical reaction SMILES, fragments in the order as entered, maps dropped."""
        sides = (self.reactants, self.agents, self.products)
        return ">".join(".".join(f.smiles for f in side) for side in sides)


def parse_scheme(text: str) -> Scheme:
    """Parse reaction SMILES, or structures alone, into a scheme.

    A CXSMILES block at the end is set aside: what it adds (coordinates, highlights, groups) is not chemistry we read.

    Raises:
        StructureError: when a fragment cannot be understood, the left side is empty, or the arrows do not add up;
            the sentence names the fragment.
    """
    stripped = _CX_BLOCK.sub("", check_text(text))
    parts = _ARROW.split(stripped)
    if len(parts) not in (1, 3):
        raise StructureError(
            f"'{make_visible(stripped)}' has {_arrows(len(parts) - 1)}; a scheme is reactants>agents>products.",
            "Write two '>' signs, with nothing between them when no agent is named.",
            make_visible(stripped),
        )
    sides = [part.strip() for part in parts] + [""] * (3 - len(parts))
    if not sides[0]:
        raise StructureError(
            "The scheme has no reactants.", "Put the substrate before the first '>'.", make_visible(stripped)
        )
    if sum(side.count(".") + 1 for side in sides) > MAX_FRAGMENTS:
        raise StructureError(
            f"The scheme has more than {MAX_FRAGMENTS} fragments.",
            "Give one reaction at a time.",
            make_visible(stripped),
        )
    return Scheme(
        text=stripped,
        reactants=_fragments(sides[0], "reactant"),
        agents=_fragments(sides[1], "agent"),
        products=_fragments(sides[2], "product"),
    )


def _arrows(count: int) -> str:
    """Return the number of arrows in words: one is half of what a scheme has."""
    return "one of its two arrows only" if count == 1 else f"{count} arrows"


def _fragments(text: str, side: Side) -> tuple[Fragment, ...]:
    """Return the fragments of one side in the order as entered."""
    if not text:
        return ()
    tokens = text.split(".")
    if any(not token.strip() for token in tokens):
        raise StructureError(
            f"The {side} side has an empty place between dots.", "Remove the extra dot.", make_visible(text)
        )
    try:
        return tuple(_fragment(token.strip(), side) for token in tokens)
    except StructureError:
        if len(tokens) == 1 or not re.search(r"\d", text):
            raise
        # A ring closure may cross a dot ("C1.C1" is ethane): then the dots do not mark fragments.
        joined = _joined_fragments(text, side)
        if joined is None:
            raise
        return joined


def _joined_fragments(text: str, side: Side) -> tuple[Fragment, ...] | None:
    """Return fragments of a side whose ring closures cross dots; None when that is no structure either."""
    try:
        mol = parse_molecule(text, keep_hydrogens=True)
    except StructureError:
        return None
    found = []
    for atoms in Chem.GetMolFrags(mol):
        piece = Chem.MolFragmentToSmiles(mol, atomsToUse=atoms, canonical=False, isomericSmiles=True)
        found.append(_fragment(piece, side))
    return tuple(found)


@lru_cache(maxsize=4096)
def _fragment(token: str, side: Side) -> Fragment:
    smiles, entered, maps = _canonical(token)
    return Fragment(
        smiles_as_entered=token,
        smiles=smiles,
        side=side,
        entered=entered,
        maps=maps,
        graph=molgraph_of(smiles),
    )


@lru_cache(maxsize=4096)
def _canonical(token: str) -> tuple[str, tuple[int, ...], tuple[int, ...]]:
    """Return canonical SMILES and, per atom of it, the position and the map as entered."""
    mol = parse_molecule(token, keep_hydrogens="[H" in token or "[2H" in token or "[3H" in token)
    maps = []
    for atom in mol.GetAtoms():
        maps.append(atom.GetAtomMapNum())
        if maps[-1]:
            atom.SetAtomMapNum(0)
        atom.SetIntProp("entered", atom.GetIdx())
    if any(a.GetAtomicNum() == 1 for a in mol.GetAtoms()) and mol.GetNumAtoms() > 1:
        with rdBase.BlockLogs():
            mol = Chem.RemoveHs(mol)
    smiles = str(Chem.MolToSmiles(mol))
    order = list(mol.GetPropsAsDict(True, True)["_smilesAtomOutputOrder"])
    positions = tuple(mol.GetAtomWithIdx(i).GetIntProp("entered") for i in order)
    # An isotopic hydrogen stays an atom, so the canonical text may hold more atoms than heavy ones.
    return smiles, positions, tuple(maps[p] for p in positions)
