"""What the contents of a flask make of each other: the Mitsunobu pair, HBr from a bromide and acid, alkoxides.

It owns the pairs that together are another reagent, as classes that are added to those of the single things.
Each rule is common practice; none of them is kinetics.
"""

from __future__ import annotations

from kb.materials.acid_base import Balance
from kb.materials.class_names import add_wider
from kb.materials.flask import Flask

MITSUNOBU_PKAH = 13.0  # the betaine takes protons from acids up to about this pKa (common practice)

DEPROTONATED_FROM: tuple[tuple[str, float, str], ...] = (
    ("carboxylic_acid", 6.0, "carboxylate"),
    ("thiol", 9.0, "thiolate"),
    ("phenol", 9.2, "phenoxide"),
    ("imide", 8.5, "imide_anion"),
    ("active_methylene", 10.3, "stabilised_carbanion"),
    ("nitroalkane", 10.3, "enolate"),
    ("azole", 12.0, "azolide"),
    ("alcohol", 25.0, "alkoxide"),
    ("alkyne", 24.0, "acetylide"),
    ("ketone", 20.0, "enolate"),
    ("ester", 25.0, "enolate"),
)
"""(class, pKaH from which a base makes its anion to a useful extent, class of the anion)."""


def made_in_situ(flask: Flask, balance: Balance) -> frozenset[str]:
    """Return the classes that pairs of ingredients add, wider words included."""
    words: set[str] = set()
    if flask.has("phosphine"):
        if flask.has("azodicarboxylate"):
            words.add("mitsunobu")
        if flask.has("tetrahalomethane", "halogen", "n_haloimide"):
            words.add("appel")
    if flask.has("zinc", "iron") and balance.acidity != "none":
        words.add("zinc_acid")
    if flask.has("iodide") and flask.has("silyl_chloride"):
        words.add("silyl_iodide")
    words |= _hydrogen_halides(flask, balance)
    has_dmso = "sulfoxide" in flask.solvent_classes
    if has_dmso and flask.has("acid_chloride_former", "anhydride", "sulfonic_anhydride", "carbodiimide"):
        words.add("activated_dmso")
    words |= set(_anions(flask, balance))
    return add_wider(words)


def _hydrogen_halides(flask: Flask, balance: Balance) -> set[str]:
    """Return HX freed from a halide salt by a mineral acid, or from an acid chloride by an alcohol."""
    words: set[str] = set()
    acid = balance.acid
    if balance.acidity == "strong" and acid is not None and acid.has("mineral_acid", "sulfonic_acid"):
        for salt in ("bromide", "iodide", "chloride"):
            if any(i.has(salt) and not i.has("inert_salt", "lewis_acid") for i in flask.ingredients):
                words.add(f"hydrogen_{salt}")
    if acid is not None and acid.has("acyl_halide", "acid_chloride_former"):
        words.add("hydrogen_chloride")
    return words


def _anions(flask: Flask, balance: Balance) -> list[str]:
    strength = _strength(flask, balance)
    found = []
    for word, least, anion in DEPROTONATED_FROM:
        donors = [i for i in flask.having(word) if i is not balance.base]
        if donors and strength >= least:
            found.append(anion)
    if "alcohol" in flask.medium.classes and (strength >= 25.0 or flask.has("alkali_metal")):
        found.append("alkoxide")
    return found


def _strength(flask: Flask, balance: Balance) -> float:
    """Return the pKaH of the strongest base; an alkali metal and the Mitsunobu betaine are bases too."""
    strength = balance.base.facts.pkah if balance.base is not None else None
    betaine = MITSUNOBU_PKAH if flask.has("phosphine") and flask.has("azodicarboxylate") else 0.0
    return max(strength or 0.0, 16.0 if flask.has("alkali_metal") else 0.0, betaine)
