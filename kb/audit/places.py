"""Where a failure happened, generalised: the group that was hit, the kind of centre, the partner or the medium.

It owns the words and SMARTS of places and which aspect of a run a failure mode is about: an over-alkylation is about
the nucleophile, a lost group about the group, an elimination about the centre. Two failures stand at the same place
when their keys are equal. Groups are told by their own pattern, most particular first, so that a tert-butyl ester is
not called an ether. Nothing here looks at conditions.

The table of groups and the choice of aspect are common practice; the precedence of flags is a judgement.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from functools import cache
from typing import Any

from kb.audit.failing import NOT_CHEMISTRY
from kb.record.failure_modes import modes_that_lose_a_group
from kb.vocabulary import CarbonClass, CentreFlag, LeavingGroup

_TERTIARY = "[CX4;H0]([#6])([#6])[#6]"
GROUPS: tuple[tuple[str, str], ...] = (
    ("tertiary alkyl carbamate", f"[#7]C(=O)O{_TERTIARY}"),
    ("tertiary alkyl carbonate", f"[OX2]C(=O)O{_TERTIARY}"),
    ("tertiary alkyl ester", f"[#6]C(=O)O{_TERTIARY}"),
    ("benzyl carbamate", "[#7]C(=O)O[CH2]c"),
    ("fluorenylmethyl carbamate", "[#7]C(=O)O[CH2][CH]1c2ccccc2-c2ccccc12"),
    ("silyl ether", "[#6][OX2][Si]"),
    ("cyclic ketal or acetal", "[CX4;R]1([#6,#1])[OX2;R][#6;R]~[#6;R][OX2;R]1"),
    ("acetal or ketal", "[CX4]([OX2;H0][#6])[OX2;H0][#6]"),
    ("trityl ether", "[#6][OX2]C(c)(c)c"),
    ("tertiary alkyl ether", f"[CX4;!$([CX4]([OX2])[OX2])][OX2]{_TERTIARY}"),
    ("epoxide", "[CX4]1[OX2][CX4]1"),
    ("aziridine", "[CX4]1[NX3][CX4]1"),
    ("anhydride", "C(=O)OC(=O)"),
    ("acyl halide", "[CX3](=O)[F,Cl,Br,I]"),
    ("lactone", "[CX3;R](=O)[OX2;R]"),
    ("carbonate", "[OX2][CX3](=O)[OX2]"),
    ("carbamate", "[NX3][CX3](=O)[OX2]"),
    ("ester", "[#6][CX3](=O)[OX2;H0][#6]"),
    ("sulfonate", "[#6][OX2]S(=O)=O"),
    ("aryl ether", "c[OX2][CX4]"),
    ("amide", "[CX3](=O)[NX3]"),
    ("nitrile", "[CX2]#[NX1]"),
    ("nitro group", "[NX3+](=O)[O-]"),
    ("carboxylic acid", "[CX3](=O)[OX2H]"),
    ("aldehyde", "[CX3;H1]=O"),
    ("ketone", "[#6][CX3](=O)[#6]"),
    ("thiol", "[SX2;H1]"),
    ("phenol", "c[OX2H]"),
    ("hydroxyl", "[CX4][OX2H]"),
    ("amine", "[NX3;!$(NC=O);!$(NS(=O)=O)][CX4]"),
    ("ether", "[CX4][OX2][CX4]"),
    ("alkyne", "[CX2]#[CX2]"),
    ("activated aryl halide", "[F,Cl,Br]c:[nX2]"),
    ("aryl halide", "c[F,Cl,Br,I]"),
    ("alkyl halide", "[CX4][F,Cl,Br,I]"),
    ("alkene", "[CX3]=[CX3]"),
)
"""Groups that can be lost or can attack: word and SMARTS, most particular first."""

_FLAGS = (
    CentreFlag.ALPHA_CARBONYL,
    CentreFlag.ALLYLIC,
    CentreFlag.PROPARGYLIC,
    CentreFlag.BENZYLIC,
    CentreFlag.NEOPENTYL,
    CentreFlag.BETA_BRANCHED,
    CentreFlag.HOMOBENZYLIC,
)
"""Flags that tell kinds of centre apart, most telling first."""

FAMILIES: dict[str, tuple[str, str]] = {
    "halide or sulfonate": ("a halide or sulfonate", "[$([F,Cl,Br,I]),$([OX2]S(=O)=O)]"),
    "hydroxyl": ("an alcohol", "[OX2H]"),
    "epoxide": ("an epoxide", ""),
    "onium": ("an onium group", "[$([NX4+]),$([SX3+]),$([NX2+])]"),
    "ester or ether": ("an ester or ether", "[OX2;H0]"),
    "other": ("another leaving group", "[!#6;!#1]"),
}
"""Families of leaving groups: words, and SMARTS of the leaving atom."""

_FAMILY: dict[LeavingGroup, str] = {
    **dict.fromkeys(
        (
            LeavingGroup.FLUORIDE,
            LeavingGroup.CHLORIDE,
            LeavingGroup.BROMIDE,
            LeavingGroup.IODIDE,
            LeavingGroup.MESYLATE,
            LeavingGroup.TOSYLATE,
            LeavingGroup.TRIFLATE,
            LeavingGroup.SULFONATE,
            LeavingGroup.SULFATE,
        ),
        "halide or sulfonate",
    ),
    LeavingGroup.HYDROXYL: "hydroxyl",
    LeavingGroup.EPOXIDE: "epoxide",
    **dict.fromkeys((LeavingGroup.AMMONIUM, LeavingGroup.SULFONIUM, LeavingGroup.DIAZONIUM), "onium"),
    **dict.fromkeys((LeavingGroup.CARBOXYLATE, LeavingGroup.ALKOXIDE, LeavingGroup.PHOSPHATE), "ester or ether"),
}

_CENTRES: dict[str, str] = {
    "methyl": "[CX4;H3]{lg}",
    "primary": "[CX4;H2;$([CX4]([#6])*)]{lg}",
    "secondary": "[CX4;H1;$([CX4]([#6])[#6])]{lg}",
    "tertiary": "[CX4;H0;$([CX4]([#6])([#6])[#6])]{lg}",
    "bridgehead": "[CX4;R;H0]{lg}",
    "any": "[CX4]{lg}",
}
_BESIDE: dict[CentreFlag, str] = {
    CentreFlag.ALPHA_CARBONYL: "[CX3;$(C=O)]",
    CentreFlag.ALLYLIC: "[CX3;$(C=C)]",
    CentreFlag.PROPARGYLIC: "[CX2]",
    CentreFlag.BENZYLIC: "[c]",
    CentreFlag.NEOPENTYL: "[CX4;H0;$(C([#6])([#6])([#6])[#6])]",
    CentreFlag.BETA_BRANCHED: "[CX4;H1;$(C([#6])([#6])[#6])]",
    CentreFlag.HOMOBENZYLIC: "[CX4;$(Cc)]",
}


_IONISING = frozenset({"transposition", "solvolysis", "racemisation"})
"""Modes that go through a cation or an ion pair, where activation tells more than the count of carbon neighbours."""
_ACTIVATION = (CentreFlag.ALLYLIC, CentreFlag.PROPARGYLIC, CentreFlag.BENZYLIC)


class Aspect(StrEnum):
    """Which part of a run a failure mode is about."""

    GROUP = "group"
    CENTRE = "centre"
    PARTNER = "partner"
    MEDIUM = "medium"
    HAND = "hand"


def aspect_of(mode: str) -> Aspect:
    """Return what a failure mode is about; a mode of a later program is taken to be about the centre."""
    if mode in NOT_CHEMISTRY:
        return Aspect.HAND
    if mode in modes_that_lose_a_group():
        return Aspect.GROUP
    return {"over-reaction": Aspect.PARTNER, "solvent-attack": Aspect.MEDIUM}.get(mode, Aspect.CENTRE)


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """Where a failure happened, generalised.

    Attributes:
        aspect: what it is told by.
        key: equal for two failures at the same kind of place.
        words: for a heading ("secondary carbon bearing a halide or sulfonate").
        smarts: of the place in the substrate; "" = any substrate.
    """

    aspect: Aspect
    key: tuple[str, ...]
    words: str
    smarts: str = ""


@cache
def group_query(word: str) -> Any:
    """Return the RDKit query of a group of GROUPS."""
    from rdkit import Chem

    return Chem.MolFromSmarts(dict(GROUPS)[word])


def groups_in(mol: Any, within: frozenset[int] | None = None) -> list[tuple[str, frozenset[int]]]:
    """Return the groups of a molecule with their atoms, most particular first; an atom set is told once.

    Args:
        mol: RDKit molecule.
        within: only groups that lie in these atoms by half or more; None = all.
    """
    found: list[tuple[str, frozenset[int]]] = []
    for word, _ in GROUPS:
        for match in mol.GetSubstructMatches(group_query(word), maxMatches=32):
            atoms = frozenset(match)
            hetero = frozenset(a for a in atoms if mol.GetAtomWithIdx(a).GetAtomicNum() != 6) or atoms
            if any(hetero <= others for _, others in found):
                continue
            if within is None or (2 * len(atoms & within) >= len(atoms) and hetero & within):
                found.append((word, atoms))
    return found


def group_place(word: str) -> Place:
    """Return the place of a group of GROUPS."""
    return Place(aspect=Aspect.GROUP, key=("group", word), words=word, smarts=dict(GROUPS)[word])


def family_of(leaving_group: str | None) -> str:
    """Return the family of a leaving group word; "none" where nothing leaves."""
    if leaving_group is None:
        return "none"
    known = leaving_group in set(map(str, LeavingGroup))
    return _FAMILY.get(LeavingGroup(leaving_group), "other") if known else "other"


def centre_place(mode: str, carbon_class: str | None, flags: frozenset[str], leaving_group: str | None) -> Place | None:
    """Return the place of a reacting carbon for a failure mode; None where no carbon was read."""
    if carbon_class is None:
        return None
    family = family_of(leaving_group)
    if family == "epoxide":
        return Place(aspect=Aspect.CENTRE, key=("centre", "epoxide"), words="epoxide", smarts=dict(GROUPS)["epoxide"])
    if carbon_class == CarbonClass.VINYL and family == "none":
        return Place(aspect=Aspect.CENTRE, key=("centre", "alkene"), words="alkene", smarts="[CX3]=[CX3]")
    flag = next((f for f in _FLAGS if str(f) in flags), None)
    if carbon_class == CarbonClass.TERTIARY and flag is not CentreFlag.ALPHA_CARBONYL:
        flag = None  # a tertiary centre ionises and eliminates with or without help from beside it
    if mode in _IONISING and flag in _ACTIVATION:
        carbon_class = "any"
    key = ("centre", carbon_class, str(flag or ""), family)
    return Place(
        aspect=Aspect.CENTRE, key=key, words=_centre_words(key), smarts=_centre_smarts(carbon_class, flag, family)
    )


def centre_from_structure(mode: str, mol: Any, within: frozenset[int]) -> Place | None:
    """Return the place of the first sp3 carbon with a leaving atom, where a scheme's centre was not read; else None."""
    for atom in sorted(within):
        carbon = mol.GetAtomWithIdx(atom)
        if carbon.GetAtomicNum() != 6 or str(carbon.GetHybridization()) != "SP3":
            continue
        for other in carbon.GetNeighbors():
            leaving = _leaving_word(other)
            if leaving is None:
                continue
            carbons = sum(n.GetAtomicNum() == 6 for n in carbon.GetNeighbors())
            carbon_class = ("methyl", "primary", "secondary", "tertiary", "tertiary")[carbons]
            return centre_place(mode, carbon_class, frozenset(), leaving)
    return None


def _leaving_word(atom: Any) -> str | None:
    if atom.GetAtomicNum() in (9, 17, 35, 53):
        return {9: "fluoride", 17: "chloride", 35: "bromide", 53: "iodide"}[atom.GetAtomicNum()]
    if atom.GetAtomicNum() != 8:
        return None
    if atom.GetTotalNumHs():
        return "hydroxyl"
    return "sulfonate" if any(n.GetAtomicNum() == 16 for n in atom.GetNeighbors()) else None


def _centre_words(key: tuple[str, ...]) -> str:
    _, carbon_class, flag, family = key
    kind = " ".join(word for word in (flag, "" if carbon_class == "any" else carbon_class) if word)
    return f"{kind} carbon bearing {FAMILIES[family][0]}" if family in FAMILIES else f"{kind} carbon"


def _centre_smarts(carbon_class: str, flag: CentreFlag | None, family: str) -> str:
    leaving = FAMILIES[family][1] if family in FAMILIES else ""
    pattern = _CENTRES.get(carbon_class, "[#6]{lg}").format(lg=leaving)
    return _BESIDE[flag] + pattern if flag is not None else pattern
