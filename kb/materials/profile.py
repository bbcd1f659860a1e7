"""The condition profile: what a set of conditions *is*, as facts that rules can ask about.

It owns the names and levels of the facts, not how they are found (`classes.py`) and not the rules (`kb.assess`).
Every fact is three-valued: a value, or None = cannot tell (nothing recorded that would say). "none" as a level is
a positive statement: the components are all known and none of them is an acid. Thresholds that rules put on these
facts divide classes of conditions; they are judgements, never measured limits.
"""

from __future__ import annotations

from dataclasses import dataclass, field

LEVELS: dict[str, tuple[str, ...]] = {
    "acidity": ("none", "weak", "strong"),
    "nucleophile": ("none", "weak", "good"),
    "lewis_acid": ("none", "mild", "strong"),
    "hydride": ("none", "mild", "strong"),
}
"""Ordered levels, least first; `acidity >= weak` in a rule means at least that level."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ConditionProfile:
    """The facts of one set of conditions.

    Attributes:
        reagent_classes: classes of everything in the flask but the substrate and the solvents, `alkoxide`,
            `azide`, `primary_amine`, `carbonate_base`, `boron_trihalide` (all of them: `class_names.py`).
        solvent_classes: e.g. `alcohol`, `water`, `amide`, `sulfoxide`, `chlorinated`, `ether`, `thf`, `nonpolar`,
            plus the coarse `protic`, `polar-aprotic`, `nonpolar`.
        has_unknown_reagent: a component could not be classified, so absence of a class proves nothing.
        has_unknown_solvent: the solvent was not recorded or not recognised.
        base_pkah: pKaH (water) of the strongest base present; None = no base known (see has_unknown_reagent).
        base_bulk: "unhindered" or "hindered", of that strongest base.
        acidity, nucleophile, lewis_acid, hydride: level words of LEVELS; None = cannot tell.
        halophile: "silver", "mercury" or "none".
        water, alcohol, peroxide, fluoride, metal_catalyst, hydrogenolysis, dissolving_metal, organometallic: is
            there any; None = cannot tell.
        oxidants: oxidant classes present.
        ionising: strong acid, Lewis acid, silver, or a protic ionising solvent with only a weak nucleophile.
        temperature_c: most forcing temperature [degC], reflux resolved through the solvent; None = not recorded.
        temperature_low_c: the least forcing, for "0C to rt".
        time_h: reaction time [h]; None = not recorded.
        prolonged: time_h above 12 h; None = not recorded.
        solvent_alkoxy: alkyl parts (canonical SMILES of the alcohol) of alkoxides and alcohol solvents present.
        permittivity: of the solvent or the mean over its parts [1]; None = not known.
        et30_kcal_mol: likewise E_T(30) [kcal/mol].
        winstein_y: likewise Grunwald-Winstein Y (tert-butyl chloride).
        bp_c: lowest boiling point among the solvents [degC].
        mp_c: highest melting point among the solvents [degC], where one solvent is alone.
        nucleophile_name, base_name, acid_name: catalogue names of what gave the facts, for sentences.
        nucleophile_class: class of the reagent meant as nucleophile, e.g. `azide`.
        swain_scott_n: Swain-Scott n of that nucleophile, where published.
        reagents: what is in the flask but the substrate and the solvents, for likeness: canonical SMILES of each ion
            or molecule, lone metal cations left out; the name where there is no structure.
        solvents: names of the solvents, as the catalogue has them, else as written.
    """

    reagent_classes: frozenset[str] = frozenset()
    solvent_classes: frozenset[str] = frozenset()
    has_unknown_reagent: bool = False
    has_unknown_solvent: bool = True
    base_pkah: float | None = None
    base_bulk: str | None = None
    acidity: str | None = None
    nucleophile: str | None = None
    lewis_acid: str | None = None
    hydride: str | None = None
    halophile: str | None = None
    water: bool | None = None
    alcohol: bool | None = None
    peroxide: bool | None = None
    fluoride: bool | None = None
    metal_catalyst: bool | None = None
    hydrogenolysis: bool | None = None
    dissolving_metal: bool | None = None
    organometallic: bool | None = None
    oxidants: frozenset[str] = frozenset()
    ionising: bool | None = None
    temperature_c: float | None = None
    temperature_low_c: float | None = None
    time_h: float | None = None
    prolonged: bool | None = None
    solvent_alkoxy: frozenset[str] = field(default_factory=frozenset)
    permittivity: float | None = None
    et30_kcal_mol: float | None = None
    winstein_y: float | None = None
    bp_c: float | None = None
    mp_c: float | None = None
    nucleophile_name: str | None = None
    base_name: str | None = None
    acid_name: str | None = None
    nucleophile_class: str | None = None
    swain_scott_n: float | None = None
    reagents: frozenset[str] = frozenset()
    solvents: frozenset[str] = frozenset()
