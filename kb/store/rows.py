"""The tables of a book: one mapped class per table, and the schema revisions so far.

It owns names, types, keys and indices. It holds no rule of the record (those are checked in `kb.record`) and
no SQL. Classes end in `Row`; they and their rows never leave this floor. The one table that is no class, the
word index, belongs to `words.py` since it differs between engines. Migrations define their own tables and
never import this file; a test compares the two.

Invariants
    run         one row per experiment, its standing content; never deleted. Children are keyed by (run_key,
                position) and keep the order in which they were given. NULL = not recorded, 0 = measured zero.
    history     append-only: what was done to a run, by whom, when, why. `entry_id` is the SHA-256 of the
                entry and its parents, the same in every book; `chain` is the SHA-256 of the previous row's
                chain and this entry, so that an edited, removed or reordered row is noticed.
    facts, structure, run_structure   derived: made by a recipe, thrown away when it changes.
    run_key, structure_id, seq        local to one book; `run_id` (UUID) is the identity everywhere.

Units are in the column names; moments are UTC; controlled words are stored as the words of `kb.vocabulary`;
`temperature_between_c` is a JSON list of numbers.

Schema revisions (migrations/versions)
    0001    the baseline.
"""

from __future__ import annotations

import datetime as dt
from uuid import UUID

import sqlalchemy as sa
from sqlalchemy.orm import DeclarativeBase, Mapped, mapped_column

from kb.store.form import SCHEMA_HEAD, SCHEMA_REVISIONS

__all__ = ["SCHEMA_HEAD", "SCHEMA_REVISIONS"]

NAMING = {
    "ix": "ix_%(column_0_label)s",
    "uq": "uq_%(table_name)s_%(column_0_N_name)s",
    "ck": "ck_%(table_name)s_%(constraint_name)s",
    "fk": "fk_%(table_name)s_%(column_0_N_name)s_%(referred_table_name)s",
    "pk": "pk_%(table_name)s",
}


class Moment(sa.types.TypeDecorator[dt.datetime]):
    """A moment in UTC: aware in Python, naive UTC in engines that keep no zone (SQLite)."""

    impl = sa.DateTime(timezone=True)
    cache_ok = True

    def process_bind_param(self, value: dt.datetime | None, dialect: sa.Dialect) -> dt.datetime | None:
        """Return the moment as the engine keeps it."""
        if value is None:
            return None
        moment = value.astimezone(dt.UTC)
        return moment.replace(tzinfo=None) if dialect.name == "sqlite" else moment

    def process_result_value(self, value: dt.datetime | None, dialect: sa.Dialect) -> dt.datetime | None:
        """Return the moment, aware, in UTC."""
        if value is None:
            return None
        return value.replace(tzinfo=dt.UTC) if value.tzinfo is None else value.astimezone(dt.UTC)


class Row(DeclarativeBase):
    """Base of all mapped classes."""

    metadata = sa.MetaData(naming_convention=NAMING)
    type_annotation_map = {str: sa.Text, float: sa.Double, dt.datetime: Moment, bytes: sa.LargeBinary}  # noqa: RUF012


def _run_key(*, primary: bool = True) -> Mapped[int]:
    return mapped_column(sa.ForeignKey("run.run_key"), primary_key=primary, autoincrement=False)


COUNT = sa.Integer().with_variant(sa.BigInteger(), "postgresql")
"""A number that comes from elsewhere and may be large; SQLite's integers are large anyway."""


class MetaRow(Row):
    """Facts about the book itself: UUID, when it was made, a counter of changes, the tip of the history."""

    __tablename__ = "meta"
    name: Mapped[str] = mapped_column(primary_key=True)
    value: Mapped[str]


class EventRow(Row):
    """Something that was done to the book as a whole: made, migrated, merged with another. Append-only."""

    __tablename__ = "event"
    event_id: Mapped[int] = mapped_column(primary_key=True)
    at: Mapped[dt.datetime]
    who: Mapped[str]
    action: Mapped[str]
    detail: Mapped[str]


