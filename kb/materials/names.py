"""Names: text to an entry of the catalogue, exactly, by synonym, by label and, as an offer only, by likeness.

It owns the spelling rules and the ranking of near misses. It never takes a near miss on its own: `get_material`
refuses and names the nearest, `find_material` hands over the offers and marks in `near` the single one that is
close while no other is, so that a front end can ask "did you mean". That is as far as likeness goes, because
MeOH and MeSH, or NaH and NaOH, are one letter apart.

Spelling: subscripts, dashes, Greek letters, case, spaces and punctuation do not matter, unless two entries differ
only by them (PDC and Pd-C); then the exact spelling decides, and failing that both are offered.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache

from kb import kept
from kb.errors import NameUnknown
from kb.materials.catalogue import Material, Reagent, Solvent, load_catalogue
from kb.materials.labels import LONGEST_NAME, Label, plain_name, read_label

OFFERED_FROM = 60.0  # likeness 0..100 below which nothing is offered (judgement)
SHORT_OFFERED_FROM = 80.0  # likewise for texts shorter than NEAR_LENGTH: AIBN is 75 % alike BAIB (judgement)
NEAR_FROM = 86.0  # likeness from which a single offer is called near (judgement)
NEAR_LEAD = 6.0  # by how much it must lead the next one (judgement)
NEAR_LENGTH = 6  # shorter texts are formulas and abbreviations, where one letter is another compound [characters]
MOST_OFFERS = 5

_GREEK = {"α": "alpha", "β": "beta", "γ": "gamma", "δ": "delta", "ε": "epsilon", "ω": "omega"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Offer:
    """An entry offered for a text, with its likeness 0..100 and the name that was alike."""

    entry: Material
    score: float
    matched: str


@dataclass(frozen=True, slots=True, kw_only=True)
class NameMatch:
    """What a text may mean.

    Attributes:
        text: as asked.
        exact: the entry of that name, synonym or label; None = none, or several.
        offers: the nearest entries, best first; those of equal name first where the name has several.
        near: the single close offer where no other is close; None = none. For a front end to ask about.
    """

    text: str
    exact: Material | None = None
    offers: tuple[Offer, ...] = ()
    near: Material | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ParsedMaterial:
    """A label understood.

    Attributes:
        entry: the material.
        label: what else the label says.
        conc_molar: concentration [mol/L], normality turned into it; None = none given.
        solvent: the solvent it comes in; None = none named.
        is_aqueous: it brings water: said so, or customary for mineral acids and alkali with a strength.
    """

    entry: Material
    label: Label
    conc_molar: float | None = None
    solvent: Solvent | None = None
    is_aqueous: bool = False


def find_material(text: str, kind: str | None = None) -> NameMatch:
    """Return what a name may mean.

    Args:
        text: a name, synonym, abbreviation or label ("4 M HCl in dioxane").
        kind: "solvent", "reagent" or a kind of reagent ("base", "lewis acid"); None = any. Where a name is in both
            tables, the reagent is meant unless the kind says solvent.

    Returns:
        The match; `exact` None and no offers where nothing is even alike.
    """
    for name in (plain_name(text), read_label(text).name):
        found = _exact(name, kind)
        if len(found) == 1:
            return NameMatch(text=text, exact=found[0])
        if found:
            return NameMatch(text=text, offers=tuple(Offer(entry=e, score=100.0, matched=name) for e in found))
    if (split := _slash(text, kind)) is not None:
        return NameMatch(text=text, exact=split[0])
    offers = _alike(read_label(text).name, kind)
    near = None
    if offers and offers[0].score >= NEAR_FROM and len(plain_name(text)) >= NEAR_LENGTH:
        others = [o.score for o in offers[1:] if _structure(o.entry) != _structure(offers[0].entry)]
        if not others or offers[0].score - others[0] >= NEAR_LEAD:
            near = offers[0].entry
    return NameMatch(text=text, offers=offers, near=near)


def get_material(text: str, kind: str | None = None) -> Material:
    """Return the entry of that name.

    Raises:
        NameUnknown: no entry, or several; the hint lists the nearest.
    """
    match = find_material(text, kind)
    if match.exact is not None:
        return match.exact
    raise unknown_name(text, match, kind)


def unknown_name(text: str, match: NameMatch, kind: str | None = None) -> NameUnknown:
    """Return the refusal for a name that is not in the catalogue, with the nearest names in its hint."""
    what = kind if kind in ("solvent", "reagent") else f"material of kind {kind}" if kind else "material"
    shown = re.sub(r"[\x00-\x1f\x7f-\x9f]", "?", text)
    shown = shown if len(shown) <= 40 else shown[:37] + "..."
    names = list(dict.fromkeys(o.entry.name for o in match.offers))[:3]
    if names and match.offers[0].score == 100.0:
        return NameUnknown(f'"{shown}" can mean several.', f"Write {_either(names)}.", text)
    hint = f"Did you mean {_either(names)}?" if names else "Give its SMILES, or look for it with `sidepath lookup`."
    return NameUnknown(f'No {what} is called "{shown}".', hint, text)


def parse_material(text: str, kind: str | None = None) -> ParsedMaterial:
    """Return the material of a label with what the label says of strength and solvent.

    Raises:
        NameUnknown: as `get_material`.

    >>> parsed = parse_material("4 M HCl in dioxane")
    >>> parsed.entry.name, parsed.conc_molar, parsed.solvent.name, parsed.is_aqueous
    ('hydrogen chloride', 4.0, '1,4-dioxane', False)
    """
    whole = _exact(plain_name(text), kind)
    if len(whole) == 1:
        return ParsedMaterial(entry=whole[0], label=Label(text=text, name=plain_name(text)))
    label = read_label(text)
    entry = get_material(text, kind)
    solvent = _solvent(label.solvent)
    if solvent is None and (split := _slash(text, kind)) is not None:
        solvent = split[1]
    conc = label.conc_molar
    if label.normality is not None:
        conc = label.normality / _PROTONS.get(entry.name, 1)
    return ParsedMaterial(
        entry=entry,
        label=label,
        conc_molar=conc,
        solvent=solvent,
        is_aqueous=_brings_water(entry, label, solvent),
    )


def by_smiles(smiles: str, kind: str | None = None) -> Material | None:
    """Return the entry of a canonical SMILES, or None; reagents before solvents unless the kind says solvent."""
    catalogue = load_catalogue()
    found = (catalogue.reagent_by_smiles.get(smiles), catalogue.solvent_by_smiles.get(smiles))
    return next((entry for entry in found if entry is not None and _is_kind(entry, kind)), None)


_PROTONS = {
    "sulfuric acid": 2,
    "phosphoric acid": 3,
    "oxalic acid": 2,
    "barium hydroxide": 2,
    "calcium hydroxide": 2,
    "sodium carbonate": 2,
    "potassium carbonate": 2,
}
"""Equivalents in a mole, for normality."""

_AQUEOUS_WITH_STRENGTH = {
    "mineral_acid",
    "hydroxide",
    "carbonate_base",
    "phosphate_base",
    "hydrogen_peroxide",
    "hypochlorite",
    "sulfite",
    "thiosulfate",
    "ammonium_salt",
}


def _brings_water(entry: Material, label: Label, solvent: Solvent | None) -> bool:
    """Return True where water is said, or customary: "2 M NaOH", "37% HCl", "conc. HCl" (not conc. H2SO4)."""
    if label.is_aqueous or (solvent is not None and "water" in solvent.classes):
        return True
    if solvent is not None or isinstance(entry, Solvent) or (entry.name == "sulfuric acid" and label.is_concentrated):
        return False
    has_strength = label.percent is not None or label.conc_molar is not None or label.normality is not None
    return (has_strength or label.is_concentrated) and bool(entry.classes & _AQUEOUS_WITH_STRENGTH)


def _either(names: list[str]) -> str:
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} or {names[-1]}"


def _structure(entry: Material) -> str:
    return entry.smiles or entry.name


def _is_kind(entry: Material, kind: str | None) -> bool:
    if kind is None:
        return True
    return isinstance(entry, Reagent) if kind == "reagent" else kind in entry.kinds


def _loose(name: str) -> str:
    """Return the name in lower case without spaces, Greek letters spelt out."""
    folded = name.casefold()
    for letter, word in _GREEK.items():
        folded = folded.replace(letter, word)
    return folded.replace(" ", "").replace("ü", "u").replace("sulph", "sulf").replace("aluminum", "aluminium")


def _bare(name: str) -> str:
    """Return only the letters, digits and charges of the name."""
    return re.sub(r"[^a-z0-9+]", "", _loose(name))


@lru_cache(maxsize=1)
def _index() -> tuple[tuple[Material, ...], tuple[dict[str, tuple[int, ...]], ...]]:
    """Return all entries, reagents first, and name to their numbers at three strictnesses: as written, loose, bare."""
    entries = tuple(load_catalogue())
    return entries, kept.once("names", lambda: _numbered(entries))


def _numbered(entries: tuple[Material, ...]) -> tuple[dict[str, tuple[int, ...]], ...]:
    """Return the same with entries by their number."""
    levels: tuple[dict[str, list[int]], ...] = ({}, {}, {})
    for number, entry in enumerate(entries):
        for name in (entry.name, *entry.synonyms):
            for level, spell in zip(levels, (plain_name, _loose, _bare), strict=True):
                known = level.setdefault(spell(plain_name(name)), [])
                if all(entries[n] != entry for n in known):
                    known.append(number)
    return tuple({name: tuple(numbers) for name, numbers in level.items()} for level in levels)


def _exact(name: str, kind: str | None) -> list[Material]:
    """Return the entry of that name, several where the name has several meanings, none where it has none."""
    if not name or len(name) > LONGEST_NAME:
        return []
    entries, levels = _index()
    for level, spell in zip(levels, (plain_name, _loose, _bare), strict=True):
        found = [e for number in level.get(spell(name), ()) if _is_kind(e := entries[number], kind)]
        structures = {_structure(e) for e in found}
        if len(structures) == 1:
            return found[:1]
        if found:
            return found
    return []


def _slash(text: str, kind: str | None) -> tuple[Material, Solvent] | None:
    """Return (material, solvent) of "HBr/AcOH", None where the text is not of that kind."""
    name, slash, solvent_name = plain_name(text).partition("/")
    if not slash:
        return None
    found, solvent = _exact(read_label(name).name, kind), _solvent(solvent_name)
    return (found[0], solvent) if len(found) == 1 and solvent is not None else None


def _solvent(name: str | None) -> Solvent | None:
    found = _exact(read_label(name).name, "solvent") if name else []
    return found[0] if len(found) == 1 and isinstance(found[0], Solvent) else None


@lru_cache(maxsize=1)
def _spellings() -> tuple[tuple[str, ...], tuple[tuple[Material, str], ...]]:
    """Return every loose spelling, and beside it the entry and the name as listed."""
    pairs = [(_loose(plain_name(n)), (e, n)) for e in load_catalogue() for n in (e.name, *e.synonyms)]
    return tuple(p[0] for p in pairs), tuple(p[1] for p in pairs)


def _alike(name: str, kind: str | None) -> tuple[Offer, ...]:
    """Return the nearest entries by edit likeness of the whole name, best first, one offer per structure."""
    if not name or len(name) > 80:
        return ()
    from rapidfuzz import fuzz, process  # loaded when a name is not known, not by those who spell well

    spellings, owners = _spellings()
    cutoff = OFFERED_FROM if len(plain_name(name)) >= NEAR_LENGTH else SHORT_OFFERED_FROM
    hits = process.extract(_loose(name), spellings, scorer=fuzz.ratio, score_cutoff=cutoff, limit=60)
    offers: dict[str, Offer] = {}
    for _, score, position in hits:
        entry, matched = owners[position]
        if _is_kind(entry, kind):
            offers.setdefault(_structure(entry), Offer(entry=entry, score=round(score, 1), matched=matched))
    return tuple(list(offers.values())[:MOST_OFFERS])
