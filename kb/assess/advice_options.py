"""The single changes that a group could make to a plan with what it has used before.

It owns which temperatures, solvents, bases and leaving groups are offered, and the plan as each would change it. Only
what stands in the book's own runs, with a like nucleophile, is offered: a solvent that nobody here has used is no help.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kb.assess.distinct import distinct
from kb.assess.record_view import RecordView
from kb.assess.table import code_of
from kb.chem.facts import Reading
from kb.materials.profile import ConditionProfile
from kb.quantity import Temperature
from kb.record.component import Component
from kb.record.conditions import Conditions
from kb.record.plan import Plan
from kb.vocabulary import LeavingGroup, Role

STEP_K = 10.0
"""Temperatures are told apart by bands of this width, so that 58 and 62 degC pair up."""
NEAREST_K, FARTHEST_K = 15.0, 60.0
"""How far a temperature on offer may be from the plan's."""
MOST_PER_KIND = 4
_SWAPPED: dict[LeavingGroup, str] = {
    LeavingGroup.CHLORIDE: "Cl",
    LeavingGroup.BROMIDE: "Br",
    LeavingGroup.IODIDE: "I",
    LeavingGroup.MESYLATE: "OS(C)(=O)=O",
    LeavingGroup.TOSYLATE: "OS(=O)(=O)c1ccc(C)cc1",
}
"""Leaving groups that are made from one another in a step, and their SMILES."""

Worder = Callable[[ConditionProfile], str | None]


@dataclass(frozen=True, slots=True, kw_only=True)
class Option:
    """One change.

    Attributes:
        kind: "temperature", "solvent", "base" or "leaving group".
        word, here: what it would be, and what it is in the plan.
        plan: with the change made.
        rows: runs that stand there, most similar to the plan first.
        leaving_group: after the change; None = as it is.
    """

    kind: str
    word: str
    here: str
    plan: Plan
    rows: tuple[int, ...]
    leaving_group: LeavingGroup | None = None


def band(temperature_c: float | None) -> str | None:
    """Name a temperature by its band."""
    return None if temperature_c is None else f"about {STEP_K * round(temperature_c / STEP_K):.0f} °C"


def word_of(kind: str) -> Worder:
    """Return what gives a profile's word for a kind of condition; None where it is not known."""

    def temperature(profile: ConditionProfile) -> str | None:
        return band(profile.temperature_c)

    def solvent(profile: ConditionProfile) -> str | None:
        return " + ".join(sorted(profile.solvents)) or None

    def base(profile: ConditionProfile) -> str | None:
        if profile.base_name is None:
            return None if profile.has_unknown_reagent else "no base"
        return profile.base_name

    return {"temperature": temperature, "solvent": solvent, "base": base}[kind]


def words_of_rows(view: RecordView, kind: str, rows: NDArray[np.intp]) -> list[str | None]:
    """Return the word of each of some rows, worked out once per distinct profile."""
    word = word_of(kind)
    codes = view.table.profile[rows]
    by_code = {int(code): word(view.profile_of_code(int(code))) for code in distinct(codes)}
    return [by_code[int(code)] for code in codes]


def list_options(plan: Plan, profile: ConditionProfile, view: RecordView, near: NDArray[np.intp]) -> list[Option]:
    """Return the changes of conditions that the nearest runs suggest, most used first within a kind.

    Args:
        plan, profile: as planned.
        view: the runs.
        near: rows with a like nucleophile, most similar first.
    """
    options: list[Option] = []
    for kind in ("temperature", "solvent", "base"):
        here = word_of(kind)(profile)
        if here is None or (kind == "base" and _is_base_drawn(plan, profile)):
            continue
        rows_of: dict[str, list[int]] = {}
        for row, word in zip(near, words_of_rows(view, kind, near), strict=True):
            if word is not None and word != here:
                rows_of.setdefault(word, []).append(int(row))
        words = sorted(rows_of, key=lambda w: -len(rows_of[w]))
        if kind == "temperature":
            planned = profile.temperature_c or 0.0
            words = [w for w in words if NEAREST_K <= abs(_degrees(w) - planned) <= FARTHEST_K]
        for word in words[:MOST_PER_KIND]:
            changed = _with_change(plan, kind, word, rows_of[word][0], view)
            if changed is not None:
                options.append(Option(kind=kind, word=word, here=here, plan=changed, rows=tuple(rows_of[word])))
    return options