class RunRow(Row):
    """One experiment as it stands now."""

    __tablename__ = "run"
    run_key: Mapped[int] = mapped_column(primary_key=True)
    run_id: Mapped[UUID] = mapped_column(unique=True)
    code: Mapped[str] = mapped_column(unique=True)
    code_number: Mapped[int] = mapped_column(index=True)
    scheme: Mapped[str]
    verdict: Mapped[str | None] = mapped_column(index=True)
    note: Mapped[str]
    by_initials: Mapped[str | None]
    run_date: Mapped[dt.date | None] = mapped_column(index=True)
    reference: Mapped[str | None]
    project: Mapped[str | None] = mapped_column(index=True)
    series: Mapped[str | None]
    temperature_text: Mapped[str | None]
    temperature_start_c: Mapped[float | None]
    temperature_between_c: Mapped[str | None]
    temperature_end_c: Mapped[float | None]
    is_reflux: Mapped[bool]
    time_text: Mapped[str | None]
    time_h: Mapped[float | None]
    conc_molar: Mapped[float | None]
    scale_mmol: Mapped[float | None]
    atmosphere: Mapped[str | None]
    vessel: Mapped[str | None]
    workup: Mapped[str | None]
    isolated_yield_pct: Mapped[float | None]
    assay_yield_pct: Mapped[float | None]
    conversion_pct: Mapped[float | None]
    ee_pct: Mapped[float | None]
    dr: Mapped[str | None]
    recorded_at: Mapped[dt.datetime]
    revision: Mapped[int] = mapped_column(COUNT)
    withdrawn_why: Mapped[str | None]
    has_conflict: Mapped[bool]


class ComponentRow(Row):
    """One reagent, base, acid or additive of a run."""

    __tablename__ = "component"
    run_key: Mapped[int] = _run_key()
    position: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    role: Mapped[str]
    name: Mapped[str]
    smiles: Mapped[str | None] = mapped_column(index=True)
    equiv: Mapped[float | None]
    amount_mmol: Mapped[float | None]
    mass_mg: Mapped[float | None]
    volume_ml: Mapped[float | None]
    conc_molar: Mapped[float | None]
    loading_mol_pct: Mapped[float | None]


class SolventRow(Row):
    """One solvent of a run."""

    __tablename__ = "solvent"
    run_key: Mapped[int] = _run_key()
    position: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    name: Mapped[str]
    smiles: Mapped[str | None] = mapped_column(index=True)
    parts: Mapped[float | None]


class ProductSeenRow(Row):
    """One product that was looked for."""

    __tablename__ = "product_seen"
    run_key: Mapped[int] = _run_key()
    position: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    fate: Mapped[str]
    smiles: Mapped[str | None]
    share: Mapped[float | None]
    share_low: Mapped[float | None]
    share_high: Mapped[float | None]
    method: Mapped[str | None]
    protons: Mapped[int | None] = mapped_column(sa.BigInteger)


class FailureRow(Row):
    """One way in which a run disappointed."""

    __tablename__ = "failure"
    run_key: Mapped[int] = _run_key()
    position: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    mode: Mapped[str] = mapped_column(index=True)
    motif: Mapped[str | None]
    cause: Mapped[str | None]


class AttachmentRow(Row):
    """A file named by a run; the bytes are in `attachment_blob` once they were brought along."""

    __tablename__ = "attachment"
    run_key: Mapped[int] = _run_key()
    position: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    name: Mapped[str]
    sha256: Mapped[str] = mapped_column(index=True)
    size_bytes: Mapped[int] = mapped_column(sa.BigInteger)


class AttachmentBlobRow(Row):
    """The bytes of a file, once, whoever names it."""

    __tablename__ = "attachment_blob"
    sha256: Mapped[str] = mapped_column(primary_key=True)
    content: Mapped[bytes]


class HistoryRow(Row):
    """One entry of the append-only history."""

    __tablename__ = "history"
    __table_args__ = ({"sqlite_autoincrement": True},)
    seq: Mapped[int] = mapped_column(primary_key=True)
    entry_id: Mapped[str] = mapped_column(unique=True)
    run_id: Mapped[UUID] = mapped_column(sa.ForeignKey("run.run_id"), index=True)
    revision: Mapped[int] = mapped_column(COUNT)
    action: Mapped[str]
    who: Mapped[str]
    at: Mapped[dt.datetime]
    why: Mapped[str]
    parents: Mapped[str]
    changed: Mapped[str]
    after: Mapped[str]
    book_id: Mapped[UUID]
    received_at: Mapped[dt.datetime | None]
    chain: Mapped[str]


