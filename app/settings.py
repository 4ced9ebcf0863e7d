"""The environment, read once into one frozen object; a wrong value is refused with its remedy."""

import os
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date
from pathlib import Path

from app.errors import InputError


class SettingsError(InputError):
    """A setting that cannot be used; the message says which, why and how to mend it."""


@dataclass(frozen=True)
class Settings:
    """What the environment decides.

    database: SQLAlchemy URL (`sqlite:///...` or `postgresql://...`).
    today: the day it is for every station, or None for each station's own date.
    demo: True only under `rillbook demo`; opens the three ways in without an account.
    """

    database: str
    today: date | None = None
    demo: bool = False


def default_database() -> str:
    """The database of a plain `rillbook serve`: one SQLite file in the folder it is run from."""
    return f"sqlite:///{Path.cwd() / 'rillbook.sqlite'}"


def read_settings(environment: Mapping[str, str] = os.environ) -> Settings:
    """Settings of `RILLBOOK_DATABASE` and `RILLBOOK_TODAY`; raises SettingsError."""
    database = environment.get("RILLBOOK_DATABASE", "").strip() or default_database()
    if database.split(":", 1)[0].split("+")[0] not in {"sqlite", "postgresql"}:
        raise SettingsError(
            f"RILLBOOK_DATABASE is {database!r}; it must begin with sqlite:/// or postgresql://"
        )
    stated = environment.get("RILLBOOK_TODAY", "").strip()
    try:
        today = date.fromisoformat(stated) if stated else None
    except ValueError:
        raise SettingsError(
            f"RILLBOOK_TODAY is {stated!r}; it must be a date such as 2026-07-14, or not set"
        ) from None
    if today is not None and not 1980 <= today.year <= 2200:
        raise SettingsError(f"RILLBOOK_TODAY is {stated!r}; it must lie in the years 1980 to 2200")
    return Settings(database=database, today=today)
