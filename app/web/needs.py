"""What routes ask for: the database, the day it is, a number from a form."""

import math
from datetime import date, datetime
from typing import Annotated

from fastapi import Depends, Path, Request
from pydantic import AfterValidator

from app.settings import Settings
from app.storage.database import Database
from app.web.problems import RefusedError


def get_db(request: Request) -> Database:
    """The application's database."""
    db: Database = request.app.state.db
    return db


AsDatabase = Annotated[Database, Depends(get_db)]


def get_today(request: Request) -> date:
    """The day it is."""
    from app.workflows.day_it_is import day_it_is

    return day_it_is(request.app.state.db, request.app.state.settings)


AsToday = Annotated[date, Depends(get_today)]


def get_now(request: Request) -> datetime:
    """The instant it is, moved with the day where RILLBOOK_TODAY is set."""
    from app.workflows.day_it_is import moment_it_is

    return moment_it_is(request.app.state.db, request.app.state.settings)


AsNow = Annotated[datetime, Depends(get_now)]


def get_settings(request: Request) -> Settings:
    """The application's settings."""
    settings: Settings = request.app.state.settings
    return settings


AsSettings = Annotated[Settings, Depends(get_settings)]

AsKey = Annotated[str, Path(max_length=80, pattern="^[a-z0-9-]+$")]
AsNumber = Annotated[int, Path(ge=1, le=2**31 - 1)]
AsDay = Annotated[date, Path(ge=date(1900, 1, 1), le=date(2200, 1, 1))]


def without_nul(text: str) -> str:
    """A text without the characters that no database takes: NUL, halves of a surrogate pair."""
    return text.replace("\0", "").encode("utf-8", "ignore").decode()


Clean = Annotated[str, AfterValidator(without_nul)]


def read_number(text: str, field: str) -> float:
    """A figure as people write it, `7.5` or `7,5`; raises RefusedError with the remedy."""
    try:
        value = float(text.strip().replace(",", "."))
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        raise RefusedError(
            f"{field} is {text.strip()[:40]!r}, which is no number.",
            field,
            text[:40],
            "Write a number such as 7.5.",
        )
    return value


def read_day(text: str, field: str) -> date:
    """A date as date inputs send it, `2026-07-14`; raises RefusedError with the remedy."""
    try:
        return date.fromisoformat(text.strip())
    except ValueError:
        raise RefusedError(
            f"{field} is {text.strip()[:40]!r}, which is no date.",
            field,
            text[:40],
            "Write the date as 2026-07-14.",
        ) from None
