"""The medium: which solvents are in the flask, in what shares, and what they amount to as one liquid.

It owns the averaging. Permittivity and E_T(30) of a mixture are taken as the mean by volume, equal shares where
none are recorded: a rough figure (preferential solvation is not in it), good enough to place a run among others.
Y of aqueous alcohol, acetone and dioxane comes from the published table, between its points by straight lines;
no other mixture gets a Y, nor one whose shares are not recorded. Where several solvents are only known from a
scheme, no figure is given, because a scheme lists work-up solvents too.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from itertools import pairwise

from kb.materials.catalogue import Catalogue, Solvent, load_catalogue
from kb.materials.labels import read_label
from kb.materials.names import find_material, parse_material
from kb.materials.structural import canonical_smiles
from kb.record.component import SolventPart

IONISING_Y_FROM = -2.1  # ethanol is -2.03; the least ionising solvent in which SN1 of a tertiary halide is usual
IONISING_ET30_FROM = 50.0  # kcal/mol; propanols and above, for solvents without a Y (judgement)
IONISING_WATER_SHARE_FROM = 0.1  # share of water that makes any miscible solvent ionising (judgement)


@dataclass(frozen=True, slots=True, kw_only=True)
class Medium:
    """The solvents of one flask.

    Attributes:
        parts: (solvent, share by volume), shares adding to 1; empty = none known.
        has_unknown: a solvent is not in the catalogue, or none is recorded.
        is_from_scheme: read off a scheme, work-up solvents perhaps among them.
        has_shares: the shares are recorded; else they are taken as equal.
    """

    parts: tuple[tuple[Solvent, float], ...] = ()
    has_unknown: bool = True
    is_from_scheme: bool = False
    has_shares: bool = False

    @property
    def solvents(self) -> tuple[Solvent, ...]:
        """Return the solvents without their shares."""
        return tuple(solvent for solvent, _ in self.parts)

    @property
    def classes(self) -> frozenset[str]:
        """Return the classes of all of them together."""
        return frozenset(word for solvent in self.solvents for word in solvent.classes)

    @property
    def bp_c(self) -> float | None:
        """Return the lowest boiling point [degC]; None where any is unknown."""
        points = [s.bp_c for s in self.solvents]
        return min((p for p in points if p is not None), default=None) if None not in points else None

    @property
    def mp_c(self) -> float | None:
        """Return the melting point of a single solvent [degC]; None for mixtures."""
        return self.solvents[0].mp_c if len(self.parts) == 1 and not self.has_unknown else None

    @property
    def permittivity(self) -> float | None:
        """Return the permittivity, by volume for mixtures; None where not known."""
        return self._mean([s.permittivity for s in self.solvents])

    @property
    def et30_kcal_mol(self) -> float | None:
        """Return E_T(30) [kcal/mol], by volume for mixtures; None where not known."""
        return self._mean([s.et30_kcal_mol for s in self.solvents])

    @property
    def winstein_y(self) -> float | None:
        """Return Y of a single solvent or of a tabulated aqueous mixture; None where not known."""
        if self.has_unknown:
            return None
        if len(self.parts) == 1:
            return self.solvents[0].winstein_y
        if not self.has_shares:
            return None
        return _aqueous_y(self.parts, load_catalogue())

    @property
    def is_ionising(self) -> bool | None:
        """Return whether a tertiary halide would ionise in it; None where the solvent is not known."""
        if (y := self.winstein_y) is not None:
            return y >= IONISING_Y_FROM
        protic = sum(share for solvent, share in self.parts if solvent.is_protic and _is_ionising_alone(solvent))
        water = sum(share for solvent, share in self.parts if "water" in solvent.classes)
        if protic >= 0.5 or water >= IONISING_WATER_SHARE_FROM:
            return True
        return None if self.has_unknown else False

    def _mean(self, values: list[float | None]) -> float | None:
        known = [v for v in values if v is not None]
        if self.has_unknown or len(known) < len(values) or not known:
            return None
        if self.is_from_scheme and len(known) > 1:
            return None
        return round(sum(v * share for v, (_, share) in zip(known, self.parts, strict=True)), 2)


def medium_of(named: Iterable[SolventPart], implied: Iterable[Solvent], in_scheme: Iterable[Solvent]) -> Medium:
    """Return the medium: the solvents named, else those that a reagent came in, else those of the scheme.

    Args:
        named: recorded solvents.
        implied: solvents of reagent solutions ("4 M HCl in dioxane"); beside a named solvent they are no part of
            the medium, since how much of them there is was not recorded.
        in_scheme: solvents among the fragments of a scheme.
    """
    parts: list[tuple[Solvent, float | None]] = []
    has_unknown = False
    for part in named:
        found = solvents_in(part)
        parts += found
        has_unknown |= not found
    if parts or has_unknown:
        has_shares = bool(parts) and all(amount is not None for _, amount in parts)
        return Medium(parts=_shares(parts), has_unknown=has_unknown, has_shares=has_shares)
    for solvents, is_from_scheme in ((tuple(implied), False), (tuple(in_scheme), True)):
        if solvents:
            distinct = tuple(dict.fromkeys(solvents))
            return Medium(
                parts=_shares([(s, None) for s in distinct]), has_unknown=False, is_from_scheme=is_from_scheme
            )
    return Medium()


def solvents_in(part: SolventPart) -> list[tuple[Solvent, float | None]]:
    """Return the catalogue's solvents in one recorded part, water of "80% EtOH" or "aq. acetone" beside them."""
    catalogue = load_catalogue()
    water = catalogue.solvent_by_smiles["O"]
    match = find_material(part.name, "solvent")
    solvent = match.exact if isinstance(match.exact, Solvent) else None
    if solvent is None:
        smiles = part.smiles or part.name
        solvent = catalogue.solvent_by_smiles.get(smiles) or catalogue.solvent_by_smiles.get(
            canonical_smiles(smiles) or ""
        )
        return [(solvent, part.parts)] if solvent is not None else []
    label = read_label(part.name)
    if solvent is water or (label.percent is None and not parse_material(part.name, "solvent").is_aqueous):
        return [(solvent, part.parts)]
    share = label.percent / 100 if label.percent is not None and label.percent <= 100 else None
    if share is None:
        return [(solvent, part.parts), (water, None)]
    whole = part.parts if part.parts is not None else 1.0
    return [(solvent, whole * share), (water, whole * (1 - share))] if share < 1 else [(solvent, whole)]


