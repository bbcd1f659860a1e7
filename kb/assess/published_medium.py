"""From a condition profile to the medium that the published models ask for.

It owns the words: which reagent class is the nucleophile once the base has done its work, which is the
base, which solvent classes count. Three-valued facts stay so. Thresholds are judgements that divide classes
(a base deprotonates what is at most as weak an acid as its own conjugate acid, within two units), never
measured limits.
"""

from __future__ import annotations

from rdkit import Chem, rdBase

from kb.materials.profile import ConditionProfile
from kb.physorg.constants import find_constant, get_constant
from kb.physorg.step import Medium

DEPROTONATED = {
    "thiol": ("thiolate", 9.0),
    "phenol": ("phenoxide", 10.0),
    "alcohol": ("alkoxide", 15.9),
    "carboxylic_acid": ("carboxylate", 4.8),
    "imide": ("imide_anion", 8.3),
    "azole": ("azolide", 14.0),
    "active_methylene": ("stabilised_carbanion", 12.0),
    "nitroalkane": ("stabilised_carbanion", 10.0),
    "sulfonamide": ("imide_anion", 10.0),
    "silanol": ("siloxide", 13.0),
}
"""Acid to (nucleophile after a base, rough pKa in water; CRC Handbook and compilations, from memory)."""

OF_ACIDS = {
    "hydrogen_fluoride": "fluoride",
    "hydrogen_chloride": "chloride",
    "hydrogen_bromide": "bromide",
    "hydrogen_iodide": "iodide",
    "thionyl_chloride": "chloride",
    "deoxyfluorinating_agent": "fluoride",
    "sulfonyl_fluoride": "fluoride",
}
"""What a reagent brings to the carbon."""

WITHIN = {
    "amine": "secondary_amine",
    "silver_salt": "nitrate",
    "organolithium": "acetylide",
    "alkyllithium": "acetylide",
}
"""Wider words to the row of the tables that stands for them."""

ACTIVATORS = frozenset(
    {
        "thionyl_chloride", "phosphorus_halide", "mitsunobu", "appel", "deoxyfluorinating_agent",
        "sulfonyl_fluoride", "sulfonyl_chloride", "sulfonic_anhydride", "acid_chloride_former",
    }
)  # fmt: skip
_NEVER_BASES = frozenset({"water", "alcohol", "chloride", "bromide", "iodide", "aromatic_amine"})
_CONSUMED = frozenset({"metal_hydride"})
_AQUEOUS = frozenset({"mineral_acid", "hydrogen_fluoride", "hydrogen_chloride", "hydrogen_bromide", "hydrogen_iodide"})
_ACID_MOLAR = 9.0
"""Halide in a concentrated hydrogen halide [mol/L]: about 8.9 M HBr, 12 M HCl (common practice)."""
_MARGIN = 2.0


def medium_of(
    profile: ConditionProfile,
    nucleophile: str | None = None,
    is_activated: bool = False,
    base_smiles: str | None = None,
) -> Medium:
    """Return the medium of a profile.

    Args:
        profile: of the conditions.
        nucleophile: class read from the scheme; None = take the profile's.
        is_activated: the leaving group is an oxygen that must be activated first.
        base_smiles: the base, for its bulk; None = by class.
    """
    base = _base_word(profile)
    pkah = profile.base_pkah if base is not None else None
    word = _nucleophile_word(profile, nucleophile, base, pkah, is_activated)
    if base is not None and (base in _CONSUMED or base == word) and word is not None:
        # What the base made of the nucleophile is then the strongest base left.
        base, pkah = (None, None) if base in _CONSUMED else (base, pkah)
    if word == "alkoxide" and base == "tertiary_alkoxide" and (nucleophile is None or _is_only_hindered(profile)):
        word = base  # there is no alcohol that the base would turn into another alkoxide
    base_molar = None
    if base is None and "water" in profile.solvent_classes and profile.acidity == "none":
        base, base_molar = "hydroxide", _hydroxide_of_water(profile.temperature_c)
    n = profile.swain_scott_n if word is not None and word == profile.nucleophile_class else None
    return Medium(
        nucleophile=word,
        nucleophile_n=n,
        base=base,
        base_pkah=pkah,
        base_bulk=_bulk(profile, base, base_smiles),
        base_molar=base_molar,
        nucleophile_molar=_ACID_MOLAR if _is_hydrogen_halide(profile, word) else None,
        solvent_kinds=_kinds(profile),
        solvent_y=profile.winstein_y,
        temperature_c=profile.temperature_c,
        acid=profile.acidity,
        lewis_acid=profile.lewis_acid,
        halophile=profile.halophile,
        activates_hydroxyl=is_activated and bool(profile.reagent_classes & ACTIVATORS),
        is_complete=not profile.has_unknown_reagent,
    )


