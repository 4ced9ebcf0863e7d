"""The advisor's decisions on advice, kept beside the advice, which stays as it was issued."""

from datetime import date, datetime

from sqlalchemy import ForeignKey, Text
from sqlalchemy.orm import Mapped, mapped_column

from app.storage.tables import Base


class Decision(Base):
    """What an advisor decided on an advice; the last of a block stands, through its day `until`.

    verdict accept, change (day and depths are the advisor's), withhold (no water through `until`)
    or take_back (the advice stands by itself again).
    """

    __tablename__ = "decision"
    id: Mapped[int] = mapped_column(primary_key=True)
    block_id: Mapped[int] = mapped_column(ForeignKey("block.id"), index=True)
    number: Mapped[int] = mapped_column(ForeignKey("advice.number"))
    verdict: Mapped[str]
    made_on: Mapped[date]
    until: Mapped[date]
    day: Mapped[date | None]
    net_mm: Mapped[float]
    gross_mm: Mapped[float]
    hours: Mapped[float]
    volume_m3: Mapped[float]
    note: Mapped[str] = mapped_column(Text)
    who: Mapped[str]
    entered: Mapped[datetime]
    origin: Mapped[str] = mapped_column(unique=True)
