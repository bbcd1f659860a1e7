"""Hazards that are worked out, not looked up: azide ratio, gas set free, pressure, peroxides, low-boiling solvents.

It owns the arithmetic and the words of these five; the table of the rest is `cautions.toml`. Every number is
arithmetic on what was entered or a rule of thumb that is named: none of them says that something is safe.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from kb.assess.caution_mixture import Ingredient, Mixture
from kb.assess.caution_table import CautionTable
from kb.assess.liability_rule import compile_motif
from kb.chem.facts import Reading
from kb.vocabulary import Fate, Severity

GAS_L_PER_MOL = 24.5
"""Molar volume of a gas at 25 °C and 1 atm [L/mol]; R T / p, arithmetic."""

TROUTON_J_MOL_K = 88.0
"""Entropy of vaporisation of an ordinary liquid [J/(mol K)], Trouton's rule (common practice)."""

GAS_CONSTANT_J_MOL_K = 8.314
ATM_BAR = 1.01325

LOW_BOILING_C = 42.0
"""Boiling point at or below which a solvent is called low-boiling [degC]: a judgement."""

NEAR_BOILING_K = 10.0
"""How far below its boiling point a low-boiling solvent is said to be lost [K]: a judgement; dichloromethane at room
temperature is not meant."""

LARGE_MMOL = 100.0
"""Scale from which a low-boiling solvent is told of whatever the temperature [mmol]: a judgement."""

_BURNS = frozenset({"ether", "nonpolar", "ketone", "ester", "thio"})
_CHLORINATED = frozenset({"chlorinated"})

