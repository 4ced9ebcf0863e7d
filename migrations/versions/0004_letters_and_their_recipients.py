"""Letters and their recipients"""

from collections.abc import Sequence

import sqlalchemy as sa
from alembic import op

revision: str = "0004"
down_revision: str | None = "0003"
branch_labels: Sequence[str] | None = None
depends_on: Sequence[str] | None = None


def upgrade() -> None:
    op.create_table(
        "signing_key",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("key", sa.LargeBinary(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_signing_key")),
    )
    op.create_table(
        "cover",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("farm_id", sa.Integer(), nullable=False),
        sa.Column("first", sa.Date(), nullable=False),
        sa.Column("last", sa.Date(), nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.Column("who", sa.String(), nullable=False),
        sa.Column("entered", sa.DateTime(), nullable=False),
        sa.Column("ended", sa.DateTime(), nullable=True),
        sa.ForeignKeyConstraint(["farm_id"], ["farm.id"], name=op.f("fk_cover_farm_id_farm")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_cover")),
    )
    with op.batch_alter_table("cover", schema=None) as batch_op:
        batch_op.create_index(batch_op.f("ix_cover_farm_id"), ["farm_id"], unique=False)

    op.create_table(
        "recipient",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("farm_id", sa.Integer(), nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.Column("address", sa.String(), nullable=False),
        sa.Column("language", sa.String(), nullable=False),
        sa.Column("units", sa.String(), nullable=False),
        sa.Column("weekday", sa.Integer(), nullable=False),
        sa.Column("hour", sa.Integer(), nullable=False),
        sa.Column("paused", sa.Boolean(), nullable=False),
        sa.Column("stopped_at", sa.DateTime(), nullable=True),
        sa.ForeignKeyConstraint(["farm_id"], ["farm.id"], name=op.f("fk_recipient_farm_id_farm")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_recipient")),
        sa.UniqueConstraint("farm_id", "address", name=op.f("uq_recipient_farm_id_address")),
    )
    op.create_table(
        "letter",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("farm_id", sa.Integer(), nullable=False),
        sa.Column("recipient_id", sa.Integer(), nullable=False),
        sa.Column("week", sa.Date(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.Column("first_day", sa.Date(), nullable=False),
        sa.Column("due", sa.DateTime(), nullable=False),
        sa.Column("state", sa.String(), nullable=False),
        sa.Column("message_id", sa.String(), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("why", sa.Text(), nullable=False),
        sa.Column("subject", sa.String(), nullable=False),
        sa.Column("content", sa.JSON(none_as_null=True), nullable=True),
        sa.Column("data", sa.LargeBinary(), nullable=True),
        sa.Column("to", sa.String(), nullable=False),
        sa.Column("released_by", sa.String(), nullable=False),
        sa.Column("released_at", sa.DateTime(), nullable=True),
        sa.Column("claim", sa.String(), nullable=False),
        sa.Column("claimed_until", sa.DateTime(), nullable=True),
        sa.Column("tries", sa.Integer(), nullable=False),
        sa.Column("next_try", sa.DateTime(), nullable=True),
        sa.Column("words", sa.Text(), nullable=False),
        sa.Column("settled_at", sa.DateTime(), nullable=True),
        sa.ForeignKeyConstraint(["farm_id"], ["farm.id"], name=op.f("fk_letter_farm_id_farm")),
        sa.ForeignKeyConstraint(
            ["recipient_id"], ["recipient.id"], name=op.f("fk_letter_recipient_id_recipient")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_letter")),
        sa.UniqueConstraint("message_id", name=op.f("uq_letter_message_id")),
        sa.UniqueConstraint(
            "recipient_id", "week", "revision", name=op.f("uq_letter_recipient_id_week_revision")
        ),
    )
    with op.batch_alter_table("letter", schema=None) as batch_op:
        batch_op.create_index("ix_letter_farm_id_week", ["farm_id", "week"], unique=False)
        batch_op.create_index("ix_letter_state_due", ["state", "due"], unique=False)

    op.create_table(
        "letter_answer",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("letter_id", sa.Integer(), nullable=False),
        sa.Column("item", sa.Integer(), nullable=False),
        sa.Column("said", sa.String(), nullable=False),
        sa.Column("event_id", sa.Integer(), nullable=True),
        sa.Column("at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(
            ["event_id"], ["event.id"], name=op.f("fk_letter_answer_event_id_event")
        ),
        sa.ForeignKeyConstraint(
            ["letter_id"], ["letter.id"], name=op.f("fk_letter_answer_letter_id_letter")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_letter_answer")),
    )
    with op.batch_alter_table("letter_answer", schema=None) as batch_op:
        batch_op.create_index(batch_op.f("ix_letter_answer_letter_id"), ["letter_id"], unique=False)


def downgrade() -> None:
    with op.batch_alter_table("letter_answer", schema=None) as batch_op:
        batch_op.drop_index(batch_op.f("ix_letter_answer_letter_id"))

    op.drop_table("letter_answer")
    with op.batch_alter_table("letter", schema=None) as batch_op:
        batch_op.drop_index("ix_letter_state_due")
        batch_op.drop_index("ix_letter_farm_id_week")

    op.drop_table("letter")
    op.drop_table("recipient")
    with op.batch_alter_table("cover", schema=None) as batch_op:
        batch_op.drop_index(batch_op.f("ix_cover_farm_id"))

    op.drop_table("cover")
    op.drop_table("signing_key")
