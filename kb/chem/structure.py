"""One structure: text or a molfile to a standardised molecule, or a refusal that says why.

It refuses to guess: names are looked up elsewhere, a query is no structure, and nothing is repaired in silence.

Identity policy. Two entries are the same thing when their `identity_key` is equal. The key is the SHA-256 (first
32 hex digits) of the canonical isomeric SMILES after these steps, each on a copy, in this order:

1. explicit hydrogens that say nothing (no isotope, no lone ion) become counts;
2. salts drawn with a covalent bond to an alkali or alkaline-earth metal are drawn as ions;
3. functional groups with several drawings (nitro, N-oxide, sulfoxide, azide, diazo) get one drawing;
4. atom maps are dropped, stereo marks that mean nothing are cleared, and real ones kept.

So stereo, isotopes, charges and *every* component count: a hydrochloride is not its free base, one enantiomer
is not the other nor the racemate. Tautomers count as different: chemists draw the one they mean, and no cheap
canonical tautomer is trustworthy. `flat_key` is the looser one: the organic parts only, neutral, no stereo,
no isotopes; it brings a salt and its base, both enantiomers and the flat drawing together. Source of the
steps: the RDKit MolStandardize toolkit; which of them are used is a decision of this project.
"""

from __future__ import annotations

import hashlib
import re
from dataclasses import dataclass, field
from functools import lru_cache
from typing import TYPE_CHECKING

from rdkit import Chem, rdBase

from kb.errors import StructureError

if TYPE_CHECKING:
    from rdkit.Chem.MolStandardize.rdMolStandardize import Normalizer

MAX_TEXT_LENGTH = 20_000
"""Longest text that is read at all; far past any real scheme, and short enough to stay quick."""

MAX_ATOMS = 2_000
"""Atoms of the largest molecule that is read. RDKit numbers atoms by a recursion that ends the whole process at some
20,000 atoms in a row, and in a time that grows with the square of their number: 0.03 s here, 0.7 s at 10,000."""

_ALKALI = frozenset((3, 4, 11, 12, 19, 20, 37, 38, 55, 56))


@dataclass(frozen=True, slots=True, kw_only=True)
class Structure:
    """A structure that was understood.

    Attributes:
        smiles_as_entered: the text as typed; for a molfile, the SMILES before standardising.
        smiles: canonical SMILES after standardising, components sorted by RDKit.
        identity_key: 32 hex digits; see the module text.
        flat_key: 32 hex digits; salts, stereo and isotopes ignored.
        heavy_atoms: how many, over all components.
        notes: what is unusual (radical, isotope, metal, attachment point), in plain words.
        mol: the standardised molecule; treat it as read-only.
    """

    smiles_as_entered: str
    smiles: str
    identity_key: str
    flat_key: str
    heavy_atoms: int
    notes: tuple[str, ...] = ()
    mol: Chem.Mol = field(compare=False, repr=False)


def make_visible(text: str, limit: int = 80) -> str:
    """Return text safe to show in a sentence: control characters written out, long text shortened.

    Args:
        text: anything a user gave.
        limit: most characters kept; the rest is counted.

    >>> make_visible("CC" + chr(27) + "[2J")
    'CC\\\\x1b[2J'
    """
    one_line = text[: limit + 1].replace("\n", " ").replace("\r", " ").replace("\t", " ")
    shown = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in one_line)
    if len(text) > limit:
        return f"{shown[:limit]}... ({len(text)} characters)"
    return shown


def check_text(text: str) -> str:
    """Return the text without outer blanks, or refuse it.

    Raises:
        StructureError: when it is empty, too long, or carries control characters or others than ASCII.
    """
    if len(text) > MAX_TEXT_LENGTH:
        raise StructureError(
            f"The text is {len(text)} characters long; at most {MAX_TEXT_LENGTH} are read.",
            "Give one structure or one scheme at a time.",
            text[:80],
        )
    if any(not c.isprintable() and c not in "\t\n\r" for c in text):
        raise StructureError(
            f"The text '{make_visible(text)}' carries control characters.",
            "Paste it again as plain text.",
            make_visible(text),
        )
    stripped = text.strip()
    if not stripped:
        raise StructureError("There is no structure: the text is empty.", "Type or paste a SMILES.", text)
    strange = next((c for c in stripped if not c.isascii()), None)
    if strange is not None:
        raise StructureError(
            f"The text holds the character U+{ord(strange):04X}, which no SMILES uses.",
            "Use plain letters, digits and signs; a minus is a hyphen.",
            make_visible(stripped),
        )
    return stripped


