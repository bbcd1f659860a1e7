"""Acid and base in one flask: which of them is left when they have met.

It owns the neutralisation. A record seldom says the order of addition, and a scheme lists the acid of a salt and of
the work-up beside the rest, so the rules are these (common practice):

1. Where equivalents of both are recorded, they decide (a carbonate takes two).
2. An acid that is the solvent stays.
3. Hydrides, organometallics, metal amides and alkoxides destroy an acid: it was the quench, or there is none left.
4. An organic base (amine, amidine, pyridine), or an amine taking part, makes a salt of the acid: `R2NH.HCl`.
5. An inorganic base alone (hydroxide, carbonate, phosphate) beside a strong acid, no amine about: nobody mixes
   these on purpose, so they are two stages and both facts stand.

Acidity: strong below pKa 2.2, with neat formic acid; weak up to pKa 7 and for ammonium salts and bisulfates, whose
solutions are work-up washes. Phenols, thiols and
imides are no acids in this sense, since no acid-labile group notices them. Thionyl chloride and phosphorus halides
without a base count as strong, because the hydroxyl that they meet gives HX; acid chlorides where an alcohol or water
is there.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from kb.materials.flask import Flask, Ingredient

BASE_MARGIN = 2.0  # pKaH above the acid's pKa from which a base takes the proton (99 %)

_DESTROYERS = (
    "metal_hydride",
    "borohydride",
    "aluminium_hydride",
    "organometallic",
    "metal_amide",
    "alkoxide",
    "enolate",
    "alkali_metal",
)
_ORGANIC = (
    "amine",
    "aromatic_amine_base",
    "amidine_base",
    "guanidine_base",
    "phosphazene_base",
    "hydrazine",
    "hydroxylamine",
    "carbodiimide",
)
_INORGANIC = ("hydroxide", "carbonate_base", "phosphate_base", "oxide_base", "ammonia")
_ACID_FORMERS = ("thionyl_chloride", "phosphorus_halide", "acid_chloride_former", "acyl_halide")
_TAKES_TWO = ("carbonate_base", "phosphate_base", "oxide_base")


@dataclass(frozen=True, slots=True, kw_only=True)
class Balance:
    """What is left of acids and bases.

    Attributes:
        acidity: "none", "weak" or "strong".
        acid: what gives the acidity; None for "none".
        base: the strongest base left; None = none.
        spent: acids that were neutralised.
    """

    acidity: str = "none"
    acid: Ingredient | None = None
    base: Ingredient | None = None
    spent: tuple[Ingredient, ...] = ()


def settle(flask: Flask) -> Balance:
    """Return what is left when the acids and bases in the flask have met."""
    acids = [i for i in flask.ingredients if i.facts.acidity != "none"]
    bases = [i for i in flask.ingredients if i.facts.bulk and (i.facts.pkah or 0.0) > 0 and not _is_own_acid(i)]
    left = [acid for acid in acids if not _is_taken(acid, bases, flask)]
    spent = tuple(acid for acid in acids if acid not in left)
    acid = max(left, key=lambda a: _strength(a, flask), default=None)
    acidity = _level(acid, flask) if acid else "none"
    formers = flask.having(*_ACID_FORMERS) if flask.has("alcohol", "water") else flask.having(*_ACID_FORMERS[:2])
    if acidity != "strong" and not bases and formers:
        return Balance(acidity="strong", acid=formers[0], spent=spent)
    base = max(bases, key=lambda b: b.facts.pkah or 0.0, default=None)
    if base is not None and acid is not None and acidity == "strong" and not _stands_beside(base, acid, flask):
        base = None
    if acidity == "none" and spent and base is not None and (base.facts.pkah or 0) < 6.5:
        acidity, acid = "weak", spent[0]  # the salt of a weak base is itself an acid: pyridinium
    return Balance(acidity=acidity, acid=acid, base=base, spent=spent)


def _strength(acid: Ingredient, flask: Flask) -> tuple[bool, float]:
    return _level(acid, flask) == "strong", -(acid.facts.pka if acid.facts.pka is not None else 5.0)


def _level(acid: Ingredient, flask: Flask) -> str:
    """Return its level; neat formic acid cleaves what trifluoroacetic acid cleaves, so it counts as strong."""
    is_neat = acid.is_medium or (acid.is_named and not flask.medium.parts and len(flask.ingredients) == 1)
    if is_neat and acid.facts.smiles == "O=CO":
        return "strong"
    return acid.facts.acidity


def _is_own_acid(ingredient: Ingredient) -> bool:
    """Return True for an acid whose anion is listed as a weak base (phosphoric acid's salts)."""
    facts = ingredient.facts
    return facts.acidity == "strong" or (facts.acidity == "weak" and (facts.pkah or 0) < (facts.pka or 0))


def _is_taken(acid: Ingredient, bases: Iterable[Ingredient], flask: Flask) -> bool:
    """Return True where the bases leave nothing of the acid; the rules are numbered as in the module's text."""
    if acid.is_medium:
        return False  # 2
    is_strong = acid.facts.acidity == "strong"
    pka = acid.facts.pka if acid.facts.pka is not None else 4.0
    takers = [b for b in bases if (b.facts.pkah or 0) >= pka + BASE_MARGIN]
    if any(b.is_medium for b in takers):
        return True
    if acid.equiv is not None and takers and all(b.equiv is not None for b in takers):
        return sum((2 if b.has(*_TAKES_TWO) else 1) * (b.equiv or 0.0) for b in takers) >= acid.equiv  # 1
    destroyers = [i for i in flask.having(*_DESTROYERS) if is_strong or not i.has("borohydride")]
    if destroyers:
        return True  # 3
    if any(b.has(*_ORGANIC) for b in takers):
        return True  # 4
    return bool(takers) and not is_strong  # 5 keeps a strong acid


def _stands_beside(base: Ingredient, acid: Ingredient, flask: Flask) -> bool:
    """Return True where acid and base are two stages rather than one mixture."""
    return base.has(*_INORGANIC) and not acid.is_medium and (acid.equiv is None or base.equiv is None)
