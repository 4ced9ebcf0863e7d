"""Shared supplies, and the fields that hang on them"""

from collections.abc import Sequence

import sqlalchemy as sa
from alembic import op

revision: str = "0011"
down_revision: str | None = "0010"
branch_labels: Sequence[str] | None = None
depends_on: Sequence[str] | None = None


def upgrade() -> None:
    op.create_table(
        "supply",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("key", sa.String(), nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.Column("details", sa.JSON(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_supply")),
        sa.UniqueConstraint("key", name=op.f("uq_supply_key")),
    )
    op.create_table(
        "supply_field",
        sa.Column("field_id", sa.Integer(), nullable=False),
        sa.Column("supply_id", sa.Integer(), nullable=False),
        sa.ForeignKeyConstraint(
            ["field_id"], ["field.id"], name=op.f("fk_supply_field_field_id_field")
        ),
        sa.ForeignKeyConstraint(
            ["supply_id"], ["supply.id"], name=op.f("fk_supply_field_supply_id_supply")
        ),
        sa.PrimaryKeyConstraint("field_id", name=op.f("pk_supply_field")),
    )
    op.create_index(op.f("ix_supply_field_supply_id"), "supply_field", ["supply_id"])


def downgrade() -> None:
    op.drop_table("supply_field")
    op.drop_table("supply")