def parse_molecule(text: str, *, keep_hydrogens: bool = False) -> Chem.Mol:
    """Parse SMILES into a sanitised molecule, atoms in the order as entered.

    Args:
        text: SMILES; a trailing CXSMILES block between bars is read by RDKit, anything else after a blank is refused.
        keep_hydrogens: keep explicit hydrogens as atoms, so that atom numbers stay those of the entry.

    Raises:
        StructureError: when it is no SMILES, or breaks a rule of valence or aromaticity; the sentence names the atom.
    """
    stripped = check_text(text)
    smiles, *others = stripped.split(None, 1)
    rest = others[0] if others else ""
    if rest and not rest.startswith("|"):
        raise StructureError(
            f"'{make_visible(stripped)}' holds a blank, so it is no single SMILES.",
            "Give the structure alone, without a name behind it.",
            make_visible(stripped),
        )
    params = Chem.SmilesParserParams()
    params.removeHs = not keep_hydrogens  # type: ignore[assignment]
    params.sanitize = True  # type: ignore[assignment]
    with rdBase.BlockLogs():
        try:
            mol = Chem.MolFromSmiles(f"{smiles} {rest}" if rest else smiles, params)
        except (ValueError, RuntimeError) as problem:
            raise StructureError(
                f"'{make_visible(smiles)}' cannot be read as SMILES.", "Check the text.", make_visible(smiles)
            ) from problem
        if mol is None:
            raise _explain(smiles)
    if mol.GetNumAtoms() == 0:
        raise StructureError("There is no structure: no atoms were found.", "Type or paste a SMILES.", smiles)
    return _not_too_large(mol)


def _not_too_large(mol: Chem.Mol) -> Chem.Mol:
    """Return the molecule; refused where numbering its atoms would keep somebody waiting, or end the process."""
    n = mol.GetNumAtoms()
    if n > MAX_ATOMS:
        raise StructureError(
            f"The structure has {n:,} atoms; at most {MAX_ATOMS:,} are read.",
            "Cut long repeats to what matters for the step.",
            n,
        )
    return mol


def _explain(smiles: str) -> StructureError:
    """Return the refusal that says what is wrong with SMILES that RDKit would not take."""
    shown = make_visible(smiles)
    try:
        raw = Chem.MolFromSmiles(smiles, sanitize=False)
    except (ValueError, RuntimeError):
        raw = None
    if raw is None:
        hint = "Check brackets, ring closures and element symbols."
        if re.search(r"\[R\d*\]|^R\d*[^a-z]", smiles):
            hint = "Write an R-group as an attachment point, *."
        return StructureError(f"'{shown}' is not valid SMILES.", hint, shown)
    problems = Chem.DetectChemistryProblems(raw)
    if problems:
        what = problems[0].Message().rstrip(".").replace("#", "number ")
        return StructureError(
            f"'{shown}' is not a possible structure: {make_visible(what, 120)}.",
            "Check valences and charges.",
            shown,
        )
    return StructureError(f"'{shown}' could not be understood.", "Check the structure.", shown)


def parse_molblock(block: str) -> Chem.Mol:
    """Parse a molfile (V2000 or V3000) into a molecule; coordinates serve for wedges only.

    Raises:
        StructureError: when the block is no molfile or the structure is impossible.
    """
    if len(block) > 4_000_000:
        raise StructureError("The molfile is too large.", "Give one structure at a time.", None)
    with rdBase.BlockLogs():
        try:
            mol = Chem.MolFromMolBlock(block, sanitize=True, removeHs=True)
        except (ValueError, RuntimeError):
            mol = None
        if mol is None:
            try:
                raw = Chem.MolFromMolBlock(block, sanitize=False, removeHs=False)
            except (ValueError, RuntimeError):
                raw = None
            if raw is not None and raw.GetNumAtoms():
                for problem in Chem.DetectChemistryProblems(raw):
                    what = make_visible(problem.Message().rstrip("."), 120)
                    raise StructureError(
                        f"The molfile holds no possible structure: {what}.", "Check valences.", what
                    )
            raise StructureError("The text is no molfile that can be read.", "Export it again.", None)
    if mol.GetNumAtoms() == 0:
        raise StructureError("The molfile holds no atoms.", "Draw a structure first.", None)
    return _not_too_large(mol)


def canonical_smiles(text: str) -> str:
    """Return the canonical isomeric SMILES of a text, maps dropped, nothing else changed.

    Raises:
        StructureError: as `parse_molecule`.

    >>> canonical_smiles("[CH3:1][CH2:2]Br")
    'CCBr'
    """
    mol = parse_molecule(text)
    for atom in mol.GetAtoms():
        atom.SetAtomMapNum(0)
    return str(Chem.MolToSmiles(mol))


