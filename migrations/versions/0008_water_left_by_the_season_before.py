"""Blocks of several seasons open anew: a season now finds what the one before it left.

Revision ID: 0008
Revises: 0007
"""

from alembic import op

revision = "0008"
down_revision = "0007"
branch_labels = None
depends_on = None


def upgrade() -> None:
    """Ledgers of blocks with more than one season are to be computed again from the first."""
    op.execute(
        "UPDATE block SET dirty_from = "
        "(SELECT min(season.planting) FROM season WHERE season.block_id = block.id) "
        "WHERE (SELECT count(*) FROM season WHERE season.block_id = block.id) > 1 "
        "AND dirty_from IS NULL"
    )


def downgrade() -> None:
    """Nothing to take back: what is dirty is computed again."""
