"""What a scheme says, as plain facts: the centre, the leaving group, the nucleophile, the fates that are possible.

Only frozen values live here, no RDKit objects, so that every floor above and both front ends can hold them.
Atom numbers are 0-based positions in the component *as it was entered*; `component` is the 0-based position of
the fragment on the left side (reactants first, then agents), counted as it was entered, fragments split at dots.
An atom map is reported whenever the entry carried one, even when maps were ignored for reading.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from kb.showing import ShowsItself
from kb.vocabulary import CarbonClass, CentreFlag, Confidence, Fate, LeavingGroup


@dataclass(frozen=True, slots=True, kw_only=True)
class Centre:
    """The carbon where the bond breaks (or, for an addition, forms).

    Attributes:
        component: which left-side fragment holds it.
        atom: its index in that fragment.
        atom_map: the map number as entered; None = not mapped.
        carbon_class: class by carbon neighbours; bridgehead, vinyl and aryl win over the count.
        leaving_group: what departs; None for an addition.
        leaving_atom: the departing atom bonded to the centre; None for an addition.
        leaving_atom_map: its map number; None = not mapped.
        flags: activation and hindrance, in vocabulary order.
        beta_hydrogens: hydrogens on sp3 carbons beside the centre.
        is_stereocentre: the centre was drawn with a configuration.
    """

    component: int
    atom: int
    atom_map: int | None = None
    carbon_class: CarbonClass
    leaving_group: LeavingGroup | None = None
    leaving_atom: int | None = None
    leaving_atom_map: int | None = None
    flags: tuple[CentreFlag, ...] = ()
    beta_hydrogens: int = 0
    is_stereocentre: bool = False

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "component": self.component,
            "atom": self.atom,
            "atom_map": self.atom_map,
            "carbon_class": str(self.carbon_class),
            "leaving_group": str(self.leaving_group) if self.leaving_group else None,
            "leaving_atom": self.leaving_atom,
            "leaving_atom_map": self.leaving_atom_map,
            "flags": [str(f) for f in self.flags],
            "beta_hydrogens": self.beta_hydrogens,
            "is_stereocentre": self.is_stereocentre,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class NucleophileFact:
    """The atom that bonds to the centre, and its class (`azide`, `amine`, `phenoxide`, `thiolate`, `enolate`...)."""

    component: int
    atom: int
    atom_map: int | None = None
    nucleophile_class: str

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "component": self.component,
            "atom": self.atom,
            "atom_map": self.atom_map,
            "class": self.nucleophile_class,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class PossibleFate:
    """One thing that could form.

    Attributes:
        fate: its word.
        product: canonical SMILES of the product.
        note: plain words for how ("loss of HBr towards C3, E").
    """

    fate: Fate
    product: str
    note: str = ""

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {"fate": str(self.fate), "product": self.product, "note": self.note}


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading(ShowsItself):
    """What a scheme does.

    Attributes:
        scheme: as entered.
        ok: False when the text is no usable scheme; `reason` says why.
        confidence: matched (a stated product was found among the possible ones), inferred (no product stated),
            unresolved (could not tell; never a guess).
        fate: what became of the substrate; None when unresolved or when no product was stated and several could form.
        centres: reacting centres, the principal one first; empty when unresolved.
        nucleophile: what bonds to the principal centre; None for eliminations and losses.
        possible: everything that was enumerated, the stated product's entry first when matched.
        reason: plain words: why this reading, or why none.
        substrate: canonical SMILES of the component that holds the principal centre; None when unresolved.
        stereo: what became of a configuration drawn at the principal centre on both sides: `inversion`, `retention`,
            `scrambled` (both epimers stated), `impossible` (no displacement can do it from there); empty = not drawn,
            or nothing can be said.
    """

    scheme: str
    ok: bool
    confidence: Confidence
    fate: Fate | None = None
    centres: tuple[Centre, ...] = ()
    nucleophile: NucleophileFact | None = None
    possible: tuple[PossibleFate, ...] = ()
    reason: str = ""
    substrate: str | None = None
    stereo: str = ""

    @property
    def centre(self) -> Centre | None:
        """Return the principal centre, or None."""
        return self.centres[0] if self.centres else None

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "scheme": self.scheme,
            "ok": self.ok,
            "confidence": str(self.confidence),
            "fate": str(self.fate) if self.fate else None,
            "centres": [c.as_dict() for c in self.centres],
            "nucleophile": self.nucleophile.as_dict() if self.nucleophile else None,
            "possible": [p.as_dict() for p in self.possible],
            "reason": self.reason,
            "substrate": self.substrate,
            "stereo": self.stereo,
        }
