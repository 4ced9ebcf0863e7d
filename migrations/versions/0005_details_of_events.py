"""Details of events"""

from collections.abc import Sequence

import sqlalchemy as sa
from alembic import op

revision: str = "0005"
down_revision: str | None = "0004"
branch_labels: Sequence[str] | None = None
depends_on: Sequence[str] | None = None


def upgrade() -> None:
    op.add_column("event", sa.Column("details", sa.JSON(none_as_null=True), nullable=True))


def downgrade() -> None:
    op.drop_column("event", "details")
