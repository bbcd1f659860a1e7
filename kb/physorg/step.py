"""A step as the models see it: plain values about the centre, what may leave, and the medium.

It owns the shape of the question, no chemistry and no structure: whoever holds a molecule fills these in
(`kb.assess.published_centre`). Words are those of `kb.vocabulary`, of the reagent and solvent classes of
`kb.materials.class_names`, and of the size and activation lists below. None = not known, never a default.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.vocabulary import CarbonClass, LeavingGroup

SIZES = (
    "methyl",
    "n-alkyl",
    "sec-alkyl",
    "tert-alkyl",
    "aryl",
    "poor aryl",
    "vinyl",
    "alkynyl",
    "carbonyl",
    "halogen",
    "hetero",
)
"""What may hang on a carbon, by how it acts on an alkene in the making."""

ACTIVATIONS = (
    "benzylic",
    "allylic",
    "propargylic",
    "cyclopropyl",
    "alpha-carbonyl",
    "alpha-nitrile",
    "alpha-oxygen",
    "alpha-sulfur",
    "alpha-nitrogen",
    "alpha-halogen",
    "beta-heteroatom",
    "beta-halogen",
)
"""What stands at or beside the centre; a word is repeated where it stands more than once."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Alkene:
    """One alkene that loss of a beta hydrogen gives.

    Attributes:
        label: SMILES or a name, by which shares are added up.
        geometry: "E", "Z" or "" where there is no choice.
        cis_pairs: sizes of the groups that stand cis to each other, one pair per side; empty = none that
            clash.
    """

    label: str
    geometry: str = ""
    cis_pairs: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Neighbour:
    """A carbon beside the centre.

    Attributes:
        label: words for a person ("C3", "the methyl").
        hydrogens: on it.
        anti_hydrogens: of these, how many can stand anti-periplanar to the leaving group (drawn stereo
            decides in a six-membered ring; 0.5 = not drawn, so one face or the other).
        substituents: sizes of its other groups, the centre and hydrogen left out.
        can_be_alkene: False where the double bond would break Bredt's rule or the carbon is not sp3.
        alkenes: what loss of its hydrogen gives.
        in_small_ring: it is in a ring of three or four that the centre is not in.
    """

    label: str
    hydrogens: int = 0
    anti_hydrogens: float = 0.0
    substituents: tuple[str, ...] = ()
    can_be_alkene: bool = True
    alkenes: tuple[Alkene, ...] = ()
    in_small_ring: bool = False

    @property
    def carbons(self) -> int:
        """Return how many carbon groups it carries besides the centre."""
        return sum(s not in ("halogen", "hetero") for s in self.substituents)


@dataclass(frozen=True, slots=True, kw_only=True)
class Shift:
    """A 1,2-shift open to the cation.

    Attributes:
        migrant: "hydride", "alkyl" (methyl and others), "aryl" or "ring" (a ring grows).
        cation: what it leads to.
    """

    migrant: str
    cation: Centre


@dataclass(frozen=True, slots=True, kw_only=True)
class Centre:
    """The carbon that loses its leaving group, or a cation.

    Attributes:
        label: the skeleton, for words.
        carbon_class: see vocabulary.
        activations: words of ACTIVATIONS.
        aryl_count: aromatic rings on it.
        neighbours: its carbon neighbours that are sp3 (others are in `activations`).
        ring_size: smallest ring it is in; None = none.
        far_end_alkyl: alkyl groups at the far end of an allylic system; None = not allylic.
        is_symmetric_allyl: both ends of that system are the same, so that capture at either cannot be told
            apart.
        shifts: open to its cation.
        is_stereocentre: drawn with a configuration.
    """

    label: str = ""
    carbon_class: CarbonClass
    activations: tuple[str, ...] = ()
    aryl_count: int = 0
    neighbours: tuple[Neighbour, ...] = ()
    ring_size: int | None = None
    far_end_alkyl: int | None = None
    is_symmetric_allyl: bool = False
    shifts: tuple[Shift, ...] = ()
    is_stereocentre: bool = False

    @property
    def oxocarbenium(self) -> str | None:
        """Return the donor that makes its cation easy, or None."""
        return next((a for a in ("alpha-nitrogen", "alpha-oxygen", "alpha-sulfur") if a in self.activations), None)

    @property
    def is_stabilised(self) -> bool:
        """Return True for a benzylic, allylic or donor-substituted cation."""
        return self.oxocarbenium is not None or "benzylic" in self.activations or "allylic" in self.activations


@dataclass(frozen=True, slots=True, kw_only=True)
class Medium:
    """What is in the flask with the substrate.

    Attributes:
        nucleophile: reagent class meant as nucleophile ("azide"); None = none known.
        nucleophile_n: its Swain-Scott n where the caller knows better than the table; None = table.
        base: reagent class of the strongest base; None = none, or the nucleophile acts as such.
        base_pkah: pKaH in water where the caller knows better; None = table.
        base_bulk: 0 = unhindered, 1 = tert-butoxide; None = by class.
        base_molar, nucleophile_molar: concentrations [mol/L]; None = 1 M.
        solvent_kinds: solvent classes; empty = not known.
        solvent_y: Winstein-Grunwald Y; None = by class.
        solvent_n_t: N_T; None = by class.
        temperature_c: bath [degC]; None = not recorded (25 is then taken, and said).
        acid: "none", "weak", "strong"; None = cannot tell.
        lewis_acid: "none", "mild", "strong"; None = cannot tell.
        halophile: "silver", "mercury", "none"; None = cannot tell.
        activates_hydroxyl: a reagent turns OH into a leaving group (thionyl chloride, Mitsunobu,
            fluorination).
        is_complete: everything in the flask is known, so that "none" means none.
    """

    nucleophile: str | None = None
    nucleophile_n: float | None = None
    base: str | None = None
    base_pkah: float | None = None
    base_bulk: float | None = None
    base_molar: float | None = None
    nucleophile_molar: float | None = None
    solvent_kinds: frozenset[str] = frozenset()
    solvent_y: float | None = None
    solvent_n_t: float | None = None
    temperature_c: float | None = None
    acid: str | None = None
    lewis_acid: str | None = None
    halophile: str | None = None
    activates_hydroxyl: bool = False
    is_complete: bool = True

    @property
    def is_protic(self) -> bool | None:
        """Return whether the solvent is protic, None where it is not known."""
        if not self.solvent_kinds:
            return None
        return bool(
            self.solvent_kinds
            & {
                "protic",
                "water",
                "alcohol",
                "carboxylic_acid",
                "strong_acid",
                "fluorinated_alcohol",
                "ammonia",
            }
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Closure:
    """An attack on the centre from within the substrate.

    Attributes:
        ring_size: of the ring that forms.
        nucleophile: reagent class that the attacking atom acts as ("alkoxide").
        is_aligned: it can stand behind the leaving group; None = the drawing does not say.
        is_bridging: the new ring shares more than one bond with a ring that is there.
        ionised_log10: log10 of the part of the group that has lost its proton; 0 = all, or none to lose.
        is_asked: the scheme says that it closes; False = it only might.
        is_aside: the scheme wants something else, so that the ring is a loss.
    """

    ring_size: int
    nucleophile: str
    is_aligned: bool | None = True
    is_bridging: bool = False
    ionised_log10: float = 0.0
    is_asked: bool = False
    is_aside: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class StepFacts:
    """One step: centre, leaving group, medium, and the attack from within (None = none)."""

    centre: Centre
    leaving_group: LeavingGroup
    medium: Medium
    closure: Closure | None = None
