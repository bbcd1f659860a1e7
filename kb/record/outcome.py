"""What came out: products seen, the split between fates, yields, and how the failure went.

Shares are molar, 0..1. None = not recorded, 0 = looked for and not there. A split that does not add up is kept as
written; the data findings of a check say so.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.errors import InvalidRecord
from kb.vocabulary import Cause, Fate, Method


@dataclass(frozen=True, slots=True, kw_only=True)
class ProductSeen:
    """One product that was looked for.

    Attributes:
        smiles: canonical SMILES; None where only its fate is known ("some alkene").
        fate: what it means for the substrate.
        share: molar share 0..1; None = seen but not measured.
        share_low, share_high: bounds of the 80 % interval, where the method gave one.
        method: how measured.
        protons: protons counted by the integral; None = not by NMR.
    """

    fate: Fate
    smiles: str | None = None
    share: float | None = None
    share_low: float | None = None
    share_high: float | None = None
    method: Method | None = None
    protons: int | None = None

    def __post_init__(self) -> None:
        for what in ("share", "share_low", "share_high"):
            value = getattr(self, what)
            if value is not None and not 0 <= value <= 1:
                raise InvalidRecord(
                    f"{what} of {self.fate} is {value:g}.", "Shares lie between 0 and 1 (0 and 100 %).", value
                )


@dataclass(frozen=True, slots=True, kw_only=True)
class Failure:
    """One way in which the run disappointed.

    Attributes:
        mode: a word of `kb/data/failure_modes.toml`.
        motif: SMARTS of what was hit; None = not stated.
        cause: suspected or confirmed; None = not stated.
    """

    mode: str
    motif: str | None = None
    cause: Cause | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Outcome:
    """Everything measured.

    Attributes:
        products: what was seen, in the order given; several may share a fate.
        isolated_yield_pct, assay_yield_pct, conversion_pct, ee_pct: percent. Yields over 100 are kept (wet
            product happens) up to 200; a data finding says so.
        dr: as written ("4:1").
        failures: controlled words with motif and cause.
    """

    products: tuple[ProductSeen, ...] = ()
    isolated_yield_pct: float | None = None
    assay_yield_pct: float | None = None
    conversion_pct: float | None = None
    ee_pct: float | None = None
    dr: str | None = None
    failures: tuple[Failure, ...] = ()

    def __post_init__(self) -> None:
        limits = {"isolated_yield_pct": 200, "assay_yield_pct": 200, "conversion_pct": 100, "ee_pct": 100}
        for what, top in limits.items():
            value = getattr(self, what)
            if value is not None and not 0 <= value <= top:
                raise InvalidRecord(f"{what} is {value:g}.", f"It lies between 0 and {top}.", value)

    @property
    def split(self) -> dict[Fate, float]:
        """Return molar shares summed by fate, unmeasured products left out; empty = nothing measured."""
        shares: dict[Fate, float] = {}
        for product in self.products:
            if product.share is not None:
                shares[product.fate] = shares.get(product.fate, 0.0) + product.share
        return shares

    @property
    def yield_pct(self) -> float | None:
        """Return the isolated yield, else the assay yield, else None [%]."""
        return self.isolated_yield_pct if self.isolated_yield_pct is not None else self.assay_yield_pct
