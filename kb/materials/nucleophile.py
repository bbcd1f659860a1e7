"""Which of the things in a flask is meant as the nucleophile, and how good it is towards sp3 carbon.

It owns the ranking, no rates: what follows from the choice is for `kb.physorg` and `kb.assess`. A neutral acid whose
anion is made in the flask (phenol with carbonate) counts as that anion. An amine in strong acid is no nucleophile.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.materials.acid_base import Balance
from kb.materials.flask import Flask, Ingredient
from kb.materials.in_situ import DEPROTONATED_FROM

NUCLEOPHILE_ORDER: tuple[str, ...] = (
    "azide",
    "cyanide",
    "thiocarboxylate",
    "thiolate",
    "hydrosulfide",
    "xanthate",
    "thiocyanate",
    "thiosulfate",
    "sulfinate",
    "sulfite",
    "selenide",
    "thiourea",
    "thiol",
    "phosphide",
    "organocuprate",
    "grignard",
    "acetylide",
    "alkyllithium",
    "organozinc",
    "stabilised_carbanion",
    "phosphonate_anion",
    "enolate",
    "imide_anion",
    "azolide",
    "hydrazine",
    "hydroxylamine",
    "primary_amine",
    "secondary_amine",
    "ammonia",
    "phenoxide",
    "carboxylate",
    "cyanate",
    "nitrite",
    "fluoride",
    "deoxyfluorinating_agent",
    "hydrogen_bromide",
    "hydrogen_iodide",
    "iodide",
    "thionyl_chloride",
    "phosphorus_halide",
    "tetrahalomethane",
    "silyl_iodide",
    "boron_trihalide",
    "bromide",
    "chloride",
    "alkoxide",
    "hydroxide",
    "phosphite",
    "thioether",
    "aromatic_amine_base",
    "phosphine",
    "tertiary_amine",
    "hydrogen_chloride",
    "azole",
    "imide",
    "sulfonamide",
    "carbonate_base",
    "phosphate_base",
    "amidine_base",
    "guanidine_base",
    "active_methylene",
    "nitroalkane",
    "phenol",
    "carboxylic_acid",
    "oxime",
    "amide",
    "carbamate",
    "alcohol",
    "water",
    "silyl_enol_ether",
)
"""Which class is meant as the nucleophile where several are there, first the likelier (common practice).

Iodide and pyridine stand low because they are usually catalysts; alkoxide and hydroxide because they are usually
the base.
"""

DONORS: dict[str, str] = {
    word: donor
    for donor, words in {
        "nitrogen": "azide amine primary_amine secondary_amine tertiary_amine ammonia aromatic_amine "
        "aromatic_amine_base amidine_base guanidine_base azole azolide imide imide_anion amide carbamate sulfonamide "
        "hydroxylamine hydrazine nitrite cyanate nitrile metal_amide",
        "oxygen": "alkoxide tertiary_alkoxide hydroxide phenoxide phenol carboxylate carboxylic_acid carbonate_base "
        "bicarbonate phosphate_base water alcohol oxime nitrate hydroperoxide hydrogen_peroxide superoxide aldehyde "
        "siloxide silanol",
        "sulfur": "thiolate thiol hydrosulfide thiocarboxylate thioether sulfinate sulfite thiosulfate thiourea "
        "thiocyanate xanthate",
        "selenium": "selenide",
        "carbon": "cyanide enolate silyl_enol_ether enol_ether stabilised_carbanion active_methylene nitroalkane "
        "acetylide alkyne alkyllithium organolithium grignard organozinc organocuprate organometallic organoaluminium "
        "carbanion ylide phosphonate_anion alkene arene_scavenger",
        "halogen": "fluoride chloride bromide iodide hydrogen_fluoride hydrogen_chloride hydrogen_bromide "
        "hydrogen_iodide deoxyfluorinating_agent thionyl_chloride "
        "phosphorus_halide tetrahalomethane silyl_iodide boron_trihalide",
        "phosphorus": "phosphine phosphite phosphide",
    }.items()
    for word in words.split()
}
"""The atom with which a class bonds to carbon, as a rule; ambident ones by their usual end (common practice)."""


_ANION_OF = {donor: anion for donor, _, anion in DEPROTONATED_FROM}


@dataclass(frozen=True, slots=True, kw_only=True)
class Nucleophile:
    """The one that is meant: its class, its level ("weak" or "good") and the ingredient."""

    word: str
    level: str
    ingredient: Ingredient


def find_nucleophile(flask: Flask, balance: Balance, made: frozenset[str]) -> Nucleophile | None:
    """Return what is meant as the nucleophile; None where nothing in the flask is one. A spent acid is none.

    Args:
        flask, balance: the contents and what is left of acid and base.
        made: classes made in situ.
    """
    present = [i for i in flask.ingredients if i not in balance.spent]
    candidates = [n for i in present if (n := _as_nucleophile(i, balance, made)) is not None]
    return max(candidates, key=lambda n: _rank(n, balance), default=None)


def _as_nucleophile(ingredient: Ingredient, balance: Balance, made: frozenset[str]) -> Nucleophile | None:
    """Return the ingredient as a nucleophile under its likeliest class; None where it is none here."""
    is_halide_source = ingredient.has("tetrahalomethane") and "appel" in made
    level = "good" if is_halide_source else ingredient.facts.nucleophile
    if balance.acidity == "strong" and ingredient.has("amine", "ammonia"):
        return None
    for word in NUCLEOPHILE_ORDER:
        if word not in ingredient.facts.classes:
            continue
        if word == "phosphine" and made & {"mitsunobu", "appel"}:
            continue
        anion = _ANION_OF.get(word)
        if anion in made and anion in NUCLEOPHILE_ORDER and not (word == "alcohol" and ingredient.is_medium):
            return Nucleophile(word=anion, level="good", ingredient=ingredient)
        if level != "none":
            return Nucleophile(word=word, level=level, ingredient=ingredient)
    return None


def _rank(nucleophile: Nucleophile, balance: Balance) -> tuple[bool, bool, int]:
    """Return the sort key: good before weak, what was added before solvent and base, then the order above."""
    ingredient = nucleophile.ingredient
    is_good = nucleophile.level == "good"
    is_background = ingredient.is_medium or (ingredient is balance.base and not is_good)
    return is_good, not is_background, -NUCLEOPHILE_ORDER.index(nucleophile.word)
