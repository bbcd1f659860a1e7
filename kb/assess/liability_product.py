"""What a liability turns the substrate into: a rule's transformation run on one instance of its motif.

It owns the run and the tidying of its result: explicit hydrogen counts are cleared first (a written
stereocentre fixes them and breaks valence on elimination), and every carbon whose neighbours changed
claims no configuration afterwards. What cannot be made into a sound structure is left out, not guessed.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache

from rdkit import Chem, rdBase
from rdkit.Chem import rdChemReactions

from kb.assess.liability_rule import Match, Rule
from kb.assess.liability_structure import LARGEST_BREDT_SUM, bridging_sum

RACEMISED = "racemised"
"""Stands for a transformation that only blurs the configuration of atom 1."""

RACEMISED_PRODUCT = "racemised product"
"""Stands for the intended product with the configuration blurred at what was atom 1."""

_CENTRE = "_centre"

MAX_OUTCOMES = 200
"""Most outcomes of one transformation that are looked at."""


def side_products(rule: Rule, match: Match, mol: Chem.Mol, partners: Sequence[Chem.Mol] = ()) -> tuple[str, ...]:
    """Return canonical SMILES of what one instance gives.

    Several regioisomers come the most substituted alkene first, then in SMILES order: no ranking is meant.

    Args:
        rule: its transformation; none gives an empty answer.
        match: which instance.
        mol: the fragment as searched.
        partners: candidates for the second reactant, first fitting one used.

    Returns:
        Distinct SMILES; empty where the rule states no transformation or no partner is known.
    """
    template = rule.product_of(match)
    if template is None or template == RACEMISED_PRODUCT:
        return ()
    ready = clean(mol)
    if template == RACEMISED:
        ready.GetAtomWithIdx(match.by_map[1]).SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
        Chem.AssignStereochemistry(ready, cleanIt=True, force=True)
        return (Chem.MolToSmiles(ready),)
    reaction = _compile(template)
    reactants = [ready]
    for index in range(1, reaction.GetNumReactantTemplates()):
        query = reaction.GetReactantTemplate(index)
        other = ready if rule.partner_from == "itself" else None
        other = other or next((p for p in partners if p.HasSubstructMatch(query)), None)
        if other is None:
            return ()
        reactants.append(clean(other))
    with rdBase.BlockLogs():
        outcomes = reaction.RunReactants(tuple(reactants), maxProducts=MAX_OUTCOMES)
    found: dict[str, int] = {}  # SMILES to rank
    for outcome in outcomes:
        if all(_belongs(part, match) for part in outcome):
            smiles = _tidy(outcome, reactants)
            if smiles is not None:
                found.setdefault(smiles[0], smiles[1])
    return tuple(sorted(found, key=lambda s: (found[s], s)))


def racemised_product(match: Match, mol: Chem.Mol, product: Chem.Mol | None) -> str | None:
    """Return the intended product without configuration at the atom that was the centre, None where it is not found.

    What is left of the substrate without its leaving group is looked for in the product, configuration aside.
    """
    if product is None:
        return None
    whole = clean(mol)
    whole.GetAtomWithIdx(match.by_map[1]).SetIntProp(_CENTRE, 1)
    bond = whole.GetBondBetweenAtoms(match.by_map[1], match.by_map[3])
    cut = Chem.FragmentOnBonds(whole, [bond.GetIdx()], addDummies=False)
    with rdBase.BlockLogs():
        parts = Chem.GetMolFrags(cut, asMols=True, sanitizeFrags=False)
    rest = next(p for p in parts if any(a.HasProp(_CENTRE) for a in p.GetAtoms()))
    place = next(a.GetIdx() for a in rest.GetAtoms() if a.HasProp(_CENTRE))
    for atom in rest.GetAtoms():
        atom.SetNoImplicit(False)
    for part in Chem.GetMolFrags(product, asMols=True):
        hits = [atoms[place] for atoms in part.GetSubstructMatches(rest, useChirality=False, uniquify=False)]
        if hits:
            drawn = [i for i in hits if part.GetAtomWithIdx(i).GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED]
            blurred = Chem.Mol(part)
            blurred.GetAtomWithIdx((drawn or hits)[0]).SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
            Chem.AssignStereochemistry(blurred, cleanIt=True, force=True)
            return Chem.MolToSmiles(blurred)
    return None


def clean(mol: Chem.Mol) -> Chem.Mol:
    """Return a copy without atom maps, explicit hydrogen counts cleared where they are ordinary."""
    copy = Chem.Mol(mol)
    for atom in copy.GetAtoms():
        atom.SetAtomMapNum(0)
        ordinary = atom.GetAtomicNum() in (6, 7, 8, 16) and not atom.GetNumRadicalElectrons()
        if ordinary and atom.GetFormalCharge() == 0 and not atom.GetIsAromatic():
            atom.SetNoImplicit(False)
            atom.SetNumExplicitHs(0)
    with rdBase.BlockLogs():
        Chem.SanitizeMol(copy, catchErrors=True)
    return copy


@lru_cache(maxsize=512)
def _compile(template: str) -> rdChemReactions.ChemicalReaction:
    with rdBase.BlockLogs():
        reaction = rdChemReactions.ReactionFromSmarts(template)
        reaction.Initialize()
    return reaction


def _belongs(part: Chem.Mol, match: Match) -> bool:
    """Return False where an outcome came from another instance of the motif than this one."""
    came_from: dict[int, int] = {}
    for atom in part.GetAtoms():
        if not atom.HasProp("old_mapno") or not atom.HasProp("react_atom_idx"):
            continue
        number = atom.GetIntProp("old_mapno")
        from_substrate = not atom.HasProp("react_idx") or atom.GetIntProp("react_idx") == 0
        if number in (1, 3) and from_substrate:
            came_from[number] = atom.GetIntProp("react_atom_idx")
    return any(all(way.get(n, a) == a for n, a in came_from.items()) for way in match.ways)


def _tidy(outcome: Sequence[Chem.Mol], reactants: Sequence[Chem.Mol]) -> tuple[str, int] | None:
    """Return canonical SMILES and a rank (hydrogens on alkene carbons), None for an unsound structure."""
    whole = outcome[0]
    for part in outcome[1:]:
        whole = Chem.CombineMols(whole, part)
    for atom in whole.GetAtoms():
        if atom.HasProp("old_mapno") and _has_changed(atom, reactants):
            atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
        is_plain = atom.GetAtomicNum() != 0 and atom.GetFormalCharge() == 0
        is_azole = atom.GetIsAromatic() and atom.GetAtomicNum() == 7
        if atom.HasProp("old_mapno") and is_plain and not is_azole:
            atom.SetNoImplicit(False)
    with rdBase.BlockLogs():
        if Chem.SanitizeMol(whole, catchErrors=True) != Chem.SanitizeFlags.SANITIZE_NONE:
            return None
        Chem.AssignStereochemistry(whole, cleanIt=True, force=True)
        smiles = Chem.MolToSmiles(whole)
    back = Chem.MolFromSmiles(smiles)
    if back is None or _breaks_bredt(back):
        return None
    rank = sum(
        a.GetTotalNumHs()
        for a in back.GetAtoms()
        if a.GetAtomicNum() == 6 and not a.GetIsAromatic() and a.GetHybridization() == Chem.HybridizationType.SP2
    )
    return Chem.MolToSmiles(back), rank


def _breaks_bredt(mol: Chem.Mol) -> bool:
    """Return True where a double bond would sit at a bridgehead."""
    doubles = (b for b in mol.GetBonds() if b.GetBondType() == Chem.BondType.DOUBLE and b.IsInRing())
    ends = {i for b in doubles for i in (b.GetBeginAtomIdx(), b.GetEndAtomIdx())}
    return any((bridging_sum(mol, i) or LARGEST_BREDT_SUM + 1) <= LARGEST_BREDT_SUM for i in ends)


def _has_changed(atom: Chem.Atom, reactants: Sequence[Chem.Mol]) -> bool:
    """Return True where a template atom has other neighbours than it had."""
    if not atom.HasProp("react_atom_idx"):
        return True
    source = reactants[atom.GetIntProp("react_idx") if atom.HasProp("react_idx") else 0]
    before = source.GetAtomWithIdx(atom.GetIntProp("react_atom_idx"))
    old = sorted(n.GetIdx() for n in before.GetNeighbors())
    new = sorted(n.GetIntProp("react_atom_idx") if _from_same(atom, n) else -1 for n in atom.GetNeighbors())
    return old != new or before.GetTotalDegree() != atom.GetTotalDegree()


def _from_same(atom: Chem.Atom, neighbour: Chem.Atom) -> bool:
    """Return True where both atoms came out of one reactant."""
    mine = atom.GetIntProp("react_idx") if atom.HasProp("react_idx") else 0
    other = neighbour.GetIntProp("react_idx") if neighbour.HasProp("react_idx") else mine
    return bool(neighbour.HasProp("react_atom_idx")) and mine == other
