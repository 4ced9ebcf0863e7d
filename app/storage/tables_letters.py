"""Tables of the weekly letters: who gets them, what was sent, what was answered.

A letter's state goes draft | held -> released -> claimed -> sending -> sent, and on the way to
refused or unsure. `sending` is committed just before the letter can no longer be taken back, so a
process killed there leaves `sending`, which becomes unsure; killed before, the letter is released.
"""

from datetime import date, datetime
from typing import Any

from sqlalchemy import ForeignKey, Index, LargeBinary, Text, UniqueConstraint
from sqlalchemy.orm import Mapped, mapped_column

from app.storage.tables import Base


class Recipient(Base):
    """Who gets a farm's letters, where, when and how."""

    __tablename__ = "recipient"
    __table_args__ = (UniqueConstraint("farm_id", "address"),)
    id: Mapped[int] = mapped_column(primary_key=True)
    farm_id: Mapped[int] = mapped_column(ForeignKey("farm.id"))
    name: Mapped[str]
    address: Mapped[str]
    language: Mapped[str]  # en | es
    units: Mapped[str]  # metric | us
    weekday: Mapped[int]  # 0 is Monday
    hour: Mapped[int]
    paused: Mapped[bool]
    stopped_at: Mapped[datetime | None]
    """When the recipient asked for no more letters; only the recipient's own word undoes it."""


class Letter(Base):
    """One letter of one week to one recipient; revision 1 is the week's one correction.

    `week` is the Monday of the week; `first_day` the first day it advises on. Until release it is
    composed anew at every look; at release `data` holds it as it will be sent, and `content` what
    it says.
    """

    __tablename__ = "letter"
    __table_args__ = (
        UniqueConstraint("recipient_id", "week", "revision"),
        Index("ix_letter_state_due", "state", "due"),
        Index("ix_letter_farm_id_week", "farm_id", "week"),
    )
    id: Mapped[int] = mapped_column(primary_key=True)
    farm_id: Mapped[int] = mapped_column(ForeignKey("farm.id"))
    recipient_id: Mapped[int] = mapped_column(ForeignKey("recipient.id"))
    week: Mapped[date]
    revision: Mapped[int]
    first_day: Mapped[date]
    due: Mapped[datetime]
    state: Mapped[str]
    message_id: Mapped[str] = mapped_column(unique=True)
    note: Mapped[str] = mapped_column(Text)
    why: Mapped[str] = mapped_column(Text)
    """Why it is held, or a correction is due."""
    subject: Mapped[str]
    content: Mapped[dict[str, Any] | None]
    data: Mapped[bytes | None] = mapped_column(LargeBinary)
    to: Mapped[str]
    released_by: Mapped[str]
    released_at: Mapped[datetime | None]
    claim: Mapped[str]
    claimed_until: Mapped[datetime | None]
    tries: Mapped[int]
    next_try: Mapped[datetime | None]
    words: Mapped[str] = mapped_column(Text)
    """The mail server's last words."""
    settled_at: Mapped[datetime | None]


class LetterAnswer(Base):
    """What a grower answered to one line of a letter, by its link; the last one counts."""

    __tablename__ = "letter_answer"
    id: Mapped[int] = mapped_column(primary_key=True)
    letter_id: Mapped[int] = mapped_column(ForeignKey("letter.id"), index=True)
    item: Mapped[int]
    said: Mapped[str]  # done | otherwise | not
    event_id: Mapped[int | None] = mapped_column(ForeignKey("event.id"))
    at: Mapped[datetime]


class Cover(Base):
    """Who answers for a farm, and signs its letters, while its advisor is away."""

    __tablename__ = "cover"
    id: Mapped[int] = mapped_column(primary_key=True)
    farm_id: Mapped[int] = mapped_column(ForeignKey("farm.id"), index=True)
    first: Mapped[date]
    last: Mapped[date]
    name: Mapped[str]
    who: Mapped[str]
    entered: Mapped[datetime]
    ended: Mapped[datetime | None]


class SigningKey(Base):
    """The key that signs links in letters; made once for each database."""

    __tablename__ = "signing_key"
    id: Mapped[int] = mapped_column(primary_key=True)
    key: Mapped[bytes] = mapped_column(LargeBinary)