def _hydroxide_of_water(temperature_c: float | None) -> float:
    """Return hydroxide in neutral water [mol/L].

    Source: 1e-7 at 25 degC, pKw 0.033 less for each kelvin (CRC Handbook, memory).
    """
    warmer_k = 0.0 if temperature_c is None else temperature_c - 25.0
    return float(10 ** (-7.0 + 0.0165 * warmer_k))


def _is_only_hindered(profile: ConditionProfile) -> bool:
    """Return True where every alcohol or alkoxide known to be in the flask is as hindered as tert-butoxide."""
    oxygens = [bulk for smiles in profile.reagents if (bulk := bulk_of_smiles(smiles)) is not None]
    return bool(oxygens) and min(oxygens) >= get_constant("bulk", "hindered").value


def bulk_of_smiles(smiles: str) -> float | None:
    """Return the bulk of an alkoxide by its carbon (0 ethoxide, 1 tert-butoxide), None for other things."""
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles)
    if mol is None:
        return None
    for atom in mol.GetAtoms():
        carbons = [n for n in atom.GetNeighbors() if n.GetAtomicNum() == 6]
        if atom.GetAtomicNum() == 8 and len(carbons) == 1 and len(atom.GetNeighbors()) == 1:
            groups = [n for n in carbons[0].GetNeighbors() if n.GetIdx() != atom.GetIdx()]
            if len(groups) < 3:
                return 0.0 if len(groups) < 2 else 0.2
            longer = sum(any(k.GetIdx() != carbons[0].GetIdx() for k in g.GetNeighbors()) for g in groups)
            if longer == 0:
                return get_constant("bulk", "hindered").value
            return get_constant("bulk", "EtMe2CO-" if longer == 1 else "Et3CO-").value
    return None


def _base_word(profile: ConditionProfile) -> str | None:
    """Return the class of the strongest base by the tables."""
    known = []
    for word in profile.reagent_classes - _NEVER_BASES:
        row = find_constant("pkah", word)
        if row is not None and row.value > 0:
            known.append((row.value, word))
    if not known:
        return None
    words = sorted(known, reverse=True)
    if "tertiary_alkoxide" in profile.reagent_classes:
        return "tertiary_alkoxide"
    return words[0][1]


def _nucleophile_word(
    profile: ConditionProfile, read: str | None, base: str | None, pkah: float | None, is_activated: bool
) -> str | None:
    word = read or profile.nucleophile_class
    if is_activated:
        brought = next((OF_ACIDS[c] for c in sorted(profile.reagent_classes) if c in OF_ACIDS), None)
        word = brought if word is None or word in OF_ACIDS or word in ACTIVATORS else word
    if word is None and base in ("alkoxide", "tertiary_alkoxide", "hydroxide"):
        return base
    if word is None:
        return None
    word = OF_ACIDS.get(word, word)
    if word in DEPROTONATED:
        anion, pka = DEPROTONATED[word]
        strength = pkah if pkah is not None else _tabulated(base)
        if strength is not None and strength >= pka - _MARGIN:
            if word == "alcohol" and base == "tertiary_alkoxide" and read is None:
                return base
            return anion
    word = WITHIN.get(word, word)
    if word in ("alcohol", "water", "carboxylic_acid") and word in profile.solvent_classes:
        return None  # the solvent is counted as solvent
    return word


def _tabulated(word: str | None) -> float | None:
    row = find_constant("pkah", word) if word else None
    return None if row is None else row.value


def _bulk(profile: ConditionProfile, base: str | None, base_smiles: str | None) -> float | None:
    if base_smiles:
        bulk = bulk_of_smiles(base_smiles)
        if bulk is not None:
            return bulk
    if base is None:
        return None
    if profile.base_bulk in ("hindered", "unhindered"):
        return get_constant("bulk", profile.base_bulk).value
    return None


def _is_hydrogen_halide(profile: ConditionProfile, word: str | None) -> bool:
    return profile.acidity == "strong" and any(OF_ACIDS.get(c) == word for c in profile.reagent_classes & _AQUEOUS)


def _kinds(profile: ConditionProfile) -> frozenset[str]:
    kinds = set(profile.solvent_classes)
    if not kinds and profile.acidity == "strong" and profile.reagent_classes & _AQUEOUS:
        return frozenset({"protic", "water"})  # a mineral acid alone is its own aqueous medium
    if "protic" in kinds:
        kinds.discard("weakly-polar")
    return frozenset(kinds)
