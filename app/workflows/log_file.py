"""Log a file of events or readings: whole or not at all, and the same file twice changes nothing.

An event of a file is told by what it says (field, block, day, kind, amount), so that a longer file
with the same lines brings only the new ones; what was corrected or deleted since stays so.
"""

import hashlib
import json
from collections import Counter
from dataclasses import dataclass
from datetime import date

from sqlalchemy import select
from sqlalchemy.orm import Session

from app.intake.event_file import MOST_PROBLEMS, FileEvent, LineProblem, read_events
from app.storage.database import Database
from app.storage.events import origins_taken, standing_events
from app.storage.scope import Farms, of_farms
from app.storage.tables import Block, Farm, Field
from app.workflows.bring_up_to_date import up_to_date
from app.workflows.log_event import Water, blocks_of, put_water
from app.workflows.log_seen import check_seen, put_seen
from app.workflows.once import EntryError, once


@dataclass(frozen=True)
class FileLogged:
    """What a file brought, or would bring: new events, those already here, first and last day.

    With problems nothing was logged. in_doubt: every problem is water on a day that has some.
    """

    new: int
    already: int
    first: date | None
    last: date | None
    fields: int
    problems: tuple[LineProblem, ...] = ()
    in_doubt: bool = False


class _NotKeptError(Exception):
    """Takes a look back: the transaction is rolled back."""


def log_file(
    db: Database,
    data: bytes,
    who: str,
    today: date,
    farms: Farms = None,
    *,
    order: str | None = None,
    beside: bool = False,
    keep: bool = True,
) -> FileLogged:
    """Log every event of a file, or with `keep` false only say what it would bring.

    farms: those whose fields may be named. order: of day and month. beside: water on a day that
    has some from elsewhere is more water, not the same again. Raises IntakeError for what is no
    such table.
    """
    events, problems = read_events(data, order)
    if problems:
        return _refused(problems)
    outcome = FileLogged(0, 0, None, None, 0)
    try:
        with db.write() as session:
            outcome = _log_all(session, events, who, today, farms, beside)
            if outcome.problems or not keep:
                raise _NotKeptError
            if outcome.new:
                up_to_date(session, today)
    except _NotKeptError:
        pass
    return outcome


def _refused(problems: list[LineProblem], in_doubt: bool = False) -> FileLogged:
    return FileLogged(0, 0, None, None, 0, tuple(problems[:MOST_PROBLEMS]), in_doubt)


def _log_all(
    session: Session,
    events: list[FileEvent],
    who: str,
    today: date,
    farms: Farms,
    beside: bool,
) -> FileLogged:
    fields = _Fields(session, farms)
    wrong: list[LineProblem] = []
    twice: list[LineProblem] = []
    count: Counter[str] = Counter()
    new: list[tuple[date, str]] = []
    before: dict[tuple[int, ...], set[tuple[date, str]]] = {}
    for event in events:
        try:
            key = fields.key(event.field)
            blocks = blocks_of(session, key, fields.block(key, event.block), farms)
            numbers = tuple(block.id for block in blocks)
            if numbers not in before:
                before[numbers] = {
                    (one.day, one.kind)
                    for one in standing_events(session, numbers, ("irrigation", "rain"))
                    if one.confirmation != "presumed"
                }
            told = _told(event, key)
            count[told] += 1
            token = f"file-{told}-{count[told]}"
            fresh = _put(session, key, blocks, event, who, token, today)
        except EntryError as error:
            wrong.append(_problem(event, error))
            continue
        if not fresh:
            continue
        if (event.day, event.kind) in before[numbers] and not beside:
            twice.append(
                LineProblem(
                    event.lines[0], "day", str(event.day),
                    f"this field has {'rain' if event.kind == 'rain' else 'an irrigation'} "
                    "logged on this day from elsewhere",
                    "Take the line out, or say that it is more water beside it.",
                )
            )  # fmt: skip
        new.append((event.day, key))
    if wrong or twice:
        told_all = sorted([*wrong, *twice], key=lambda one: one.line)
        return _refused(told_all, in_doubt=not wrong)
    days = [day for day, _ in new]
    return FileLogged(
        len(new), len(events) - len(new), min(days, default=None), max(days, default=None),
        len({key for _, key in new}),
    )  # fmt: skip


