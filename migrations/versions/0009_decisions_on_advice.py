"""The advisor's decisions on advice"""

from collections.abc import Sequence

import sqlalchemy as sa
from alembic import op

revision: str = "0009"
down_revision: str | None = "0008"
branch_labels: Sequence[str] | None = None
depends_on: Sequence[str] | None = None


def upgrade() -> None:
    op.create_table(
        "decision",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("block_id", sa.Integer(), nullable=False),
        sa.Column("number", sa.Integer(), nullable=False),
        sa.Column("verdict", sa.String(), nullable=False),
        sa.Column("made_on", sa.Date(), nullable=False),
        sa.Column("until", sa.Date(), nullable=False),
        sa.Column("day", sa.Date(), nullable=True),
        *(
            sa.Column(name, sa.Double(), nullable=False)
            for name in ("net_mm", "gross_mm", "hours", "volume_m3")
        ),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("who", sa.String(), nullable=False),
        sa.Column("entered", sa.DateTime(), nullable=False),
        sa.Column("origin", sa.String(), nullable=False),
        sa.ForeignKeyConstraint(
            ["block_id"], ["block.id"], name=op.f("fk_decision_block_id_block")
        ),
        sa.ForeignKeyConstraint(
            ["number"], ["advice.number"], name=op.f("fk_decision_number_advice")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_decision")),
        sa.UniqueConstraint("origin", name=op.f("uq_decision_origin")),
    )
    op.create_index(op.f("ix_decision_block_id"), "decision", ["block_id"])


def downgrade() -> None:
    op.drop_table("decision")