def standardise(text: str) -> Structure:
    """Return the standardised structure of SMILES or a molfile.

    Raises:
        StructureError: when it cannot be understood; the sentence says why.

    >>> standardise("CC[N+](=O)[O-]").smiles == standardise("CCN(=O)=O").smiles
    True
    """
    if "M  END" in text:
        mol = parse_molblock(text)
        entered = str(Chem.MolToSmiles(mol))
    else:
        entered = check_text(text)
        mol = parse_molecule(entered)
    with rdBase.BlockLogs():
        try:
            mol = _standardised(mol)
            smiles = str(Chem.MolToSmiles(mol))
            flat = _flat_smiles(mol)
        except (ValueError, RuntimeError) as problem:
            raise StructureError(
                f"'{make_visible(entered)}' could not be standardised.", "Check the structure.", entered[:80]
            ) from problem
    return Structure(
        smiles_as_entered=entered,
        smiles=smiles,
        identity_key=_digest(smiles),
        flat_key=_digest(flat),
        heavy_atoms=mol.GetNumHeavyAtoms(),
        notes=find_oddities(mol),
        mol=mol,
    )


def identity_key(text: str) -> str:
    """Return the identity key of SMILES; the module text says what it means."""
    return standardise(text).identity_key


@lru_cache(maxsize=1)
def _normaliser() -> Normalizer:
    from rdkit.Chem.MolStandardize import rdMolStandardize  # loaded by those who standardise

    return rdMolStandardize.Normalizer()


def _standardised(mol: Chem.Mol) -> Chem.Mol:
    """Return the steps of the module text, on a copy."""
    work = Chem.RemoveHs(mol, sanitize=False)
    work = _salts_as_ions(work)
    Chem.SanitizeMol(work)
    work = _normaliser().normalize(work)
    for atom in work.GetAtoms():
        atom.SetAtomMapNum(0)
    Chem.AssignStereochemistry(work, cleanIt=True, force=True)
    return work


def _salts_as_ions(mol: Chem.Mol) -> Chem.Mol:
    """Return a copy in which an alkali or alkaline-earth metal bonded to N, O, S or a halogen is an ion."""
    bonds = []
    for bond in mol.GetBonds():
        for metal, other in ((bond.GetBeginAtom(), bond.GetEndAtom()), (bond.GetEndAtom(), bond.GetBeginAtom())):
            if metal.GetAtomicNum() in _ALKALI and other.GetAtomicNum() in (7, 8, 9, 16, 17, 35, 53):
                bonds.append((metal.GetIdx(), other.GetIdx()))
    if not bonds:
        return Chem.Mol(mol)
    work = Chem.RWMol(mol)
    for first, second in bonds:
        work.RemoveBond(first, second)
        for index, step in ((first, 1), (second, -1)):
            end = work.GetAtomWithIdx(index)
            end.SetFormalCharge(end.GetFormalCharge() + step)
            end.SetNoImplicit(True)
    return work.GetMol()


def _flat_smiles(mol: Chem.Mol) -> str:
    """Return the SMILES behind `flat_key`: organic parts, uncharged, no stereo, no isotopes."""
    from rdkit.Chem.MolStandardize import rdMolStandardize

    parts = set()
    pieces = Chem.GetMolFrags(mol, asMols=True, sanitizeFrags=False)
    organic = [p for p in pieces if any(a.GetAtomicNum() == 6 for a in p.GetAtoms())] or list(pieces)
    largest = max(p.GetNumHeavyAtoms() for p in organic)
    for piece in organic:
        if len(organic) > 1 and piece.GetNumHeavyAtoms() < min(largest, 8):
            continue
        Chem.SanitizeMol(piece)
        neutral = rdMolStandardize.Uncharger().uncharge(piece)
        for atom in neutral.GetAtoms():
            atom.SetIsotope(0)
        Chem.RemoveStereochemistry(neutral)
        parts.add(str(Chem.MolToSmiles(Chem.RemoveHs(neutral))))
    return ".".join(sorted(parts))


def _digest(smiles: str) -> str:
    return hashlib.sha256(smiles.encode()).hexdigest()[:32]


def find_oddities(mol: Chem.Mol) -> tuple[str, ...]:
    """Return what a reader should know about unusual atoms, in plain words; empty for ordinary structures."""
    notes = []
    if any(a.GetNumRadicalElectrons() and a.GetAtomicNum() in (1, 6, 7, 8, 9, 15, 16, 17) for a in mol.GetAtoms()):
        notes.append("holds an unpaired electron")
    if any(a.GetIsotope() and a.GetAtomicNum() for a in mol.GetAtoms()):
        notes.append("isotopically labelled")
    if any(a.GetAtomicNum() == 0 for a in mol.GetAtoms()):
        notes.append("holds an attachment point or R-group")
    if any(_is_metal(a.GetAtomicNum()) for a in mol.GetAtoms()):
        notes.append("holds a metal")
    return tuple(notes)


def _is_metal(number: int) -> bool:
    non_metals = {0, 1, 2, 5, 6, 7, 8, 9, 10, 14, 15, 16, 17, 18, 32, 33, 34, 35, 36, 51, 52, 53, 54, 85, 86}
    return number not in non_metals