def _put(
    session: Session,
    key: str,
    blocks: list[Block],
    event: FileEvent,
    who: str,
    token: str,
    today: date,
) -> bool:
    """Keep an event; whether it was new."""
    if event.kind not in ("irrigation", "rain"):
        details = dict(event.details)
        told = check_seen(event.kind, event.day, today, event.amount, details, event.note)
        return put_seen(
            session, blocks, event.kind, event.day, who, token, event.amount, told, event.note
        )[1]
    water = Water(
        day=event.day,
        amount=event.amount,
        unit=event.unit,
        purpose=event.purpose,
        confirmation="measured" if event.kind == "rain" else event.confirmation,
        note=event.note,
        area_share=event.area_share,
    )
    if origins_taken(session, [once(token, blocks[0].id)]):
        return False
    block = blocks[0].key if event.block else None
    put_water(session, key, block, water, who, token, today)
    return True


def _told(event: FileEvent, key: str) -> str:
    """What tells an event from others: not its words, nor how sure it is."""
    said = [
        key, event.block, event.kind, str(event.day), round(event.amount, 9), event.unit,
        event.area_share, event.details, event.note if event.kind == "note" else None,
    ]  # fmt: skip
    return hashlib.sha256(json.dumps(said, default=str, sort_keys=True).encode()).hexdigest()[:32]


def _problem(event: FileEvent, error: EntryError) -> LineProblem:
    """A refusal as a problem of its line: `day is 2030-01-01; log water when it has run`."""
    text = str(error)
    column, _, rest = text.partition(" is ")
    value, _, remedy = rest.partition("; ")
    line = event.lines[0]
    if remedy and " " not in column:
        return LineProblem(line, column, value, "this cannot be", _sentence(remedy))
    if text.startswith("there is no field"):
        return LineProblem(
            line, "block" if " with a block " in text else "field",
            event.block if " with a block " in text and event.block else event.field,
            "there is no such block" if " with a block " in text else "there is no such field",
            "Write the key or name as the Rounds show it.",
        )  # fmt: skip
    return LineProblem(line, event.kind, "", text, "Put it right or take the line out.")


def _sentence(text: str) -> str:
    return text[:1].upper() + text[1:] + "."


class _Fields:
    """Fields and blocks by key or name, of the farms that may be named."""

    def __init__(self, session: Session, farms: Farms) -> None:
        rows = session.execute(
            of_farms(
                select(Field.key, Field.name, Block.key, Block.name)
                .join(Farm, Farm.id == Field.farm_id)
                .join(Block, Block.field_id == Field.id),
                farms,
            )
        ).all()
        self.keys = {row[0] for row in rows}
        self.names: dict[str, set[str]] = {}
        self.blocks: dict[str, dict[str, str]] = {}
        for key, name, block, block_name in rows:
            self.names.setdefault(name.casefold(), set()).add(key)
            own = self.blocks.setdefault(key, {})
            own[block_name.casefold()] = own[block.casefold()] = block

    def key(self, said: str) -> str:
        """The key of a field by key or name; EntryError for none or several."""
        if said in self.keys:
            return said
        found = self.names.get(said.casefold(), set())
        if len(found) > 1:
            raise EntryError(f"field is {said!r}; several fields have this name, write the key")
        if not found:
            raise EntryError(f"there is no field {said!r}")
        return next(iter(found))

    def block(self, key: str, said: str | None) -> str | None:
        """The key of a field's block by key or name."""
        return None if said is None else self.blocks[key].get(said.casefold(), said)
