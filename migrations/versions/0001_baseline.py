"""The baseline: every table of a record book.

What a chemist would notice: this is the first form of a book, there was none before.

It defines its own tables and never imports the program, so that it makes the same book whatever the program becomes.
A test compares the result with the tables of the program.

Revision ID: 0001
Revises: none
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

WORD_VIEW = """CREATE VIEW run_text AS SELECT run.run_key AS run_key, run.note AS note,
    coalesce((SELECT group_concat(name, ' ') FROM
      (SELECT name FROM component c WHERE c.run_key = run.run_key ORDER BY position)), '') || ' ' ||
    coalesce((SELECT group_concat(name, ' ') FROM
      (SELECT name FROM solvent s WHERE s.run_key = run.run_key ORDER BY position)), '') AS materials,
    coalesce((SELECT group_concat(mode, ' ') FROM
      (SELECT mode FROM failure f WHERE f.run_key = run.run_key ORDER BY position)), '') AS failures,
    coalesce(run.reference, '') || ' ' || coalesce(run.project, '') || ' ' || coalesce(run.series, '') || ' ' ||
    coalesce(run.by_initials, '') || ' ' || coalesce(run.workup, '') || ' ' || coalesce(run.vessel, '') || ' ' ||
    coalesce(run.atmosphere, '') || ' ' || coalesce(run.temperature_text, '') || ' ' ||
    coalesce(run.time_text, '') AS labels, run.scheme AS scheme FROM run"""

WORD_INDEX = """CREATE VIRTUAL TABLE run_words USING fts5(note, materials, failures, labels, scheme, content='run_text',
    content_rowid='run_key', tokenize='unicode61 remove_diacritics 2')"""

SERVER_WORD_VIEW = """CREATE VIEW run_text AS SELECT run.run_key AS run_key, run.note AS note,
    coalesce((SELECT string_agg(name, ' ' ORDER BY position) FROM component c WHERE c.run_key = run.run_key), '')
    || ' ' ||
    coalesce((SELECT string_agg(name, ' ' ORDER BY position) FROM solvent s WHERE s.run_key = run.run_key), '')
    AS materials,
    coalesce((SELECT string_agg(mode, ' ' ORDER BY position) FROM failure f WHERE f.run_key = run.run_key), '')
    AS failures,
    concat_ws(' ', run.reference, run.project, run.series, run.by_initials, run.workup, run.vessel, run.atmosphere,
    run.temperature_text, run.time_text) AS labels, run.scheme AS scheme FROM run"""

SERVER_WORD_INDEX = """CREATE TABLE run_words (run_key INTEGER NOT NULL CONSTRAINT pk_run_words PRIMARY KEY
    CONSTRAINT fk_run_words_run_key_run REFERENCES run (run_key), words TSVECTOR NOT NULL)"""

WORDS_OF = {
    "sqlite": (WORD_VIEW, WORD_INDEX),
    "postgresql": (
        SERVER_WORD_VIEW,
        SERVER_WORD_INDEX,
        "CREATE INDEX ix_run_words_words ON run_words USING gin (words)",
    ),
}
"""The word index, which every engine makes in its own way."""

TABLES = (
    "run_structure",
    "structure",
    "solvent",
    "product_seen",
    "history",
    "failure",
    "facts",
    "component",
    "attachment",
    "run",
    "recipe",
    "meta",
    "house_rule",
    "draft",
    "event",
    "attachment_blob",
    "acknowledgement",
)
"""All tables, children before their parents."""


def upgrade() -> None:
    op.create_table(
        "acknowledgement",
        sa.Column("acknowledgement_id", sa.Uuid(), nullable=False),
        sa.Column("finding_id", sa.Text(), nullable=False),
        sa.Column("about", sa.Text(), nullable=False),
        sa.Column("who", sa.Text(), nullable=False),
        sa.Column("why", sa.Text(), nullable=False),
        sa.Column("at", sa.DateTime(timezone=True), nullable=False),
        sa.PrimaryKeyConstraint("acknowledgement_id", name="pk_acknowledgement"),
    )
    op.create_index("ix_acknowledgement_about", "acknowledgement", ["about"], unique=False)
    op.create_index("ix_acknowledgement_finding_id", "acknowledgement", ["finding_id"], unique=False)

    op.create_table(
        "attachment_blob",
        sa.Column("sha256", sa.Text(), nullable=False),
        sa.Column("content", sa.LargeBinary(), nullable=False),
        sa.PrimaryKeyConstraint("sha256", name="pk_attachment_blob"),
    )
    op.create_table(
        "draft",
        sa.Column("draft_id", sa.Text(), nullable=False),
        sa.Column("updated_at", sa.DateTime(timezone=True), nullable=False),
        sa.Column("content", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("draft_id", name="pk_draft"),
    )
    op.create_table(
        "event",
        sa.Column("event_id", sa.Integer(), nullable=False),
        sa.Column("at", sa.DateTime(timezone=True), nullable=False),
        sa.Column("who", sa.Text(), nullable=False),
        sa.Column("action", sa.Text(), nullable=False),
        sa.Column("detail", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("event_id", name="pk_event"),
    )
    op.create_table(
        "house_rule",
        sa.Column("rule_id", sa.Text(), nullable=False),
        sa.Column("title", sa.Text(), nullable=False),
        sa.Column("motif", sa.Text(), nullable=False),
        sa.Column("when_text", sa.Text(), nullable=False),
        sa.Column("severity", sa.Text(), nullable=False),
        sa.Column("why", sa.Text(), nullable=False),
        sa.Column("source", sa.Text(), nullable=False),
        sa.Column("author", sa.Text(), nullable=False),
        sa.Column("created_at", sa.DateTime(timezone=True), nullable=False),
        sa.Column("retired_at", sa.DateTime(timezone=True), nullable=True),
        sa.Column("retired_by", sa.Text(), nullable=True),
        sa.Column("retired_why", sa.Text(), nullable=True),
        sa.PrimaryKeyConstraint("rule_id", name="pk_house_rule"),
    )
    op.create_table(
        "meta",
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("value", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("name", name="pk_meta"),
    )
    op.create_table(
        "recipe",
        sa.Column("recipe_id", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("recipe_id", name="pk_recipe"),
        sa.UniqueConstraint("name", name="uq_recipe_name"),
    )
    op.create_table(
        "run",
        sa.Column("run_key", sa.Integer(), nullable=False),
        sa.Column("run_id", sa.Uuid(), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("code_number", sa.Integer(), nullable=False),
        sa.Column("scheme", sa.Text(), nullable=False),
        sa.Column("verdict", sa.Text(), nullable=True),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("by_initials", sa.Text(), nullable=True),
        sa.Column("run_date", sa.Date(), nullable=True),
        sa.Column("reference", sa.Text(), nullable=True),
        sa.Column("project", sa.Text(), nullable=True),
        sa.Column("series", sa.Text(), nullable=True),
        sa.Column("temperature_text", sa.Text(), nullable=True),
        sa.Column("temperature_start_c", sa.Double(), nullable=True),
        sa.Column("temperature_between_c", sa.Text(), nullable=True),
        sa.Column("temperature_end_c", sa.Double(), nullable=True),
        sa.Column("is_reflux", sa.Boolean(), nullable=False),
        sa.Column("time_text", sa.Text(), nullable=True),
        sa.Column("time_h", sa.Double(), nullable=True),
        sa.Column("conc_molar", sa.Double(), nullable=True),
        sa.Column("scale_mmol", sa.Double(), nullable=True),
        sa.Column("atmosphere", sa.Text(), nullable=True),
        sa.Column("vessel", sa.Text(), nullable=True),
        sa.Column("workup", sa.Text(), nullable=True),
        sa.Column("isolated_yield_pct", sa.Double(), nullable=True),
        sa.Column("assay_yield_pct", sa.Double(), nullable=True),
        sa.Column("conversion_pct", sa.Double(), nullable=True),
        sa.Column("ee_pct", sa.Double(), nullable=True),
        sa.Column("dr", sa.Text(), nullable=True),
        sa.Column("recorded_at", sa.DateTime(timezone=True), nullable=False),
        sa.Column("revision", sa.Integer().with_variant(sa.BigInteger(), "postgresql"), nullable=False),
        sa.Column("withdrawn_why", sa.Text(), nullable=True),
        sa.Column("has_conflict", sa.Boolean(), nullable=False),
        sa.PrimaryKeyConstraint("run_key", name="pk_run"),
        sa.UniqueConstraint("code", name="uq_run_code"),
        sa.UniqueConstraint("run_id", name="uq_run_run_id"),
    )
    op.create_index("ix_run_code_number", "run", ["code_number"], unique=False)
    op.create_index("ix_run_project", "run", ["project"], unique=False)
    op.create_index("ix_run_run_date", "run", ["run_date"], unique=False)
    op.create_index("ix_run_verdict", "run", ["verdict"], unique=False)

    op.create_table(
        "attachment",
        sa.Column("run_key", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("position", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("sha256", sa.Text(), nullable=False),
        sa.Column("size_bytes", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(["run_key"], ["run.run_key"], name="fk_attachment_run_key_run"),
        sa.PrimaryKeyConstraint("run_key", "position", name="pk_attachment"),
    )
    op.create_index("ix_attachment_sha256", "attachment", ["sha256"], unique=False)

    op.create_table(
        "component",
        sa.Column("run_key", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("position", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("role", sa.Text(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("smiles", sa.Text(), nullable=True),
        sa.Column("equiv", sa.Double(), nullable=True),
        sa.Column("amount_mmol", sa.Double(), nullable=True),
        sa.Column("mass_mg", sa.Double(), nullable=True),
        sa.Column("volume_ml", sa.Double(), nullable=True),
        sa.Column("conc_molar", sa.Double(), nullable=True),
        sa.Column("loading_mol_pct", sa.Double(), nullable=True),
        sa.ForeignKeyConstraint(["run_key"], ["run.run_key"], name="fk_component_run_key_run"),
        sa.PrimaryKeyConstraint("run_key", "position", name="pk_component"),
    )
    op.create_index("ix_component_smiles", "component", ["smiles"], unique=False)

    op.create_table(
        "facts",
        sa.Column("run_key", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("recipe_id", sa.Integer(), nullable=False),
        sa.Column("confidence", sa.Text(), nullable=False),
        sa.Column("fate", sa.Text(), nullable=True),
        sa.Column("carbon_class", sa.Text(), nullable=True),
        sa.Column("leaving_group", sa.Text(), nullable=True),
        sa.Column("nucleophile_class", sa.Text(), nullable=True),
        sa.Column("flags", sa.Text(), nullable=False),
        sa.Column("beta_hydrogens", sa.Integer(), nullable=True),
        sa.Column("is_stereocentre", sa.Boolean(), nullable=False),
        sa.Column("substrate", sa.Text(), nullable=True),
        sa.Column("centre_atom", sa.Integer(), nullable=True),
        sa.Column("centre_bits", sa.LargeBinary(), nullable=True),
        sa.Column("base_pkah", sa.Double(), nullable=True),
        sa.Column("base_bulk", sa.Text(), nullable=True),
        sa.Column("swain_scott_n", sa.Double(), nullable=True),
        sa.Column("acidity", sa.Text(), nullable=True),
        sa.Column("lewis_acid", sa.Text(), nullable=True),
        sa.Column("halophile", sa.Text(), nullable=True),
        sa.Column("protic", sa.Boolean(), nullable=True),
        sa.Column("permittivity", sa.Double(), nullable=True),
        sa.Column("et30_kcal_mol", sa.Double(), nullable=True),
        sa.Column("winstein_y", sa.Double(), nullable=True),
        sa.Column("temperature_c", sa.Double(), nullable=True),
        sa.Column("time_h", sa.Double(), nullable=True),
        sa.Column("profile_json", sa.Text(), nullable=False),
        sa.ForeignKeyConstraint(["recipe_id"], ["recipe.recipe_id"], name="fk_facts_recipe_id_recipe"),
        sa.ForeignKeyConstraint(["run_key"], ["run.run_key"], name="fk_facts_run_key_run"),
        sa.PrimaryKeyConstraint("run_key", name="pk_facts"),
    )
    op.create_index("ix_facts_carbon_class", "facts", ["carbon_class"], unique=False)
    op.create_index("ix_facts_leaving_group", "facts", ["leaving_group"], unique=False)
    op.create_index("ix_facts_recipe_id", "facts", ["recipe_id"], unique=False)

    op.create_table(
        "failure",
        sa.Column("run_key", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("position", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("mode", sa.Text(), nullable=False),
        sa.Column("motif", sa.Text(), nullable=True),
        sa.Column("cause", sa.Text(), nullable=True),
        sa.ForeignKeyConstraint(["run_key"], ["run.run_key"], name="fk_failure_run_key_run"),
        sa.PrimaryKeyConstraint("run_key", "position", name="pk_failure"),
    )
    op.create_index("ix_failure_mode", "failure", ["mode"], unique=False)

    op.create_table(
        "history",
        sa.Column("seq", sa.Integer(), nullable=False),
        sa.Column("entry_id", sa.Text(), nullable=False),
        sa.Column("run_id", sa.Uuid(), nullable=False),
        sa.Column("revision", sa.Integer().with_variant(sa.BigInteger(), "postgresql"), nullable=False),
        sa.Column("action", sa.Text(), nullable=False),
        sa.Column("who", sa.Text(), nullable=False),
        sa.Column("at", sa.DateTime(timezone=True), nullable=False),
        sa.Column("why", sa.Text(), nullable=False),
        sa.Column("parents", sa.Text(), nullable=False),
        sa.Column("changed", sa.Text(), nullable=False),
        sa.Column("after", sa.Text(), nullable=False),
        sa.Column("book_id", sa.Uuid(), nullable=False),
        sa.Column("received_at", sa.DateTime(timezone=True), nullable=True),
        sa.Column("chain", sa.Text(), nullable=False),
        sa.ForeignKeyConstraint(["run_id"], ["run.run_id"], name="fk_history_run_id_run"),
        sa.PrimaryKeyConstraint("seq", name="pk_history"),
        sa.UniqueConstraint("entry_id", name="uq_history_entry_id"),
        sqlite_autoincrement=True,
    )
    op.create_index("ix_history_run_id", "history", ["run_id"], unique=False)

    op.create_table(
        "product_seen",
        sa.Column("run_key", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("position", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("fate", sa.Text(), nullable=False),
        sa.Column("smiles", sa.Text(), nullable=True),
        sa.Column("share", sa.Double(), nullable=True),
        sa.Column("share_low", sa.Double(), nullable=True),
        sa.Column("share_high", sa.Double(), nullable=True),
        sa.Column("method", sa.Text(), nullable=True),
        sa.Column("protons", sa.BigInteger(), nullable=True),
        sa.ForeignKeyConstraint(["run_key"], ["run.run_key"], name="fk_product_seen_run_key_run"),
        sa.PrimaryKeyConstraint("run_key", "position", name="pk_product_seen"),
    )
    op.create_table(
        "solvent",
        sa.Column("run_key", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("position", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("smiles", sa.Text(), nullable=True),
        sa.Column("parts", sa.Double(), nullable=True),
        sa.ForeignKeyConstraint(["run_key"], ["run.run_key"], name="fk_solvent_run_key_run"),
        sa.PrimaryKeyConstraint("run_key", "position", name="pk_solvent"),
    )
    op.create_index("ix_solvent_smiles", "solvent", ["smiles"], unique=False)

    op.create_table(
        "structure",
        sa.Column("structure_id", sa.Integer(), nullable=False),
        sa.Column("smiles", sa.Text(), nullable=False),
        sa.Column("recipe_id", sa.Integer(), nullable=True),
        sa.Column("mol_binary", sa.LargeBinary(), nullable=True),
        sa.Column("augmented", sa.LargeBinary(), nullable=True),
        sa.Column("pattern", sa.LargeBinary(), nullable=True),
        sa.Column("morgan", sa.LargeBinary(), nullable=True),
        sa.ForeignKeyConstraint(["recipe_id"], ["recipe.recipe_id"], name="fk_structure_recipe_id_recipe"),
        sa.PrimaryKeyConstraint("structure_id", name="pk_structure"),
        sa.UniqueConstraint("smiles", name="uq_structure_smiles"),
    )
    op.create_table(
        "run_structure",
        sa.Column("run_key", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("role", sa.Text(), nullable=False),
        sa.Column("position", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("structure_id", sa.Integer(), nullable=False),
        sa.ForeignKeyConstraint(["run_key"], ["run.run_key"], name="fk_run_structure_run_key_run"),
        sa.ForeignKeyConstraint(
            ["structure_id"], ["structure.structure_id"], name="fk_run_structure_structure_id_structure"
        ),
        sa.PrimaryKeyConstraint("run_key", "role", "position", name="pk_run_structure"),
    )
    op.create_index("ix_run_structure_structure_id", "run_structure", ["structure_id"], unique=False)
    for statement in WORDS_OF[op.get_bind().dialect.name]:
        op.execute(statement)


def downgrade() -> None:
    """Take the tables away again; refused while a run is kept in them."""
    if op.get_bind().execute(sa.text("SELECT count(*) FROM run")).scalar():
        raise RuntimeError("the book holds runs; the baseline is not taken away from under them")
    op.execute("DROP TABLE run_words")
    op.execute("DROP VIEW run_text")
    for table in TABLES:
        op.drop_table(table)