AZIDE = "[NX2]=[NX2+]=[NX1-]"
ORGANIC_AZIDE = "[#6,#16]-[NX2]=[NX2+]=[NX1-]"
_BOC = "[#7][CX3](=[OX1])[OX2][CX4]([CH3])([CH3])[CH3]"
_CARBONATE = "[#6;!$([CX4]([CH3])([CH3])[CH3])][OX2][CX3](=[OX1])[OX2][CX4]([CH3])([CH3])[CH3]"
_TERT_BUTANOL = "[OX2H][CX4]([CH3])([CH3])[CH3]"
_TERT_BUTYL = "[#7,#8,#16,F,Cl,Br,I]-[CX4]([CH3])([CH3])[CH3]"
_TERT_BUTYL_OXYGEN = "[OX2;!$([OX2]C(=O)[#7,#8])][CX4]([CH3])([CH3])[CH3]"
_AZIDE_SOURCE = (
    "(N_C + N_O)/N_N: institutional azide guidance sheet; Brase et al., Angew. Chem. Int. Ed. 2005, 44, 5188 (memory)"
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Worked:
    """One hazard that was worked out, before it becomes a finding."""

    rule_id: str
    severity: Severity
    title: str
    why: str
    do: tuple[str, ...]
    source: str
    ingredient: Ingredient | None = None
    atoms: tuple[int, ...] = ()


def azide_ratio(mol: object) -> float | None:
    """Return (carbons + oxygens) / nitrogens, every nitrogen counted, None for a molecule without nitrogen.

    Source: institutional azide guidance; Brase et al., Angew. Chem. Int. Ed. 2005, 44, 5188 (memory).
    """
    counts = {6: 0, 7: 0, 8: 0}
    for atom in mol.GetAtoms():  # type: ignore[attr-defined]
        number = atom.GetAtomicNum()
        if number in counts:
            counts[number] += 1
    return (counts[6] + counts[8]) / counts[7] if counts[7] else None


def pressure_bar(bp_c: float, temperature_c: float) -> float:
    """Return the vapour pressure of a liquid at a temperature [bar] by Trouton's rule.

    Clausius-Clapeyron with an entropy of vaporisation of 88 J/(mol K): for ordinary liquids good to some
    ten or twenty per cent, poor for those that hydrogen-bond (their pressure rises faster).
    """
    ratio = (bp_c + 273.15) / (temperature_c + 273.15)
    return ATM_BAR * math.exp(TROUTON_J_MOL_K / GAS_CONSTANT_J_MOL_K * (1 - ratio))


def work_out(mixture: Mixture, reading: Reading, table: CautionTable) -> Iterator[Worked]:
    """Yield every hazard that arithmetic finds in a mixture."""
    yield from _organic_azides(mixture, table)
    yield from _gas(mixture, reading)
    yield from _pressure(mixture)
    yield from _peroxides(mixture, table)
    yield from _low_boiling(mixture)


def _organic_azides(mixture: Mixture, table: CautionTable) -> Iterator[Worked]:
    pattern, _ = compile_motif(ORGANIC_AZIDE)
    seen: set[str] = set()
    for ingredient in mixture.ingredients:
        atoms = ingredient.mol.GetSubstructMatch(pattern)
        ratio = azide_ratio(ingredient.mol)
        if not atoms or ratio is None or ingredient.smiles in seen:
            continue
        seen.add(ingredient.smiles)
        severity, advice = _azide_class(ratio)
        lines = [f"(carbons + oxygens) / nitrogens of this azide is {ratio:.1f}. {advice}"]
        for override in table.azide_overrides:
            query, _ = compile_motif(override.motif)
            if ingredient.mol.HasSubstructMatch(query):
                lines.append(override.why)
                severity = max(severity, override.severity, key=lambda s: s.rank)
        yield Worked(
            rule_id="hazard-organic-azide",
            severity=severity,
            title="Organic azide" + (" as product" if ingredient.is_product else ""),
            why=f"{' '.join(lines)} Passing the rule does not prove that an azide is safe.",
            do=(
                "keep it in solution and cold, no hot evaporation, no metal spatula, no distillation",
                "small first, behind a shield",
                "carry it on without isolating it where that can be done",
            ),
            source=_AZIDE_SOURCE,
            ingredient=ingredient,
            atoms=tuple(atoms),
        )


def _azide_class(ratio: float) -> tuple[Severity, str]:
    if ratio < 1:
        return Severity.SERIOUS, "Below 1: the guidance says never isolate it; at most 1 g, passing through only."
    if ratio < 3:
        return (
            Severity.CAUTION,
            "From 1 to below 3: the guidance says it may be made and isolated, kept below room temperature, "
            "at most 1 M and 5 g.",
        )
    return Severity.NOTE, "3 or more: the guidance says it may be isolated and kept pure, up to 20 g."


def _gas(mixture: Mixture, reading: Reading) -> Iterator[Worked]:
    """Gas set free when tert-butyl groups go: wanted (fewer in the product) or likely (strong acid).

    A group that only changes its place (tert-butanol to the chloride) gives no isobutene.
    """
    profile = mixture.profile
    forcing = profile.acidity == "strong" or profile.lewis_acid == "strong"
    if not forcing and reading.fate is not Fate.GROUP_LOSS:
        return
    left = [i for i in mixture.ingredients if i.component is not None]
    right = [i for i in mixture.ingredients if i.is_product]
    carbon_dioxide = alkene = 0
    source: tuple[Ingredient, tuple[int, ...]] | None = None
    for smarts, co2_each in ((_BOC, 1), (_CARBONATE, 1), (_TERT_BUTYL_OXYGEN, 0)):
        before, after = _count(left, smarts), _count(right, smarts)
        lost = before - after if right else (before if forcing else 0)
        if lost > 0:
            carbon_dioxide += lost * co2_each
            alkene += lost
            source = source or next(((i, m[0]) for i in left if (m := _matches(i, smarts))), None)
    if right:
        alkene = min(alkene, _count(left, _TERT_BUTYL) - _count(right, _TERT_BUTYL))
    elif "hydrogen_halide" in profile.reagent_classes:
        alkene -= _count(left, _TERT_BUTANOL)
    alkene = max(alkene, 0)
    if not alkene + carbon_dioxide:
        return
    parts = [f"{carbon_dioxide} CO2"] * bool(carbon_dioxide) + [f"up to {alkene} isobutene"] * bool(alkene)
    text = f"Per molecule: {' and '.join(parts)} (in TFA most of the isobutene stays behind as ester or polymer)."
    if mixture.scale_mmol:
        litres = mixture.scale_mmol / 1000 * GAS_L_PER_MOL * (carbon_dioxide + alkene)
        text += f" At {mixture.scale_mmol:g} mmol that is up to {litres:.2g} L of gas."
    closed = mixture.is_closed is True
    yield Worked(
        rule_id="hazard-gas-tert-butyl",
        severity=Severity.SERIOUS if closed else Severity.CAUTION,
        title="Gas from the loss of tert-butyl groups" + (" in a closed vessel" if closed else ""),
        why=f"{text} {'A closed vessel builds pressure.' if closed else 'It has to get out; isobutene burns.'}",
        do=("open to a bubbler, never stoppered", "add the acid in portions", "no flame"),
        source="24.5 L/mol at 25 °C: arithmetic; "
        "gases: Lundt et al., Int. J. Pept. Protein Res. 1978, 12, 258 (memory)",
        ingredient=source[0] if source else None,
        atoms=source[1] if source else (),
    )


def _matches(ingredient: Ingredient, smarts: str) -> tuple[tuple[int, ...], ...]:
    pattern, _ = compile_motif(smarts)
    return tuple(ingredient.mol.GetSubstructMatches(pattern))


def _count(ingredients: list[Ingredient], smarts: str) -> int:
    return sum(len(_matches(i, smarts)) for i in ingredients)


def _pressure(mixture: Mixture) -> Iterator[Worked]:
    bp_c, temperature_c = mixture.profile.bp_c, mixture.profile.temperature_c
    if bp_c is None or temperature_c is None or temperature_c <= bp_c + 3 or mixture.is_closed is False:
        return
    bar = pressure_bar(bp_c, temperature_c)
    closed = mixture.is_closed is True
    yield Worked(
        rule_id="hazard-pressure",
        severity=Severity.SERIOUS if closed and bar >= 5 else Severity.CAUTION,
        title="Above the boiling point" + (" in a closed vessel" if closed else ": pressure if it is closed"),
        why=(
            f"{temperature_c:g} °C against a boiling point of {bp_c:g} °C: about {bar:.1f} bar of solvent vapour "
            "by Trouton's rule, gas from the reaction and the air in the vessel on top."
        ),
        do=(
            "a vessel rated and tested for it, at most half full",
            "a shield and a relief valve",
            "or a solvent that boils higher",
        ),
        source="Clausius-Clapeyron with Trouton's rule, 88 J/(mol K) (common practice)",
    )


def _peroxides(mixture: Mixture, table: CautionTable) -> Iterator[Worked]:
    names = {f.smiles: f for f in table.peroxide_formers}
    seen: set[str] = set()
    for ingredient in mixture.ingredients:
        former = names.get(ingredient.smiles)
        if former is None or ingredient.is_product or former.name in seen:
            continue
        seen.add(former.name)
        yield Worked(
            rule_id=f"hazard-peroxide-former-{former.peroxide_class.lower()}",
            severity=Severity.CAUTION if former.peroxide_class == "A" else Severity.NOTE,
            title=f"{former.name[0].upper()}{former.name[1:]} forms peroxides (class {former.peroxide_class})",
            why=(
                f"{table.peroxide_text[former.peroxide_class]} Once opened, test or discard it within "
                f"{former.months} months."
            ),
            do=("look at the date on the bottle and test it", "never distil it to dryness", "inhibited grade"),
            source=table.peroxide_text["source"],
            ingredient=ingredient,
        )


def _low_boiling(mixture: Mixture) -> Iterator[Worked]:
    """A low-boiling solvent where it is lost (near its boiling point or above) or where there is much of it."""
    profile, bp_c = mixture.profile, mixture.profile.bp_c
    if bp_c is None or bp_c > LOW_BOILING_C:
        return
    is_near = profile.temperature_c is not None and profile.temperature_c >= bp_c - NEAR_BOILING_K
    if not is_near and (mixture.scale_mmol or 0.0) < LARGE_MMOL:
        return
    burns = bool(profile.solvent_classes & _BURNS) or not profile.solvent_classes & _CHLORINATED
    yield Worked(
        rule_id="hazard-low-boiling-solvent",
        severity=Severity.NOTE,
        title=f"A solvent that boils at {bp_c:g} °C",
        why="It is lost on warming, builds pressure in a closed bottle or funnel, and its vapour gathers low"
        + (", where it lights from afar." if burns else "; it harms who breathes it."),
        do=(
            "cool the condenser well",
            "check the level on long runs",
            "no flame, no hot surface near" if burns else "hood, and vent the separating funnel often",
        ),
        source="Prudent Practices in the Laboratory, National Research Council (memory)",
    )
