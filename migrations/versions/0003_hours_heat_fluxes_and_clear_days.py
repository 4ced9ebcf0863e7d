"""Hours, heat fluxes and clear days of a station day"""

from collections.abc import Sequence

import sqlalchemy as sa
from alembic import op

revision: str = "0003"
down_revision: str | None = "0002"
branch_labels: Sequence[str] | None = None
depends_on: Sequence[str] | None = None

COLUMNS = (
    "eto_daily",
    "etr_daily",
    "eto_hours",
    "etr_hours",
    "net_radiation",
    "soil_heat_flux",
    "sensible_heat",
    "latent_heat",
    "clear_level",
    "clear_tilt_deg",
    "clear_clock_min",
)


def upgrade() -> None:
    for name in COLUMNS:
        op.add_column("station_day", sa.Column(name, sa.Double(), nullable=True))
    # days kept before have none of these until they are computed again, with the next morning
    op.execute("UPDATE station SET dirty_from = '1900-01-01'")


def downgrade() -> None:
    for name in COLUMNS:
        op.drop_column("station_day", name)
