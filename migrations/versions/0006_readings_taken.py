"""What readings of soil water did to ledgers"""

from collections.abc import Sequence

import sqlalchemy as sa
from alembic import op

revision: str = "0006"
down_revision: str | None = "0005"
branch_labels: Sequence[str] | None = None
depends_on: Sequence[str] | None = None

FIGURES = (
    "correction_mm",
    "gain",
    "before_mm",
    "before_spread_mm",
    "reading_mm",
    "reading_spread_mm",
    "after_mm",
    "after_spread_mm",
)


def upgrade() -> None:
    op.create_table(
        "reading_taken",
        sa.Column("event_id", sa.Integer(), nullable=False),
        sa.Column("block_id", sa.Integer(), nullable=False),
        sa.Column("close", sa.Date(), nullable=False),
        *(sa.Column(name, sa.Double(), nullable=False) for name in FIGURES),
        sa.Column("why", sa.String(), nullable=False),
        sa.ForeignKeyConstraint(
            ["block_id"], ["block.id"], name=op.f("fk_reading_taken_block_id_block")
        ),
        sa.ForeignKeyConstraint(
            ["event_id"], ["event.id"], name=op.f("fk_reading_taken_event_id_event")
        ),
        sa.PrimaryKeyConstraint("event_id", name=op.f("pk_reading_taken")),
    )
    op.create_index(op.f("ix_reading_taken_block_id"), "reading_taken", ["block_id"])


def downgrade() -> None:
    op.drop_table("reading_taken")