def leaving_group_options(plan: Plan, reading: Reading, view: RecordView) -> list[Option]:
    """Return the leaving groups that the book has used on sp3 carbon and that are made from the plan's in a step."""
    centre = reading.centre
    if centre is None or centre.leaving_group not in _SWAPPED:
        return []
    used = set(distinct(view.table.words["leaving_group"]).tolist())
    options = []
    for group in _SWAPPED:
        if group is centre.leaving_group or code_of("leaving_group", group) not in used:
            continue
        scheme = _swapped(plan.scheme, reading, group)
        if scheme is not None:
            options.append(
                Option(
                    kind="leaving group",
                    word=str(group),
                    here=str(centre.leaving_group),
                    plan=dataclasses.replace(plan, scheme=scheme),
                    rows=(),
                    leaving_group=group,
                )
            )
    return options


def _degrees(word: str) -> float:
    return float(word.split()[1])


def _is_base_drawn(plan: Plan, profile: ConditionProfile) -> bool:
    """Return True where the base stands in the scheme or as a reagent, so that it cannot be exchanged by name."""
    return profile.base_name is not None and not any(c.role is Role.BASE for c in plan.conditions.components)


def _with_change(plan: Plan, kind: str, word: str, row: int, view: RecordView) -> Plan | None:
    """Return the plan with a condition as in a recorded run."""
    conditions = plan.conditions
    if kind == "temperature":
        degrees = _degrees(word)
        temperature = Temperature(text=f"{degrees:g} °C", start_c=degrees, end_c=degrees)
        return dataclasses.replace(plan, conditions=dataclasses.replace(conditions, temperature=temperature))
    used: Conditions = view.run(row).conditions
    if kind == "solvent":
        if not used.solvents:
            return None
        return dataclasses.replace(plan, conditions=dataclasses.replace(conditions, solvents=used.solvents))
    bases: tuple[Component, ...] = tuple(c for c in used.components if c.role is Role.BASE)
    if not bases and word != "no base":
        return None
    kept = tuple(c for c in conditions.components if c.role is not Role.BASE)
    return dataclasses.replace(plan, conditions=dataclasses.replace(conditions, components=(*kept, *bases)))


def _swapped(scheme: str, reading: Reading, group: LeavingGroup) -> str | None:
    """Return the scheme with another leaving group at the principal centre; None where it cannot be written."""
    from rdkit import Chem, rdBase

    from kb.chem.scheme import parse_scheme
    from kb.errors import ChemistryError

    centre = reading.centre
    try:
        parsed = parse_scheme(scheme)
    except ChemistryError:
        return None
    if centre is None or centre.leaving_atom is None or centre.component >= len(parsed.left):
        return None
    texts = [fragment.smiles_as_entered for fragment in parsed.left]
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(texts[centre.component])
        if mol is None or mol.GetBondBetweenAtoms(centre.atom, centre.leaving_atom) is None:
            return None
        mol.GetAtomWithIdx(centre.atom).SetAtomMapNum(1)
        bond = mol.GetBondBetweenAtoms(centre.atom, centre.leaving_atom).GetIdx()
        pieces = Chem.FragmentOnBonds(mol, [bond], addDummies=False)
        rest = next(
            (
                f
                for f in Chem.GetMolFrags(pieces, asMols=True, sanitizeFrags=False)
                if any(a.GetAtomMapNum() for a in f.GetAtoms())
            ),
            None,
        )
        if rest is None:
            return None
        whole = Chem.RWMol(Chem.CombineMols(rest, Chem.MolFromSmiles(_SWAPPED[group])))
        at = next(a.GetIdx() for a in whole.GetAtoms() if a.GetAtomMapNum())
        whole.AddBond(at, rest.GetNumAtoms(), Chem.BondType.SINGLE)
        whole.GetAtomWithIdx(at).SetAtomMapNum(0)
        whole.GetAtomWithIdx(at).SetNoImplicit(False)
        try:
            Chem.SanitizeMol(whole)
        except Chem.MolSanitizeException:
            return None
        texts[centre.component] = Chem.MolToSmiles(whole)
    reactants = len(parsed.reactants)
    products = ".".join(f.smiles_as_entered for f in parsed.products)
    return f"{'.'.join(texts[:reactants])}>{'.'.join(texts[reactants:])}>{products}"
