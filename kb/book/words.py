"""What people type, turned into values: schemes, dates, outcomes, criteria. Shared by the front ends.

It owns the forms of entry, not their chemistry or units, which lower floors read. Every refusal names the word that
could not be read.
"""

from __future__ import annotations

import csv
import datetime as dt
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from kb.errors import ChemistryError, ImportFileError, InvalidRecord, QuantityError, StructureError
from kb.logs import tame_rdkit
from kb.record.failure_modes import parse_failure_mode
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.vocabulary import Cause, Fate, Method, Severity

if TYPE_CHECKING:
    from kb.chem.facts import Reading
    from kb.store.values import HouseRule

_FILE_ENDINGS = (".rxn", ".mol", ".sdf", ".rd", ".rdf")
LONGEST_CELL = 1_000_000
"""Longest cell that a batch reads [characters]; a scheme is never this long."""


def today() -> dt.date:
    """Return the local day."""
    return dt.date.today()


def parse_date(text: str) -> dt.date:
    """Read an ISO day.

    Raises:
        QuantityError: anything else.
    """
    try:
        return dt.date.fromisoformat(text.strip())
    except ValueError:
        raise QuantityError(f"{text!r} is no date.", "Write it as 2026-03-09.", text) from None


def read_scheme(text: str, *, ignore_maps: bool = False) -> Reading:
    """Say what a scheme does; needs no book. Bad text gives `ok` False with the reason, never an exception."""
    from kb.chem.reading import read_scheme as read

    tame_rdkit()
    return read(text, ignore_maps=ignore_maps)


def scheme_from_argument(text: str) -> str:
    """Return scheme text from what was typed: reaction SMILES, SMILES, a catalogue name, or a path to RXN or mol.

    Raises:
        StructureError: a file that cannot be read, or text that is neither structure nor name.
    """
    tame_rdkit()
    word = text.strip()
    if word.lower().endswith(_FILE_ENDINGS):
        from kb.chem.schemefile import read_scheme_file

        return read_scheme_file(Path(word))
    from kb.chem.structure import canonical_smiles

    if ">" in word or not word:
        return word
    try:
        canonical_smiles(word)
    except ChemistryError as error:
        smiles = _by_name(word)
        if smiles is None:
            hint = "Check brackets, ring closures and valences, or give a catalogue name (`sidepath lookup`)."
            raise StructureError(
                f"{error.message if isinstance(error, StructureError) else error}", hint, word
            ) from error
        return smiles
    return word


def iter_scheme_column(path: str, column: str) -> Iterator[str]:
    """Yield one column of a CSV file, row by row, without reading it whole.

    Raises:
        ImportFileError: no such file or column, or not text.
    """
    try:
        csv.field_size_limit(LONGEST_CELL)
        with Path(path).open(encoding="utf-8-sig", newline="") as handle:
            rows = csv.DictReader(handle)
            if column not in (rows.fieldnames or ()):
                found = ", ".join((rows.fieldnames or ["nothing"])[:12])
                raise ImportFileError(f"{path} has no column {column!r}.", f"It has: {found}.", column)
            for row in rows:
                yield row[column] or ""
    except FileNotFoundError:
        raise ImportFileError(f"There is no file {path}.", "Check the path.", path) from None
    except (UnicodeDecodeError, csv.Error) as error:
        raise ImportFileError(f"{path} cannot be read as CSV: {error}.", "Save it as UTF-8 CSV.", path) from error


def outcome_from_words(
    *,
    scheme: str,
    split: str | None,
    method: Method | None,
    isolated: str | None,
    assay: str | None,
    conversion: str | None,
    ee: str | None,
    products: Sequence[str],
    failed: Sequence[str],
    motif: str | None,
    cause: Cause | None,
) -> Outcome:
    """Build an outcome from the flags of `record`.

    Args:
        scheme: used to tell the fate of a product given by structure.
        split: "substitution=88,elimination=10", percent.
        products: "SMILES=SHARE" each, percent.
        others: as their flags.

    Raises:
        QuantityError: a number that cannot be read.
        InvalidRecord: an unknown fate or failure mode, or a motif that is no SMARTS.
    """
    from kb.quantity import parse_percent

    def number(text: str | None) -> float | None:
        return None if text is None else parse_percent(text)

    seen = [*_split_products(split, method), *_structure_products(products, scheme, method)]
    if motif is not None:
        _check_smarts(motif)
    return Outcome(
        products=tuple(seen),
        isolated_yield_pct=number(isolated),
        assay_yield_pct=number(assay),
        conversion_pct=number(conversion),
        ee_pct=number(ee),
        failures=tuple(Failure(mode=parse_failure_mode(word), motif=motif, cause=cause) for word in failed),
    )


def parse_fate(text: str) -> Fate:
    """Return the fate of a word.

    Raises:
        InvalidRecord: not a fate; the hint names the nearest or all of them.
    """
    word = "-".join(text.strip().lower().replace("_", "-").split())
    try:
        return Fate(word)
    except ValueError:
        from rapidfuzz import process

        near = process.extractOne(word, list(map(str, Fate)), score_cutoff=60)
        hint = f"Did you mean {near[0]}?" if near else f"Use one of: {', '.join(Fate)}."
        raise InvalidRecord(f"{text!r} is no fate.", hint, text) from None


def house_rule(
    title: str, motif: str | None, when: str, severity: Severity, why: str, source: str, author: str
) -> HouseRule:
    """Build a house rule from words; its motif and condition are checked when it is tried or adopted."""
    from kb.store.values import HouseRule

    return HouseRule(
        title=title, motif=motif or "", when=when, severity=severity, why=why, source=source, author=author
    )


def _split_products(split: str | None, method: Method | None) -> list[ProductSeen]:
    from kb.quantity import parse_percent

    seen = []
    for part in (split or "").replace(";", ",").split(","):
        if not part.strip():
            continue
        word, equals, share = part.partition("=")
        if not equals:
            raise QuantityError(
                f"{part.strip()!r} has no share.", "Write the split as substitution=88,elimination=10.", part
            )
        seen.append(ProductSeen(fate=parse_fate(word), share=parse_percent(share) / 100, method=method))
    return seen


def _structure_products(products: Sequence[str], scheme: str, method: Method | None) -> list[ProductSeen]:
    from kb.chem.structure import canonical_smiles
    from kb.quantity import parse_percent

    if not products:
        return []
    possible = {p.product: p.fate for p in reversed(read_scheme(scheme).possible)}
    seen = []
    for text in products:
        smiles, equals, share = text.rpartition("=")
        try:
            value = parse_percent(share) / 100 if equals else None
        except QuantityError:
            smiles, value = text, None  # the last "=" was a double bond
        canonical = canonical_smiles(smiles if smiles else text)
        seen.append(ProductSeen(fate=possible.get(canonical, Fate.OTHER), smiles=canonical, share=value, method=method))
    return seen


def _check_smarts(motif: str) -> None:
    from rdkit import Chem

    if Chem.MolFromSmarts(motif) is None:
        raise InvalidRecord(f"The motif {motif!r} is no SMARTS.", "Check brackets and ring closures.", motif)


def _by_name(word: str) -> str | None:
    from kb.materials.names import find_material

    match = find_material(word)
    return match.exact.smiles or None if match.exact is not None else None
