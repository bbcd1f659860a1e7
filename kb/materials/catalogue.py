"""The catalogue: solvents and reagents with their published properties and the source of each row.

It owns the two kinds of entry and their loading from `kb/data/*.csv`; names are looked up in `names.py`, and what
a set of conditions amounts to is worked out in `classes.py`. It never imports RDKit: the SMILES in the files are
canonical already, which a test checks. A liquid that acts as well as dissolves (acetic acid, pyridine, methanol)
stands in both tables under the same SMILES: the solvent row says what it is as a medium, the reagent row what it
does.

Units: degC, kcal/mol for E_T(30), g/mL, pKa in water. Values are from memory of the named source unless a test
compares them with a library; None = not published or not known to us, never zero.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from functools import lru_cache
from pathlib import Path
from types import MappingProxyType

from kb import kept
from kb.materials.class_names import add_wider

DATA = Path(__file__).resolve().parents[1] / "data"

POLAR_FROM = 15.0  # permittivity at and above which an aprotic solvent counts as polar (common practice)
NONPOLAR_BELOW = 5.0  # and below which it counts as nonpolar (common practice)


@kept.slim
@dataclass(frozen=True, slots=True, kw_only=True)
class Solvent:
    """One solvent.

    Attributes:
        name: the name shown.
        synonyms: other names, as chemists write them.
        smiles: canonical SMILES.
        cas_rn: CAS registry number.
        bp_c, mp_c: boiling point at 1 atm and melting point [degC].
        permittivity: relative permittivity of the liquid [1] at permittivity_t_c.
        permittivity_t_c: its temperature [degC].
        is_protic: gives hydrogen bonds through O-H or N-H.
        classes: words of `SOLVENT_CLASSES`, the coarse word included.
        et30_kcal_mol: Reichardt's E_T(30).
        winstein_y: Grunwald-Winstein Y (tert-butyl chloride, 25 degC).
        density_g_ml: density at density_t_c.
        density_t_c: its temperature [degC].
        water_miscible: "yes", "partly" or "no" at room temperature.
        source: where the row comes from.
    """

    name: str
    synonyms: tuple[str, ...]
    smiles: str
    cas_rn: str | None
    bp_c: float | None
    mp_c: float | None
    permittivity: float | None
    permittivity_t_c: float | None
    is_protic: bool
    classes: frozenset[str]
    et30_kcal_mol: float | None
    winstein_y: float | None
    density_g_ml: float | None
    density_t_c: float | None
    water_miscible: str
    source: str

    @property
    def kinds(self) -> frozenset[str]:
        """Return {"solvent"}, so that every entry can be asked for its kinds."""
        return frozenset({"solvent"})


@kept.slim
@dataclass(frozen=True, slots=True, kw_only=True)
class Reagent:
    """One reagent.

    Attributes:
        name: the name shown.
        synonyms: other names, as chemists write them.
        smiles: canonical SMILES, salts as ions; None for a mixture or a polymer.
        cas_rn: CAS registry number.
        kinds: what it is used as: base, acid, lewis acid, nucleophile, halophile, activator, oxidant...
        classes: words of `REAGENT_CLASSES`, wider words included.
        pkah: pKa of its conjugate acid in water; None = no base. Above 16 and below 0 extrapolated.
        bulk: "unhindered" or "hindered" as a base; None = no base.
        acidity: "none", "weak" or "strong" as a Bronsted acid.
        pka: its own pKa in water, where it can give a proton; None = not known.
        lewis: "none", "mild" or "strong" as a Lewis acid.
        nucleophile: "none", "weak" or "good" towards sp3 carbon (common practice; n is the measured scale).
        hydride: "none", "mild" or "strong" as a hydride reductant (strong: reduces esters).
        swain_scott_n: Swain-Scott n (methyl bromide, water).
        mayr_n, mayr_sn: Mayr's nucleophilicity and its sensitivity.
        alkoxy: canonical SMILES of the alcohol whose alkoxide it is or gives.
        source: where the row comes from.
    """

    name: str
    synonyms: tuple[str, ...] = ()
    smiles: str | None = None
    cas_rn: str | None = None
    kinds: frozenset[str] = frozenset()
    classes: frozenset[str] = frozenset()
    pkah: float | None = None
    bulk: str | None = None
    acidity: str = "none"
    pka: float | None = None
    lewis: str = "none"
    nucleophile: str = "none"
    hydride: str = "none"
    swain_scott_n: float | None = None
    mayr_n: float | None = None
    mayr_sn: float | None = None
    alkoxy: str | None = None
    source: str = ""


Material = Solvent | Reagent
_Tables = tuple[
    tuple[Solvent, ...], tuple[Reagent, ...], dict[str, Reagent], dict[str, tuple[tuple[float, float], ...]]
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Catalogue:
    """Everything in the files.

    Attributes:
        solvents, reagents: in file order.
        ions: what single ions of a salt do, by canonical SMILES; salts in a scheme come apart like that.
        solvent_by_smiles, reagent_by_smiles: first entry of each structure.
        water_mixtures: cosolvent name to ((cosolvent volume %, Y), ...), falling in volume %.
    """

    solvents: tuple[Solvent, ...]
    reagents: tuple[Reagent, ...]
    ions: MappingProxyType[str, Reagent]
    solvent_by_smiles: MappingProxyType[str, Solvent] = field(repr=False)
    reagent_by_smiles: MappingProxyType[str, Reagent] = field(repr=False)
    water_mixtures: MappingProxyType[str, tuple[tuple[float, float], ...]] = field(repr=False)

    def __iter__(self) -> Iterator[Material]:
        """Yield reagents, then solvents."""
        yield from self.reagents
        yield from self.solvents


@lru_cache(maxsize=1)
def load_catalogue() -> Catalogue:
    """Return the catalogue, read once for the life of the program (about 20 ms, 5 where it was kept)."""
    solvents, reagents, ions, mixtures = kept.once("catalogue", _read_tables)
    by_smiles: dict[str, Reagent] = {}
    for reagent in reagents:
        if reagent.smiles:
            by_smiles.setdefault(reagent.smiles, reagent)
    return Catalogue(
        solvents=solvents,
        reagents=reagents,
        ions=MappingProxyType(ions),
        solvent_by_smiles=MappingProxyType({s.smiles: s for s in reversed(solvents)}),
        reagent_by_smiles=MappingProxyType(by_smiles),
        water_mixtures=MappingProxyType(mixtures),
    )


def _read_tables() -> _Tables:
    """Return solvents, reagents, ions and mixtures out of the files."""
    solvents = tuple(_solvent(row) for row in _rows("solvents.csv"))
    reagents = tuple(_reagent(row) for row in _rows("reagents.csv"))
    mixtures: dict[str, list[tuple[float, float]]] = {}
    for row in _rows("solvent_mixtures.csv"):
        mixtures.setdefault(row["cosolvent"], []).append(
            (float(row["cosolvent_vol_pct"]), float(row["winstein_y"]))
        )
    return solvents, reagents, _ions(reagents), {k: tuple(sorted(v, reverse=True)) for k, v in mixtures.items()}


def _ions(reagents: tuple[Reagent, ...]) -> dict[str, Reagent]:
    """Return single ions: those listed, then the active ion of each salt that has just one (azide of NaN3)."""
    ions = {r.smiles: r for r in (_reagent(row) for row in _rows("ions.csv")) if r.smiles}
    inert = {smiles for smiles, ion in ions.items() if ion.kinds == {"counter-ion"}}
    onium = {s for s, ion in ions.items() if ion.classes & {"quaternary_ammonium", "ammonium_salt"}}
    for counter_ions in (inert, inert | onium):  # sodium acetate speaks for acetate, not ammonium acetate
        for reagent in reagents:
            parts = set((reagent.smiles or "").split("."))
            active = parts - counter_ions
            if len(active) == 1 and len(parts) > 1:
                (ion,) = active
                if "-]" in ion or "+]" in ion:
                    ions.setdefault(ion, replace(reagent, name=_without_cation(reagent.name)))
    return ions


def _without_cation(name: str) -> str:
    """Return "azide" for "sodium azide": an ion of a scheme may have come with another cation."""
    first, _, rest = name.partition(" ")
    return rest if rest and first in {"lithium", "sodium", "potassium", "cesium", "magnesium"} else name


def _rows(name: str) -> Iterator[dict[str, str]]:
    import csv

    with (DATA / name).open(encoding="utf-8", newline="") as lines:
        yield from csv.DictReader(lines)


def _number(text: str) -> float | None:
    return float(text) if text else None


def _words(text: str) -> tuple[str, ...]:
    return tuple(word for word in text.split("|") if word)


def _solvent(row: dict[str, str]) -> Solvent:
    is_protic, permittivity = row["protic"] == "yes", _number(row["permittivity"])
    coarse = {"protic"} if is_protic else set()
    if not is_protic and permittivity is not None:
        coarse = {
            "polar-aprotic"
            if permittivity >= POLAR_FROM
            else "nonpolar"
            if permittivity < NONPOLAR_BELOW
            else "weakly-polar"
        }
    return Solvent(
        name=row["name"],
        synonyms=_words(row["synonyms"]),
        smiles=row["smiles"],
        cas_rn=row["cas_rn"] or None,
        bp_c=_number(row["bp_c"]),
        mp_c=_number(row["mp_c"]),
        permittivity=permittivity,
        permittivity_t_c=_number(row["permittivity_t_c"]),
        is_protic=is_protic,
        classes=frozenset(_words(row["classes"])) | coarse,
        et30_kcal_mol=_number(row["et30_kcal_mol"]),
        winstein_y=_number(row["winstein_y"]),
        density_g_ml=_number(row["density_g_ml"]),
        density_t_c=_number(row["density_t_c"]),
        water_miscible=row["water_miscible"],
        source=row["source"],
    )


def _reagent(row: dict[str, str]) -> Reagent:
    return Reagent(
        name=row["name"],
        synonyms=_words(row["synonyms"]),
        smiles=row["smiles"] or None,
        cas_rn=row["cas_rn"] or None,
        kinds=frozenset(_words(row["kinds"])),
        classes=add_wider(_words(row["classes"])),
        pkah=_number(row["pkah"]),
        bulk=row["bulk"] or None,
        acidity=row["acidity"],
        pka=_number(row["pka"]),
        lewis=row["lewis"],
        nucleophile=row["nucleophile"],
        hydride=row["hydride"],
        swain_scott_n=_number(row["swain_scott_n"]),
        mayr_n=_number(row["mayr_n"]),
        mayr_sn=_number(row["mayr_sn"]),
        alkoxy=row["alkoxy"] or None,
        source=row["source"],
    )
