"""A liability rule: a motif, the conditions that damage it, what happens, and what others do instead.

It owns the rule as a value and the finding of its motif in a molecule. Rules come from the project's own
tables (`rulefile`) and from a group's house rules; both are this class. It makes no findings.

Atom maps in a motif: 1 is the reacting atom, 3 the leaving group. Matches that share the mapped atoms 1
and 3 are one instance of the motif.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

from kb.assess.predicate import Predicate
from kb.errors import QueryError
from kb.materials.profile import ConditionProfile
from kb.vocabulary import Fate, Severity

if TYPE_CHECKING:
    from rdkit import Chem

    from kb.assess.liability_structure import Where

SIDES = ("centre", "nucleophile", "bystander", "anywhere", "mixture")
"""Where the motif must lie: at the reading's centre, at its nucleophile, elsewhere than at the centre, anywhere
at all, or nowhere (no motif)."""

WAYS = ("halide", "ring-closure", "conjugate-addition")
"""What a rule can yield to (`liability_outrun`): an alcohol and a hydrogen halide to the halide; a
neighbouring hydroxyl or amine that closes a ring; an amine or thiol that adds to what elimination leaves."""

MAX_MATCHES = 400
"""Most matches that are looked at in one molecule."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Match:
    """One instance of a motif.

    Attributes:
        atoms: atom indices, in the order of the motif.
        by_map: map number to atom index.
        core: atoms mapped 1 and 3, or all atoms where the motif has neither.
        motif: which of the rule's motifs.
        ways: every way the maps fit on these same atoms, `by_map` first (either carbon of an epoxide).
    """

    atoms: tuple[int, ...]
    by_map: Mapping[int, int]
    core: frozenset[int]
    motif: int = 0
    ways: tuple[Mapping[int, int], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Rule:
    """One liability.

    Attributes:
        rule_id: stable id, lower case with hyphens.
        title: one line.
        when: the condition line, parsed.
        severity: before evidence.
        mechanism: plain words.
        motifs: SMARTS, any of them; empty for a rule on the mixture alone.
        products: reaction SMARTS per motif (or one for all), or `racemised` (the substrate) or `racemised product`
            (the stated product); empty = no one structure.
        side: one of SIDES.
        group: rules of one group on one place are told together.
        where: structural conditions on mapped atoms.
        at: map numbers, one of which must be the reading's centre (or nucleophile).
        partner: SMARTS of a second reactant; None = none needed.
        partner_from: `scheme` = it must be drawn or named, else the rule is silent; `flask` = the condition
            line already says it is there; `itself` = a second molecule of the substrate.
        gives: the fate that follows; where that is what is intended, the rule has nothing to warn of.
        yields_to: ways to react (WAYS) that outrun the rule where they are what is intended.
        also_caution: cautions that say the same; where one of them is told as strongly, the finding is not.
        do_instead: most useful first.
        source, source_basis: where it comes from, and whether that was read or is from memory.
        note: anything a reader of the table should know.
    """

    rule_id: str
    title: str
    when: Predicate
    severity: Severity
    mechanism: str
    motifs: tuple[str, ...] = ()
    products: tuple[str, ...] = ()
    side: str = "bystander"
    group: str = ""
    where: tuple[Where, ...] = ()
    at: tuple[int, ...] = (1,)
    partner: str | None = None
    partner_from: str = "scheme"
    gives: Fate | None = None
    yields_to: tuple[str, ...] = ()
    also_caution: tuple[str, ...] = ()
    do_instead: tuple[str, ...] = ()
    source: str = ""
    source_basis: str = ""
    note: str = ""

    def applies(self, profile: ConditionProfile) -> bool | None:
        """Return whether the conditions are those of the rule: True, False, or None = cannot tell."""
        return self.when.evaluate(profile)

    def find_motif(self, mol: Chem.Mol) -> tuple[tuple[int, ...], ...]:
        """Return the atom indices of each instance of the motif; empty where it is absent.

        Conditions are not looked at: a motif is there or not, whatever it meets.
        """
        return tuple(match.atoms for match in self.matches(mol))

    def matches(self, mol: Chem.Mol, profile: ConditionProfile | None = None) -> tuple[Match, ...]:
        """Return each instance of the motif once.

        Args:
            mol: sanitised.
            profile: needed by structural conditions that ask what is in the flask; None = taken as met.
        """
        from kb.assess.liability_structure import holds

        found: dict[frozenset[int], tuple[tuple[int, ...], int, list[dict[int, int]]]] = {}
        cores: dict[frozenset[int], frozenset[int]] = {}
        for number, smarts in enumerate(self.motifs):
            pattern, maps = compile_motif(smarts)
            for atoms in mol.GetSubstructMatches(pattern, uniquify=not maps, maxMatches=MAX_MATCHES):
                by_map = {m: atoms[i] for m, i in maps.items()}
                core, whole = _core(by_map, atoms), frozenset(atoms)
                if not all(holds(w, mol, by_map, profile) for w in self.where):
                    continue
                if whole in found:
                    found[whole][2].append(by_map)
                elif core not in cores:
                    cores[core] = whole
                    found[whole] = (atoms, number, [by_map])
        return tuple(
            Match(atoms=a, by_map=ways[0], core=_core(ways[0], a), motif=n, ways=tuple(ways))
            for a, n, ways in found.values()
        )

    def product_of(self, match: Match) -> str | None:
        """Return the transformation for an instance, None where the rule states none."""
        if not self.products:
            return None
        return self.products[match.motif if len(self.products) > 1 else 0]

    def cited(self) -> str:
        """Return the source with its basis, as shown: "Clayden et al., 2012 (memory)"."""
        if not self.source_basis or self.source_basis in self.source:
            return self.source
        return f"{self.source} ({self.source_basis})" if self.source else self.source_basis


def _core(by_map: Mapping[int, int], atoms: tuple[int, ...]) -> frozenset[int]:
    return frozenset(by_map[m] for m in (1, 3) if m in by_map) or frozenset(atoms)


@lru_cache(maxsize=2048)
def compile_motif(smarts: str) -> tuple[Chem.Mol, dict[int, int]]:
    """Compile a motif once.

    Returns:
        The query, and map number to its atom's place in the query.

    Raises:
        QueryError: where the SMARTS cannot be read.
    """
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        pattern = Chem.MolFromSmarts(smarts)
    if pattern is None or pattern.GetNumAtoms() == 0:
        raise QueryError(f"The motif '{smarts[:60]}' is no SMARTS.", "Check brackets and ring closures.", smarts)
    maps = {a.GetAtomMapNum(): a.GetIdx() for a in pattern.GetAtoms() if a.GetAtomMapNum()}
    return pattern, maps
