"""A structure query that has been checked: what may be searched, and what is refused with the reason.

Reading. Text is SMARTS. A molfile is taken as drawn, query features included. Text that is also SMILES of a
Kekule ring (`C1=CC=CC=C1`) means the aromatic ring that it stands for, since no stored structure would
match it to the letter. Drawn hydrogens (`[H]C`) become counts, as stored structures do not draw theirs.
Stereo marks count when the query carries any; `ignore_stereo` drops them. An atom with map 1 is the root:
the atom that a rooted search pins to the reacting centre.

Refused: text that is no SMARTS, more than MAX_ATOMS atoms, recursion deeper than MAX_DEPTH or too open to be
enumerated. All else is answered; what might take long for one molecule is told apart by `is_loose`, and
`guarded_match` gives up on the clock.
"""

from __future__ import annotations

import time
from dataclasses import dataclass, field

from rdkit import Chem, rdBase

from kb.chem.query_traits import recursive_texts, traits_of, types_of
from kb.chem.structure import check_text, make_visible, parse_molblock
from kb.errors import QueryError, StructureError

MAX_ATOMS = 250
"""Atoms of a query, recursive parts counted; a judgement: nobody draws more, and screens cost by the atom."""
MAX_DEPTH = 5
MAX_RECURSIVE = 64
LOOSE_ATOMS = 10
"""From this many interchangeable atoms on, one fused cage may take seconds (measured)."""
LOOSE_INNER_ATOMS = 9
"""The same inside `$()`, where every match is enumerated and nobody can look at the clock."""
ROOT_MAP = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class StructureQuery:
    """A checked query.

    Attributes:
        text: as entered.
        mol: the query; treat it as read-only.
        uses_stereo: matches must agree with the stereo marks of the query.
        root: atom that carries map 1; None = not rooted.
        is_loose: matching one large polycycle may take seconds.
    """

    text: str
    mol: Chem.Mol = field(compare=False, repr=False)
    uses_stereo: bool = False
    root: int | None = None
    is_loose: bool = False


def parse_query(text: str, *, ignore_stereo: bool = False) -> StructureQuery:
    """Read and check a substructure query.

    Args:
        text: SMARTS, SMILES or a molfile.
        ignore_stereo: search without stereo even where the query carries marks.

    Raises:
        QueryError: when it is no query, too large, or too open; the sentence says which.
    """
    mol = _read(text)
    if mol.GetNumAtoms() == 0:
        raise QueryError("The query holds no atoms.", "Draw or type at least one.", text)
    mol = Chem.MergeQueryHs(mol)
    mol.UpdatePropertyCache(strict=False)
    Chem.GetSymmSSSR(mol)
    _check_size(text, mol)
    return StructureQuery(
        text=text,
        mol=mol,
        uses_stereo=not ignore_stereo and _has_stereo(mol),
        root=next((a.GetIdx() for a in mol.GetAtoms() if a.GetAtomMapNum() == ROOT_MAP), None),
        is_loose=count_loose(mol) >= LOOSE_ATOMS,
    )


def query_of_fragment(mol: Chem.Mol, text: str) -> StructureQuery:
    """Wrap a query that the program itself made, say a part of a transformation; it is checked alike."""
    mol.UpdatePropertyCache(strict=False)
    Chem.GetSymmSSSR(mol)
    _check_size(text, mol)
    root = next((a.GetIdx() for a in mol.GetAtoms() if a.GetAtomMapNum() == ROOT_MAP), None)
    return StructureQuery(text=text, mol=mol, root=root, is_loose=count_loose(mol) >= LOOSE_ATOMS)


def count_loose(mol: Chem.Mol) -> int:
    """Return how many atoms of a query can stand for each other: the most that admit one atom type."""
    free = 0
    by_type: dict[object, int] = {}
    for atom in mol.GetAtoms():
        types = types_of(traits_of(atom))
        if not types:
            free += 1
        for admitted in types:
            by_type[admitted] = by_type.get(admitted, 0) + 1
    return free + max(by_type.values(), default=0)


def match_parameters(query: StructureQuery) -> Chem.SubstructMatchParameters:
    """Return RDKit's parameters for this query: one match, stereo where it counts."""
    parameters = Chem.SubstructMatchParameters()
    parameters.maxMatches = 1  # type: ignore[assignment]
    parameters.useChirality = query.uses_stereo  # type: ignore[assignment]
    return parameters