def _shares(parts: list[tuple[Solvent, float | None]]) -> tuple[tuple[Solvent, float], ...]:
    """Return parts as shares that add to 1; equal shares where any part is not recorded."""
    merged: dict[Solvent, float | None] = {}
    for solvent, amount in parts:
        before = merged.get(solvent, 0.0)
        merged[solvent] = None if amount is None or before is None else before + amount
    amounts = list(merged.values())
    known = [a for a in amounts if a is not None]
    if len(known) < len(amounts) or not sum(known):
        return tuple((solvent, 1 / len(merged)) for solvent in merged)
    return tuple((solvent, amount / sum(known)) for solvent, amount in zip(merged, known, strict=True) if amount)


def _aqueous_y(parts: tuple[tuple[Solvent, float], ...], catalogue: Catalogue) -> float | None:
    """Return Y of water with one tabulated cosolvent, between the points of the table; None outside it."""
    shares = {solvent.name: share * 100 for solvent, share in parts}
    cosolvents = [name for name in shares if name != "water"]
    if "water" not in shares or len(cosolvents) != 1:
        return None
    (name,) = cosolvents
    ends = {s.name: s.winstein_y for s in catalogue.solvents if s.name in (name, "water")}
    points = list(catalogue.water_mixtures.get(name, ()))
    if not points:
        return None
    points = [(100.0, y) for y in (ends[name],) if y is not None] + points
    points += [(0.0, y) for y in (ends["water"],) if y is not None]
    for (high, y_high), (low, y_low) in pairwise(points):
        if low <= shares[name] <= high:
            return round(y_low + (y_high - y_low) * (shares[name] - low) / (high - low), 2)
    return None


def _is_ionising_alone(solvent: Solvent) -> bool:
    if solvent.winstein_y is not None:
        return solvent.winstein_y >= IONISING_Y_FROM
    return (solvent.et30_kcal_mol or 0.0) >= IONISING_ET30_FROM or "strong_acid" in solvent.classes
