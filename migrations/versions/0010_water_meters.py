"""Water meters, the fields they feed, and their readings"""

from collections.abc import Sequence

import sqlalchemy as sa
from alembic import op

revision: str = "0010"
down_revision: str | None = "0009"
branch_labels: Sequence[str] | None = None
depends_on: Sequence[str] | None = None


def upgrade() -> None:
    op.create_table(
        "meter",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("key", sa.String(), nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.Column("farm_id", sa.Integer(), nullable=False),
        sa.Column("unit", sa.String(), nullable=False),
        sa.Column("multiplier", sa.Double(), nullable=False),
        sa.Column("rolls_over_at", sa.Double(), nullable=True),
        sa.ForeignKeyConstraint(["farm_id"], ["farm.id"], name=op.f("fk_meter_farm_id_farm")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_meter")),
        sa.UniqueConstraint("key", name=op.f("uq_meter_key")),
    )
    op.create_index(op.f("ix_meter_farm_id"), "meter", ["farm_id"])
    op.create_table(
        "meter_field",
        sa.Column("field_id", sa.Integer(), nullable=False),
        sa.Column("meter_id", sa.Integer(), nullable=False),
        sa.ForeignKeyConstraint(
            ["field_id"], ["field.id"], name=op.f("fk_meter_field_field_id_field")
        ),
        sa.ForeignKeyConstraint(
            ["meter_id"], ["meter.id"], name=op.f("fk_meter_field_meter_id_meter")
        ),
        sa.PrimaryKeyConstraint("field_id", name=op.f("pk_meter_field")),
    )
    op.create_index(op.f("ix_meter_field_meter_id"), "meter_field", ["meter_id"])
    op.create_table(
        "meter_reading",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("meter_id", sa.Integer(), nullable=False),
        sa.Column("kind", sa.String(), nullable=False),
        sa.Column("day", sa.Date(), nullable=False),
        sa.Column("register", sa.Double(), nullable=False),
        sa.Column("restarts", sa.Boolean(), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("who", sa.String(), nullable=False),
        sa.Column("entered", sa.DateTime(), nullable=False),
        sa.Column("supersedes", sa.Integer(), nullable=True),
        sa.Column("origin", sa.String(), nullable=False),
        sa.ForeignKeyConstraint(
            ["meter_id"], ["meter.id"], name=op.f("fk_meter_reading_meter_id_meter")
        ),
        sa.ForeignKeyConstraint(
            ["supersedes"],
            ["meter_reading.id"],
            name=op.f("fk_meter_reading_supersedes_meter_reading"),
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_meter_reading")),
        sa.UniqueConstraint("origin", name=op.f("uq_meter_reading_origin")),
        sa.UniqueConstraint("supersedes", name=op.f("uq_meter_reading_supersedes")),
    )
    op.create_index(op.f("ix_meter_reading_meter_id"), "meter_reading", ["meter_id"])


def downgrade() -> None:
    op.drop_table("meter_reading")
    op.drop_table("meter_field")
    op.drop_table("meter")
