"""The JSON API, version 1."""

from fastapi import APIRouter

from app.wording import CAUTION, CAUTION_TITLE

DESCRIPTION = f"{CAUTION_TITLE} {CAUTION}"
router = APIRouter(prefix="/api/v1")
