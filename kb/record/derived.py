"""Facts worked out from a run, kept beside it so that a check need not read 100,000 schemes again.

They are made by one recipe (`kb.store.derivation`), stored with its name, and thrown away when the recipe changes:
never edited, never exported. Everything a similarity needs is here as plain values.
"""

from __future__ import annotations

from dataclasses import dataclass
from uuid import UUID

CENTRE_BITS = 256
"""Width of the rooted environment fingerprint [bits]."""


@dataclass(frozen=True, slots=True, kw_only=True)
class DerivedFacts:
    """One run, read.

    Attributes:
        run_id: whose facts.
        recipe: name and versions of what made them.
        confidence, fate, carbon_class, leaving_group, nucleophile_class: controlled words; None = not read.
        flags: sorted words joined by commas.
        beta_hydrogens: see `Centre`; None = no centre.
        is_stereocentre: the centre was drawn with a configuration.
        substrate: canonical SMILES of the component with the centre; None = not read.
        centre_atom: the centre in `substrate` (canonical atom order of that SMILES); None = no centre.
        centre_bits: rooted Morgan environment, CENTRE_BITS / 8 bytes; None = no centre.
        base_pkah, swain_scott_n: see `ConditionProfile`.
        base_bulk, acidity, lewis_acid, halophile: words of the profile; None = cannot tell.
        protic: the solvent mixture holds a protic solvent; None = not known.
        permittivity, et30_kcal_mol, winstein_y, temperature_c, time_h: of the profile; None = not recorded.
        profile_json: the whole profile, for rules.
    """

    run_id: UUID
    recipe: str
    confidence: str
    fate: str | None = None
    carbon_class: str | None = None
    leaving_group: str | None = None
    nucleophile_class: str | None = None
    flags: str = ""
    beta_hydrogens: int | None = None
    is_stereocentre: bool = False
    substrate: str | None = None
    centre_atom: int | None = None
    centre_bits: bytes | None = None
    base_pkah: float | None = None
    base_bulk: str | None = None
    swain_scott_n: float | None = None
    acidity: str | None = None
    lewis_acid: str | None = None
    halophile: str | None = None
    protic: bool | None = None
    permittivity: float | None = None
    et30_kcal_mol: float | None = None
    winstein_y: float | None = None
    temperature_c: float | None = None
    time_h: float | None = None
    profile_json: str = "{}"