def find_match(
    query: StructureQuery, mol: Chem.Mol, *, root_atom: int | None = None, deadline_at: float | None = None
) -> tuple[int, ...] | None:
    """Return one match as atom numbers in query order, or None.

    Args:
        query: the query.
        mol: the structure.
        root_atom: where the root of the query must lie; None = anywhere.
        deadline_at: `time.monotonic()` at which to give up; None = never.

    Raises:
        TimeoutError: when the deadline passed; the molecule is then undecided.
    """
    parameters = match_parameters(query)
    if deadline_at is not None and query.is_loose:

        def in_time(_query_atom: Chem.Atom, _atom: Chem.Atom) -> bool:
            if time.monotonic() > deadline_at:
                raise TimeoutError("matching one molecule took too long")
            return True

        parameters.setExtraAtomCheckFunc(in_time)
    if root_atom is not None and query.root is not None:
        root = query.root

        def at_root(_mol: Chem.Mol, atoms: list[int]) -> bool:
            return bool(atoms[root] == root_atom)

        parameters.setExtraFinalCheck(at_root)
        parameters.uniquify = False  # type: ignore[assignment]
    matches = mol.GetSubstructMatches(query.mol, parameters)
    return tuple(matches[0]) if matches else None


def _read(text: str) -> Chem.Mol:
    if "M  END" in text:
        return _from_molfile(text)
    try:
        smarts = check_text(text)
    except StructureError as problem:
        message = problem.message.replace("structure", "query")
        raise QueryError(message, problem.hint, problem.value) from problem
    if ">>" in smarts or smarts.count(">") == 2:
        raise QueryError(
            f"'{make_visible(smarts)}' is a transformation, not a structure.",
            "Search it with --transformation.",
            smarts,
        )
    # RDKit takes a minute to parse two thousand nested parts, so they are counted before it sees them.
    _refuse_if(smarts.count("$(") > MAX_RECURSIVE, text, f"it has more than {MAX_RECURSIVE} recursive parts")
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmarts(smarts)
        if mol is None:
            raise QueryError(
                f"'{make_visible(smarts)}' is neither SMARTS nor SMILES.",
                "Check brackets, ring closures and atom symbols.",
                smarts,
            )
        return _aromatised(smarts) or mol


def _aromatised(text: str) -> Chem.Mol | None:
    """Return the aromatic query that Kekule SMILES stands for; None where the text is not that."""
    if any(mark in text for mark in "*~!&;$@:") or any(letter in text for letter in "cnosp"):
        return None
    mol = Chem.MolFromSmiles(text)
    if mol is None or mol.GetNumAtoms() > MAX_ATOMS or not any(a.GetIsAromatic() for a in mol.GetAtoms()):
        return None
    return Chem.MolFromSmarts(Chem.MolToSmiles(mol))


def _from_molfile(block: str) -> Chem.Mol:
    try:
        return parse_molblock(block)
    except StructureError as problem:
        raise QueryError(problem.message, problem.hint, problem.value) from problem


def _has_stereo(mol: Chem.Mol) -> bool:
    unset = Chem.ChiralType.CHI_UNSPECIFIED
    if any(a.GetChiralTag() != unset for a in mol.GetAtoms()):
        return True
    plain = (Chem.BondStereo.STEREONONE, Chem.BondStereo.STEREOANY)
    return any(
        b.GetStereo() not in plain or b.GetBondDir() in (Chem.BondDir.ENDUPRIGHT, Chem.BondDir.ENDDOWNRIGHT)
        for b in mol.GetBonds()
    )


def _check_size(text: str, mol: Chem.Mol) -> None:
    atoms, recursive = mol.GetNumAtoms(), 0
    level = [mol]
    depth = 0
    while inner := [part for some in level for atom in some.GetAtoms() for part in recursive_texts(atom)]:
        depth += 1
        recursive += len(inner)
        _refuse_if(depth > MAX_DEPTH, text, f"it is nested more than {MAX_DEPTH} deep")
        _refuse_if(recursive > MAX_RECURSIVE, text, f"it has more than {MAX_RECURSIVE} recursive parts")
        level = [Chem.MolFromSmarts(part) for part in inner]
        for part, inside in zip(inner, level, strict=True):
            atoms += inside.GetNumAtoms()
            _refuse_if(
                count_loose(inside) >= LOOSE_INNER_ATOMS, text, f"'$({make_visible(part, 40)})' is too open"
            )
    _refuse_if(atoms > MAX_ATOMS, text, f"it has {atoms} atoms, at most {MAX_ATOMS} are searched")


def _refuse_if(is_bad: bool, text: str, why: str) -> None:
    if is_bad:
        raise QueryError(
            f"The query '{make_visible(text, 40)}' is not searched: {why}.",
            "Name more of its atoms, or search for a smaller part.",
            text,
        )
