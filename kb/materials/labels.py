"""What a label says besides the name: "4 M HCl in dioxane", "60% NaH", "aq. NaOH", "TBAF (1 M in THF)".

It owns the wording of concentrations, qualifiers, hydrates and hydrochlorides, and knows no materials: whether the
name that is left means anything is for `names.py`. A hydrate's water is stoichiometric and not counted as water in
the flask. Normality is left as N, since only the material knows how many protons it has.
"""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass, replace

LONGEST_NAME = 300
"""A longer text is a structure or a mistake, no name [characters]."""

_NUMBER = r"(\d+(?:[.,]\d+)?)"
_QUALIFIER = re.compile(
    r"(aq|aqueous|sat|satd|sat'd|saturated|conc|concd|concentrated|dil|dilute|diluted|dry|anhydrous|anh|abs|absolute"
    r"|neat|glacial|fuming|wet|degassed|distilled|deionised|deionized|activated|powdered|solid|cat|catalytic|hot|cold"
    r"|excess|gaseous|molten|commercial|technical|fresh)\.?(?=[\s(]|$)[\s,]*",
    re.IGNORECASE,
)
_PREFIX_MOLAR = re.compile(rf"{_NUMBER}\s*(mM|M|N|mol/L)\b\.?\s*", re.IGNORECASE)
_PREFIX_PERCENT = re.compile(rf"{_NUMBER}\s*(?:wt\.?|w/w|vol\.?|v/v)?\s*%\s*(?:w/w|w/v|v/v|wt\.?)?\s*")
_SUFFIX_MOLAR = re.compile(rf"[\s,(]+{_NUMBER}\s*(mM|M|N|mol/L)\s*\)?$")
_SUFFIX_PERCENT = re.compile(rf"[\s,(]+{_NUMBER}\s*(?:wt\.?|w/w)?\s*%\s*\)?$")
_SUFFIX_STATE = re.compile(r"[\s,]*\(?\b(aq|aqueous|g|l|s|gas|solid|conc|solution|soln)\.?\)?$", re.IGNORECASE)
_IN = re.compile(r"^(.+?)[\s,(]+(?:in|solution in|soln\.? in)\s+([^()]+?)\)?$", re.IGNORECASE)
_REMARK_IN = re.compile(rf"^(.+?)\s*\(\s*{_NUMBER}\s*(mM|M|N|%)\s*(?:solution\s+)?(?:in\s+([^()]+))?\)$", re.IGNORECASE)
_HYDRATE = re.compile(
    r"(?:\s*[.·•*]\s*(?:\d+(?:[.,]\d+)?|x|n)?\s*H2O|\s+(?:hemi|mono|di|tri|tetra|penta|hexa|hepta|deca)?hydrate)$",
    re.IGNORECASE,
)
_SALT = re.compile(r"(?:\s*[.·•*]\s*(?:\d\s*)?HCl|\s+hydrochloride|\s+HCl(?:\s+salt)?)$", re.IGNORECASE)
_AQUEOUS = {"aq", "aqueous", "sat", "satd", "sat'd", "saturated", "dil", "dilute", "diluted", "wet"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Label:
    """A label taken apart.

    Attributes:
        text: as written.
        name: what is left when everything else is taken away.
        conc_molar: concentration [mol/L]; None = none given.
        normality: concentration as N; None = none given.
        percent: a percentage, of whatever it is meant [%]; None = none given.
        solvent: the text after "in"; None = none given.
        is_aqueous: the words say that there is water.
        is_concentrated, is_neat: the words say so.
        is_hydrochloride: ".HCl" or "hydrochloride" stands behind the name.
    """

    text: str
    name: str
    conc_molar: float | None = None
    normality: float | None = None
    percent: float | None = None
    solvent: str | None = None
    is_aqueous: bool = False
    is_concentrated: bool = False
    is_neat: bool = False
    is_hydrochloride: bool = False


def read_label(text: str) -> Label:
    """Return the label taken apart; a plain name comes back as its own name.

    >>> label = read_label("4 M HCl in dioxane")
    >>> label.name, label.conc_molar, label.solvent
    ('HCl', 4.0, 'dioxane')
    """
    label = Label(text=text, name=plain_name(text))
    if len(label.name) > LONGEST_NAME:
        return label
    for step in (_remark, _in_solvent, _prefixes, _suffixes, _prefixes):
        label = step(label)
    return label


def plain_name(text: str) -> str:
    """Return the text with subscripts, dashes and white space in one spelling, case kept."""
    folded = unicodedata.normalize("NFKC", text).translate(_DASHES)
    return re.sub(r"\s+", " ", folded).strip(" ,;")


_DASHES = str.maketrans({**dict.fromkeys("‐‑‒–—−", "-"), "’": "'", "′": "'", "`": "'", "∙": "·", "⋅": "·"})


def _value(text: str) -> float:
    return float(text.replace(",", "."))


def _with_strength(label: Label, number: str, unit: str) -> Label:
    value, unit = _value(number), unit.casefold()
    if unit == "n":
        return replace(label, normality=value)
    if unit == "%":
        return replace(label, percent=value)
    return replace(label, conc_molar=value / 1000 if unit == "mm" else value)


def _remark(label: Label) -> Label:
    """Take "(2 M in THF)" off the end."""
    found = _REMARK_IN.match(label.name)
    if not found:
        return label
    label = _with_strength(replace(label, name=found[1].strip()), found[2], found[3])
    return replace(label, solvent=found[4].strip()) if found[4] else label


def _in_solvent(label: Label) -> Label:
    """Take "in dioxane" off the end, with the strength that may stand there ("HCl 4 M in dioxane")."""
    found = _IN.match(label.name)
    if not found or label.solvent:
        return label
    return replace(label, name=found[1].strip(" ("), solvent=found[2].strip())


def _prefixes(label: Label) -> Label:
    """Take strengths and qualifying words off the front, over and over."""
    while True:
        name = label.name
        if (found := _PREFIX_MOLAR.match(name)) and found.end() < len(name):
            label = _with_strength(replace(label, name=name[found.end() :]), found[1], found[2])
        elif (found := _PREFIX_PERCENT.match(name)) and found.end() < len(name):
            label = _with_strength(replace(label, name=name[found.end() :]), found[1], "%")
        elif (found := _QUALIFIER.match(name)) and found.end() < len(name):
            word = found[1].casefold()
            label = replace(
                label,
                name=name[found.end() :],
                is_aqueous=label.is_aqueous or word in _AQUEOUS,
                is_concentrated=label.is_concentrated or word.startswith("conc"),
                is_neat=label.is_neat or word in ("neat", "glacial"),
            )
        else:
            return replace(label, name=name.strip(" ,;"))


def _suffixes(label: Label) -> Label:
    """Take strengths, states, hydrates and hydrochlorides off the end, over and over."""
    while True:
        name = label.name
        if (found := _SUFFIX_MOLAR.search(name)) and found.start():
            label = _with_strength(replace(label, name=name[: found.start()]), found[1], found[2])
        elif (found := _SUFFIX_PERCENT.search(name)) and found.start():
            label = _with_strength(replace(label, name=name[: found.start()]), found[1], "%")
        elif (found := _HYDRATE.search(name)) and found.start():
            label = replace(label, name=name[: found.start()])
        elif (found := _SALT.search(name)) and found.start():
            label = replace(label, name=name[: found.start()], is_hydrochloride=True)
        elif (found := _SUFFIX_STATE.search(name)) and found.start() and found[0].strip() != found[1]:
            label = replace(
                label,
                name=name[: found.start()],
                is_aqueous=label.is_aqueous or found[1].casefold() in _AQUEOUS,
                is_concentrated=label.is_concentrated or found[1].casefold() == "conc",
            )
        elif (found := re.search(r"\s+(aq\.?|aqueous|gas|solution|soln\.?)$", name, re.IGNORECASE)) and found.start():
            label = replace(
                label, name=name[: found.start()], is_aqueous=label.is_aqueous or found[1].casefold().startswith("aq")
            )
        else:
            return replace(label, name=name.strip(" ,;"))
