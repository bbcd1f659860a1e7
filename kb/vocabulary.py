"""The controlled words: what the contract, the tables, the files and the screens all call things.

It owns words only, no rules. Every enumeration is a StrEnum whose value is the word as written in JSON and in
the database; a value once released is never renamed, only added to. Failure modes are data
(`kb/data/failure_modes.toml`) since groups ask for more of them.
"""

from __future__ import annotations

from enum import StrEnum


class Fate(StrEnum):
    """What the substrate became."""

    SUBSTITUTION = "substitution"
    ELIMINATION = "elimination"
    REARRANGED = "rearranged"
    TRANSPOSED = "transposed"
    GROUP_LOSS = "group-loss"
    ADDITION = "addition"
    UNREACTED = "unreacted"
    OTHER = "other"


class CarbonClass(StrEnum):
    """The carbon where the bond breaks, by carbon neighbours and situation."""

    METHYL = "methyl"
    PRIMARY = "primary"
    SECONDARY = "secondary"
    TERTIARY = "tertiary"
    BRIDGEHEAD = "bridgehead"
    VINYL = "vinyl"
    ARYL = "aryl"


class CentreFlag(StrEnum):
    """What stands beside the centre and changes its behaviour."""

    ALLYLIC = "allylic"
    BENZYLIC = "benzylic"
    PROPARGYLIC = "propargylic"
    ALPHA_CARBONYL = "alpha-carbonyl"
    ALPHA_HETEROATOM = "alpha-heteroatom"
    BETA_BRANCHED = "beta-branched"
    NEOPENTYL = "neopentyl"
    RING = "ring"
    SMALL_RING = "small-ring"
    HOMOBENZYLIC = "homobenzylic"


class LeavingGroup(StrEnum):
    """What departs with the pair of electrons (hydroxyl and alkoxide after activation)."""

    FLUORIDE = "fluoride"
    CHLORIDE = "chloride"
    BROMIDE = "bromide"
    IODIDE = "iodide"
    MESYLATE = "mesylate"
    TOSYLATE = "tosylate"
    TRIFLATE = "triflate"
    SULFONATE = "sulfonate"
    SULFATE = "sulfate"
    PHOSPHATE = "phosphate"
    CARBOXYLATE = "carboxylate"
    HYDROXYL = "hydroxyl"
    ALKOXIDE = "alkoxide"
    EPOXIDE = "epoxide"
    AMMONIUM = "ammonium"
    SULFONIUM = "sulfonium"
    DIAZONIUM = "diazonium"
    NITRO = "nitro"
    OTHER = "other"


class Confidence(StrEnum):
    """How a scheme was read: product matched, no product so inferred, or not resolved."""

    MATCHED = "matched"
    INFERRED = "inferred"
    UNRESOLVED = "unresolved"


class Verdict(StrEnum):
    """What the chemist said of the run."""

    WORKED = "worked"
    PARTLY = "partly"
    FAILED = "failed"


class Severity(StrEnum):
    """How much a finding matters; ordered by `rank`."""

    NOTE = "note"
    CAUTION = "caution"
    SERIOUS = "serious"

    @property
    def rank(self) -> int:
        """Return 0 for note, 1 for caution, 2 for serious."""
        return ("note", "caution", "serious").index(self.value)


class FindingKind(StrEnum):
    """Where a finding comes from."""

    LIABILITY = "liability"
    RESEMBLANCE = "resemblance"
    HOUSE_RULE = "house-rule"
    CAUTION = "caution"
    DATA = "data"


class Role(StrEnum):
    """What a component does in the flask."""

    SUBSTRATE = "substrate"
    REAGENT = "reagent"
    BASE = "base"
    ACID = "acid"
    ADDITIVE = "additive"
    SOLVENT = "solvent"
    PRODUCT = "product"


class Method(StrEnum):
    """How a share or a yield was measured."""

    NMR = "nmr"
    GC = "gc"
    HPLC = "hplc"
    ISOLATED = "isolated"


class Cause(StrEnum):
    """How sure the chemist is of the reason for a failure."""

    SUSPECTED = "suspected"
    CONFIRMED = "confirmed"


class Basis(StrEnum):
    """What a figure rests on."""

    RECORD = "record"
    PUBLISHED = "published"
    BOTH = "both"
    NONE = "none"