class RecipeRow(Row):
    """A name of what made derived facts or structures."""

    __tablename__ = "recipe"
    recipe_id: Mapped[int] = mapped_column(primary_key=True)
    name: Mapped[str] = mapped_column(unique=True)


class FactsRow(Row):
    """The derived facts of one run (`kb.record.derived`)."""

    __tablename__ = "facts"
    run_key: Mapped[int] = _run_key()
    recipe_id: Mapped[int] = mapped_column(sa.ForeignKey("recipe.recipe_id"), index=True)
    confidence: Mapped[str]
    fate: Mapped[str | None]
    carbon_class: Mapped[str | None] = mapped_column(index=True)
    leaving_group: Mapped[str | None] = mapped_column(index=True)
    nucleophile_class: Mapped[str | None]
    flags: Mapped[str]
    beta_hydrogens: Mapped[int | None]
    is_stereocentre: Mapped[bool]
    substrate: Mapped[str | None]
    centre_atom: Mapped[int | None]
    centre_bits: Mapped[bytes | None]
    base_pkah: Mapped[float | None]
    base_bulk: Mapped[str | None]
    swain_scott_n: Mapped[float | None]
    acidity: Mapped[str | None]
    lewis_acid: Mapped[str | None]
    halophile: Mapped[str | None]
    protic: Mapped[bool | None]
    permittivity: Mapped[float | None]
    et30_kcal_mol: Mapped[float | None]
    winstein_y: Mapped[float | None]
    temperature_c: Mapped[float | None]
    time_h: Mapped[float | None]
    profile_json: Mapped[str]


class StructureRow(Row):
    """One structure of the book, once, with what the search index wants of it."""

    __tablename__ = "structure"
    structure_id: Mapped[int] = mapped_column(primary_key=True)
    smiles: Mapped[str] = mapped_column(unique=True)
    recipe_id: Mapped[int | None] = mapped_column(sa.ForeignKey("recipe.recipe_id"))
    mol_binary: Mapped[bytes | None]
    augmented: Mapped[bytes | None]
    pattern: Mapped[bytes | None]
    morgan: Mapped[bytes | None]


class RunStructureRow(Row):
    """Where a structure stands in a run: role, and position among those of that role."""

    __tablename__ = "run_structure"
    run_key: Mapped[int] = _run_key()
    role: Mapped[str] = mapped_column(primary_key=True)
    position: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    structure_id: Mapped[int] = mapped_column(sa.ForeignKey("structure.structure_id"), index=True)


class HouseRuleRow(Row):
    """A liability that this group wrote down. Never edited: retired, with the reason, and written anew."""

    __tablename__ = "house_rule"
    rule_id: Mapped[str] = mapped_column(primary_key=True)
    title: Mapped[str]
    motif: Mapped[str]
    when_text: Mapped[str]
    severity: Mapped[str]
    why: Mapped[str]
    source: Mapped[str]
    author: Mapped[str]
    created_at: Mapped[dt.datetime]
    retired_at: Mapped[dt.datetime | None]
    retired_by: Mapped[str | None]
    retired_why: Mapped[str | None]


class AcknowledgementRow(Row):
    """Somebody saw a finding and went on, with the reason."""

    __tablename__ = "acknowledgement"
    acknowledgement_id: Mapped[UUID] = mapped_column(primary_key=True)
    finding_id: Mapped[str] = mapped_column(index=True)
    about: Mapped[str] = mapped_column(index=True)
    who: Mapped[str]
    why: Mapped[str]
    at: Mapped[dt.datetime]


class DraftRow(Row):
    """An entry form as it was last left; not part of the record, so no history."""

    __tablename__ = "draft"
    draft_id: Mapped[str] = mapped_column(primary_key=True)
    updated_at: Mapped[dt.datetime]
    content: Mapped[str]
