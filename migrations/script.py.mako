"""${message}.

What a chemist would notice:

It defines its own tables and never imports the program. Add the revision to SCHEMA_REVISIONS and to the list at the top
of kb/store/rows.py, and a data test to tests/store/test_migrations.py.

Revision ID: ${up_revision}
Revises: ${down_revision | comma,n}
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op
${imports if imports else ""}

revision = ${repr(up_revision)}
down_revision = ${repr(down_revision)}
branch_labels = ${repr(branch_labels)}
depends_on = ${repr(depends_on)}


def upgrade() -> None:
    """Say what changes."""
    ${upgrades if upgrades else "pass"}


def downgrade() -> None:
    """Say what is taken back."""
    ${downgrades if downgrades else "pass"}
