"""Put a shared supply of a book into the store."""

from sqlalchemy import select
from sqlalchemy.orm import Session

from app.book.supply import SupplyPart
from app.storage import book as rows
from app.storage import supplies as store
from app.storage.tables import Field
from app.storage.tables_supply import Supply


def put_supply(session: Session, part: SupplyPart, who: str) -> str:
    """Put a supply in by its key: added, changed or same. Fields must be there."""
    after = part.model_dump(mode="json")
    details = {name: value for name, value in after.items() if name != "fields"}
    row = session.scalar(select(Supply).where(Supply.key == part.key))
    before = None
    if row is None:
        row = Supply(key=part.key, name=part.name, details=details)
        session.add(row)
        session.flush()
    else:
        hung = {key for _, key, _, _ in store.blocks_on(session, row.id)}
        if row.details == details and hung == set(part.fields):
            return "same"
        before = {**row.details, "fields": sorted(hung)}
        row.name, row.details = part.name, details
    numbers = rows.keys_of(session, Field)
    store.hang(session, row.id, [numbers[key] for key in part.fields])
    rows.note_change(session, who, "supply", part.key, before, after)
    return "added" if before is None else "changed"
