"""Whether what is meant to happen outruns what a rule warns of: halide from alcohol and HX, a ring, an addition.

It owns the ways (`WAYS` of `liability_rule`) that a rule's `yields_to` may name. An alkene is no worry where
a hydrogen halide is meant to give the halide: halide and alkene are in balance there and the halide is what is
isolated. Nor is it where a hydroxyl or amine of the same molecule closes a ring of three, five or six atoms: that
is faster than loss of HX. Nor is it where an amine or thiol adds to the acceptor that elimination leaves, since
that is the stated product; a drawn centre is another matter. It weighs no conditions beyond these.

Source: Whitmore, Organic Chemistry, 2nd ed., 1951 (halides from alcohols and HX) and Winstein and Lucas, J. Am.
Chem. Soc. 1939, 61, 1576 (halohydrins), both from memory.
"""

from __future__ import annotations

from collections.abc import Sequence

from rdkit import Chem

from kb.assess.liability_fragments import Fragment, find_entered
from kb.assess.liability_rule import Rule, compile_motif
from kb.assess.liability_structure import Where, holds
from kb.chem.facts import Centre, Reading
from kb.materials.profile import ConditionProfile
from kb.vocabulary import Fate

FAST_RINGS = (3, 5, 6)
"""Sizes of rings that close faster than the base takes a hydrogen: a judgement; four is slow."""

_HALIDE = "[CX4]-[Cl,Br,I]"
_CLOSERS = "[$([OX2H1]-[CX4]),$([OX1-]-[CX4]),$([NX3;H1,H2;!$(N-C=[O,S,N]);!$(N-S(=O)=O)])]"


def is_outrun(
    rule: Rule,
    reading: Reading,
    profile: ConditionProfile,
    product: Chem.Mol | None,
    flask: Sequence[Fragment],
) -> bool:
    """Return True where a way that the rule yields to is the stated way, or without a product the likely one.

    Args:
        rule: its `yields_to`.
        reading: without a centre nothing is known to be meant.
        profile: is there a hydrogen halide.
        product: as stated; None = none.
        flask: fragments as searched.
    """
    centre = reading.centre
    if centre is None or reading.fate not in (None, Fate.SUBSTITUTION):
        return False
    fragment = next((f for f in flask if f.component == centre.component), None)
    if fragment is None:
        return False
    if "halide" in rule.yields_to and _gives_halide(fragment.mol, centre, profile, product):
        return True
    if "conjugate-addition" in rule.yields_to and _adds_again(centre, reading):
        return True
    return "ring-closure" in rule.yields_to and _closes_ring(fragment.mol, centre, reading, product)


def _gives_halide(mol: Chem.Mol, centre: Centre, profile: ConditionProfile, product: Chem.Mol | None) -> bool:
    if "hydrogen_halide" not in profile.reagent_classes:
        return False
    leaving = None if centre.leaving_atom is None else find_entered(mol, centre.leaving_atom)
    if leaving is None or mol.GetAtomWithIdx(leaving).GetAtomicNum() != 8:
        return False
    if product is None:
        return (profile.nucleophile_class or "").startswith("hydrogen_")
    halide, _ = compile_motif(_HALIDE)
    return len(product.GetSubstructMatches(halide)) > len(mol.GetSubstructMatches(halide))


def _adds_again(centre: Centre, reading: Reading) -> bool:
    if reading.nucleophile is None or reading.fate is not Fate.SUBSTITUTION or centre.is_stereocentre:
        return False
    return any(word in reading.nucleophile.nucleophile_class for word in ("amine", "thiol"))


def _closes_ring(mol: Chem.Mol, centre: Centre, reading: Reading, product: Chem.Mol | None) -> bool:
    at = find_entered(mol, centre.atom)
    if at is None:
        return False
    if product is not None or reading.nucleophile is not None:
        attacker = reading.nucleophile
        if attacker is None or attacker.component != centre.component:
            return False
        index = find_entered(mol, attacker.atom)
        return index is not None and _is_fast(mol, at, index)
    closers, _ = compile_motif(_CLOSERS)
    return any(_is_fast(mol, at, atoms[0]) for atoms in mol.GetSubstructMatches(closers))


def _is_fast(mol: Chem.Mol, centre: int, attacker: int) -> bool:
    """Return True for a ring of FAST_RINGS; not for an epoxide whose ends are drawn cis on a ring."""
    path = Chem.GetShortestPath(mol, centre, attacker)
    if len(path) == 3 and holds(Where(atom_map=1, word="cis", other_map=2), mol, {1: centre, 2: path[1]}, None):
        return False
    return len(path) in FAST_RINGS
