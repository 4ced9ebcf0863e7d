"""Tables of the people: accounts, what farms they see, their sign-ins, links and tokens.

Of a secret that opens something only the SHA-256 is kept; of a password its argon2 hash. The secret
of one-time codes is kept as it is, for the codes are computed from it.
"""

from datetime import datetime

from sqlalchemy import ForeignKey, Index
from sqlalchemy.orm import Mapped, mapped_column

from app.storage.tables import Base


class Account(Base):
    """A person who may sign in; never deleted, for the record names them."""

    __tablename__ = "account"
    id: Mapped[int] = mapped_column(primary_key=True)
    address: Mapped[str] = mapped_column(unique=True)  # lower case
    name: Mapped[str] = mapped_column(unique=True)
    role: Mapped[str]  # admin | advisor | grower
    language: Mapped[str]  # en | es
    password: Mapped[str | None]
    code_secret: Mapped[str | None]
    """Base32; None without one-time codes."""
    code_step: Mapped[int | None]
    """The last step of time whose code was taken, so that none counts twice."""
    made: Mapped[datetime]
    stopped: Mapped[datetime | None]


class Membership(Base):
    """A farm that an account sees; an admin sees every one without."""

    __tablename__ = "membership"
    account_id: Mapped[int] = mapped_column(ForeignKey("account.id"), primary_key=True)
    farm_id: Mapped[int] = mapped_column(ForeignKey("farm.id"), primary_key=True, index=True)


class SignIn(Base):
    """A browser that is signed in, until it ends or is ended."""

    __tablename__ = "sign_in"
    id: Mapped[int] = mapped_column(primary_key=True)
    secret: Mapped[str] = mapped_column(unique=True)
    account_id: Mapped[int] = mapped_column(ForeignKey("account.id"), index=True)
    browser: Mapped[str]
    since: Mapped[datetime]
    ends: Mapped[datetime]


class OneTimeLink(Base):
    """A link with which to choose a password, once: an invitation or a reset."""

    __tablename__ = "one_time_link"
    id: Mapped[int] = mapped_column(primary_key=True)
    secret: Mapped[str] = mapped_column(unique=True)
    account_id: Mapped[int] = mapped_column(ForeignKey("account.id"), index=True)
    purpose: Mapped[str]  # invite | reset
    made: Mapped[datetime]
    ends: Mapped[datetime]
    used: Mapped[datetime | None]


class SignInTry(Base):
    """A try at signing in, or at asking for a link, by what is counted: an address, a client."""

    __tablename__ = "sign_in_try"
    __table_args__ = (Index("ix_sign_in_try_subject_at", "subject", "at"),)
    id: Mapped[int] = mapped_column(primary_key=True)
    subject: Mapped[str]
    at: Mapped[datetime]


class Token(Base):
    """What a program shows instead of a sign-in.

    kind push: a station's logger sends readings; read: a person's program reads the API.
    """

    __tablename__ = "token"
    id: Mapped[int] = mapped_column(primary_key=True)
    secret: Mapped[str] = mapped_column(unique=True)
    kind: Mapped[str]
    name: Mapped[str]
    account_id: Mapped[int | None] = mapped_column(ForeignKey("account.id"), index=True)
    station_id: Mapped[int | None] = mapped_column(ForeignKey("station.id"), index=True)
    who: Mapped[str]
    made: Mapped[datetime]
    revoked: Mapped[datetime | None]
