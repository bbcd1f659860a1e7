"""What people type, turned into values: schemes, dates, outcomes, criteria. Shared by the front ends.

It owns the forms of entry, not their chemistry or units, which lower floors read. Every refusal names the word that
could not be read.
"""

from __future__ import annotations

import csv
import datetime as dt
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from kb.errors import ChemistryError, ImportFileError, InvalidRecord, QuantityError, StructureError
from kb.logs import tame_rdkit
from kb.plain import excerpt
from kb.record.failure_modes import parse_failure_mode
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.vocabulary import Cause, Fate, Method, Severity

if TYPE_CHECKING:
    from kb.chem.facts import Reading
    from kb.store.values import HouseRule

_FILE_ENDINGS = (".rxn", ".mol", ".sdf", ".rd", ".rdf")
LONGEST_CELL = 1_000_000
"""Longest cell that a batch reads [characters]; a scheme is never this long."""
MOST_YIELD_PCT = 200.0
"""Highest yield that is kept [%]; above 100 it is remarked on (wet product happens)."""


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


def parse_run_date(text: str) -> dt.date:
    """Read the day of a run.

    Raises:
        QuantityError: no date. InvalidRecord: a day on which no run can have been made.
    """
    return check_run_date(parse_date(text))


def check_run_date(day: dt.date) -> dt.date:
    """Return the day; see `kb.exchange.entry_rules.check_run_date`."""
    from kb.exchange import entry_rules

    return entry_rules.check_run_date(day, today())


def read_scheme(text: str, *, ignore_maps: bool = False) -> Reading:
    """Say what a scheme does; needs no book. Bad text gives `ok` False with the reason, never an exception."""
    from kb.chem.reading import read_scheme as read

    tame_rdkit()
    return read(text, ignore_maps=ignore_maps)


def scheme_from_argument(text: str) -> str:
    """Return scheme text from what was typed: reaction SMILES, SMILES, a catalogue name, or a path to RXN or mol.

    Raises:
        StructureError: a file that cannot be read, or text that is neither structure nor name; near names are offered.
    """
    tame_rdkit()
    word = text.strip()
    if word.lower().endswith(_FILE_ENDINGS):
        from kb.chem.schemefile import read_scheme_file

        return read_scheme_file(Path(word))
    if ">" in word or not word:
        return word
    from kb.chem.structure import parse_molecule

    try:
        parse_molecule(word)
    except ChemistryError as error:
        return _by_name(word, error)
    return word


def check_scheme(scheme: str) -> str:
    """Return a scheme that can be read as structures, whatever it may do.

    Raises:
        StructureError: it cannot; the sentence names the fragment.
    """
    from kb.chem.scheme import parse_scheme

    tame_rdkit()
    parse_scheme(scheme)
    return scheme


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
        InvalidRecord: an unknown fate or failure mode, a motif that is no SMARTS, or a word about something that was
            not given (a motif without a failure, a method without a share).
    """
    from kb.quantity import parse_percent

    def number(text: str | None, what: str, most: float = 100.0) -> float | None:
        return None if text is None else parse_percent(text, most, what)

    seen = [*_split_products(split, method), *_structure_products(products, scheme, method)]
    if motif is not None:
        check_motif(motif)
    if (motif is not None or cause is not None) and not failed:
        raise InvalidRecord(
            "A motif or a cause says more about a failure, and none is given.", "Give the failure mode (--failed)."
        )
    if method is not None and not seen:
        raise InvalidRecord("A method is given, and no share that it measured.", "Give --split or --product.", method)
    return Outcome(
        products=tuple(seen),
        isolated_yield_pct=number(isolated, "isolated yield", MOST_YIELD_PCT),
        assay_yield_pct=number(assay, "assay yield", MOST_YIELD_PCT),
        conversion_pct=number(conversion, "conversion"),
        ee_pct=number(ee, "ee"),
        failures=tuple(Failure(mode=parse_failure_mode(word), motif=motif, cause=cause) for word in failed),
    )


def house_rule(
    title: str, motif: str | None, when: str, severity: Severity, why: str, source: str, author: str
) -> HouseRule:
    """Build a house rule from words; its motif and condition are checked when it is tried or adopted."""
    from kb.store.values import HouseRule

    return HouseRule(
        title=title, motif=motif or "", when=when, severity=severity, why=why, source=source, author=author
    )


def _split_products(split: str | None, method: Method | None) -> list[ProductSeen]:
    from kb.exchange.cells import read_split

    return [ProductSeen(fate=fate, share=share, method=method) for fate, share in read_split(split or "")]


def _structure_products(products: Sequence[str], scheme: str, method: Method | None) -> list[ProductSeen]:
    from kb.chem.structure import canonical_smiles
    from kb.quantity import parse_percent

    if not products:
        return []
    fate_of = _fates_of_products(scheme)
    seen = []
    for text in products:
        smiles, equals, share = text.rpartition("=")
        try:
            value = parse_percent(share) / 100 if equals else None
        except QuantityError:
            smiles, value = text, None  # the last "=" was a double bond
        canonical = canonical_smiles(smiles if smiles else text)
        seen.append(ProductSeen(fate=fate_of(canonical), smiles=canonical, share=value, method=method))
    return seen


def _fates_of_products(scheme: str) -> Callable[[str], Fate]:
    """Return what tells the fate of a product [canonical SMILES]: as drawn first, then without stereo."""
    from kb.chem.structure import standardise

    reading = read_scheme(scheme)
    exact = {p.product: p.fate for p in reversed(reading.possible)}
    if reading.substrate:
        exact.setdefault(reading.substrate, Fate.UNREACTED)
    flat: dict[str, Fate] = {}

    def fate(product: str) -> Fate:
        if product in exact:
            return exact[product]
        if not flat:
            flat.update({standardise(smiles).flat_key: of for smiles, of in reversed(exact.items())})
        return flat.get(standardise(product).flat_key, Fate.OTHER)

    return fate


def check_motif(motif: str) -> str:
    """Return a motif that is SMARTS and can be searched for.

    Raises:
        InvalidRecord: it is none.
    """
    tame_rdkit()
    from kb.exchange import entry_rules

    return entry_rules.check_motif(motif)


def _by_name(word: str, error: ChemistryError) -> str:
    """Return the structure of a catalogue name; else refuse, with near names where what was typed looks like a name."""
    from kb.materials.names import find_material

    match = find_material(word)
    if match.exact is not None and match.exact.smiles:
        return match.exact.smiles
    shown = excerpt(word, 60)
    if match.exact is not None:
        raise StructureError(f"{match.exact.name} has no one structure.", "Give a SMILES.", word) from error
    if len(word) < 256 and Path(word).is_file():
        raise StructureError(f"{shown!r} is a file, but none of RXN, mol or SDF.", _FILES_HINT, word) from error
    near = list(dict.fromkeys(offer.entry.name for offer in match.offers if offer.score >= _NEAR_ENOUGH))[:3]
    if near:
        raise StructureError(
            f"{shown!r} is neither a structure nor a known name.", f"Did you mean {', '.join(near)}?", word
        ) from error
    or_name = " Or give a name that `sidepath lookup` finds." if len(word) <= _LONGEST_NAME else ""
    raise StructureError(error.message, error.hint + or_name, word) from error


_NEAR_ENOUGH = 80.0
"""Least likeness of a name that is offered where a structure was expected [0..100]."""
_LONGEST_NAME = 100
_FILES_HINT = "Give it the ending .rxn or .mol if it is; a column of schemes is for `sidepath read --batch`."
