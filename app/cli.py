"""The commands: each parses, calls one workflow, and prints; bad input is one line and exit 1."""

import json
import os
import socket
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import asdict
from datetime import date, datetime
from pathlib import Path
from typing import Annotated, Any, NoReturn

import typer
from rich.console import Console
from rich.progress import BarColumn, Progress, TextColumn, TimeElapsedColumn

from app.errors import InputError
from app.settings import Settings, read_settings

app = typer.Typer(
    name="rillbook",
    help="Irrigation scheduling for farm advisors.",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
)
export = typer.Typer(help="Write CSV to the terminal or a file.", no_args_is_help=True)
app.add_typer(export, name="export")
user = typer.Typer(help="Accounts of the people who sign in.", no_args_is_help=True)
app.add_typer(user, name="user")

WHO = "command line"
notes = Console(stderr=True, highlight=False)

AsJson = Annotated[bool, typer.Option("--json", help="Print the outcome as JSON.")]
On = Annotated[str | None, typer.Option(help="The day it is, such as 2026-07-14.")]
Out = Annotated[Path | None, typer.Option(help="File to write; the terminal when not given.")]


def main() -> None:
    """Run a command; whatever the input, the last word is one line, not a traceback."""
    try:
        app()
    except OSError as error:
        _fail(f"{error.filename}: {error.strerror}" if error.filename else str(error))
    except InputError as error:
        _fail(str(error))
    except KeyboardInterrupt:
        sys.exit(130)


def _fail(message: str) -> NoReturn:
    notes.print(f"rillbook: {_inert(message)}", style="red", soft_wrap=True, markup=False)
    sys.exit(1)


@contextmanager
def _database(on: str | None = None) -> Iterator[tuple[Any, Settings, date]]:
    """The migrated database, the settings and the day it is."""
    from dataclasses import replace

    from app.storage.database import Database
    from app.workflows.day_it_is import day_it_is

    settings = read_settings()
    if on is not None:
        settings = replace(settings, today=_date(on))
    new = settings.database.removeprefix("sqlite:///")
    if new != settings.database and not Path(new).exists():
        notes.print(f"A new, empty database: {new}", soft_wrap=True, markup=False)
    db = Database(settings.database)
    try:
        db.migrate()
        yield db, settings, day_it_is(db, settings)
    finally:
        db.close()


def _date(text: str) -> date:
    try:
        return date.fromisoformat(text)
    except ValueError:
        raise InputError(f"--on is {text!r}; write a date as 2026-07-14") from None


def _say(outcome: dict[str, Any], as_json: bool, text: str) -> None:
    print(json.dumps(outcome, default=str) if as_json else _inert(text))


def _inert(text: str) -> str:
    """A text without the control characters by which a file's names could steer the terminal."""
    return "".join(sign if sign.isprintable() or sign == "\n" else "\ufffd" for sign in text)


@contextmanager
def _progress(what: str) -> Iterator[Callable[[int, int], None]]:
    """A bar on the terminal for what may take over a second; silent where nobody looks."""
    bar = Progress(
        TextColumn("{task.description}"), BarColumn(), TimeElapsedColumn(),
        console=notes, transient=True, disable=not notes.is_terminal,
    )  # fmt: skip
    with bar:
        task = bar.add_task(what, total=None)
        yield lambda done, total: bar.update(task, completed=done, total=total)


@app.command()
def demo(
    port: Annotated[int, typer.Option(help="Port on 127.0.0.1.")] = 8000,
    serve_it: Annotated[bool, typer.Option("--serve/--no-serve", hidden=True)] = True,
) -> None:
    """Fill a throw-away database with the demo basin and serve it."""
    from app.demo import run_demo

    if serve_it:
        _must_be_free(port)
    run_demo(port, serve_it)


@app.command()
def serve(
    port: Annotated[int, typer.Option(help="Port to listen on.")] = 8000,
    host: Annotated[
        str, typer.Option(help="Address to listen on; beyond this machine only with accounts.")
    ] = "127.0.0.1",
) -> None:
    """Serve the pages; beyond this machine only once an admin can sign in."""
    import uvicorn

    from app.jobs.posting import posting
    from app.main import create_app

    _must_be_free(port, host)
    with _database() as (db, settings, _):
        _may_listen(db, settings, host)
        print(f"Rillbook answers on http://{host}:{port}.")
        with posting(db, settings):
            uvicorn.run(create_app(settings, db), host=host, port=port, log_level="warning")


def _may_listen(db: Any, settings: Settings, host: str) -> None:
    """Refuse to listen beyond this machine where anybody would be admin, or be sent elsewhere."""
    from app.settings import LOOPBACK, Mail
    from app.storage.people import is_guarded

    if host in LOOPBACK:
        return
    with db.read() as session:
        guarded = is_guarded(session)
    if not guarded:
        raise InputError(
            f"--host is {host}, but no admin can sign in yet, so whoever came would be admin; "
            "first run `rillbook user add`"
        )
    if settings.mail.base_url == Mail().base_url:
        raise InputError(
            f"--host is {host}; set RILLBOOK_URL to the address by which the pages are reached, "
            "such as https://rillbook.example.org"
        )
    if not settings.mail.base_url.startswith("https:"):
        notes.print("RILLBOOK_URL is not https: passwords travel in the clear.", style="red")


def _must_be_free(port: int, host: str = "127.0.0.1") -> None:
    with socket.socket(socket.AF_INET6 if ":" in host else socket.AF_INET) as probe:
        probe.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        try:
            probe.bind((host, port))
        except (OSError, OverflowError):
            raise InputError(
                f"port {port} on {host} cannot be had; choose another with --port"
            ) from None


@user.command("add")
def user_add(
    address: Annotated[str, typer.Argument(help="E-mail address.")],
    name: Annotated[str, typer.Option(help="Name, as it stands beside what they enter.")],
    role: Annotated[str, typer.Option(help="admin, advisor or grower.")] = "admin",
    farm: Annotated[list[str] | None, typer.Option(help="Key of a farm; may be repeated.")] = None,
    language: Annotated[str, typer.Option(help="en or es.")] = "en",
) -> None:
    """Open an account, and choose its password here."""
    from app.storage.people import account_at
    from app.workflows import people
    from app.workflows.passwords import check_chosen, hashed

    with _database() as (db, settings, _):
        _check_farms(db, farm or [])
        given = people.Person(address, name, role, frozenset(farm or []), language)
        password = _password()
        check_chosen(password, password, (address.partition("@")[0], address, name))
        kept = hashed(password, settings)
        with db.write() as session:
            people.add_account(session, given, WHO)
            account = account_at(session, address)
            assert account is not None
            account.password = kept
    print(f"{_inert(name)} can sign in as {role} at {settings.mail.base_url}/sign-in.")


def _check_farms(db: Any, keys: list[str]) -> None:
    from app.storage.pages import farms

    with db.read() as session:
        there = {key for key, _ in farms(session)}
    if missing := sorted(set(keys) - there):
        raise InputError(f"there is no farm {missing[0]!r}; there are: {', '.join(sorted(there))}")


def _password() -> str:
    """Asked for twice on a terminal, else the first line of the standard input."""
    if sys.stdin.isatty():
        return str(typer.prompt("Password", hide_input=True, confirmation_prompt=True))
    return sys.stdin.readline().rstrip("\n")


@user.command("list")
def user_list(as_json: AsJson = False) -> None:
    """Every account."""
    from app.storage import people as store

    with _database() as (db, _, _), db.read() as session:
        farms = store.members(session)
        rows = [
            {
                "address": row.address,
                "name": row.name,
                "role": row.role,
                "farms": farms.get(row.id, []),
                "state": "stopped" if row.stopped else "open" if row.password else "invited",
            }
            for row in store.accounts(session)
        ]
    lines = [f"{r['address']}  {r['name']}  {r['role']}  {r['state']}" for r in rows]
    _say({"accounts": rows}, as_json, "\n".join(lines) or "No accounts yet.")


@user.command("link")
def user_link(address: str) -> None:
    """Print a one-time link to choose a new password; one-time codes are switched off."""
    from datetime import UTC, datetime

    from app.storage.book import note_change
    from app.storage.people import account_at
    from app.workflows import people

    with _database() as (db, settings, _), db.write() as session:
        account = account_at(session, address)
        if account is None or account.stopped is not None:
            raise InputError(f"there is no open account at {address}")
        account.code_secret = account.code_step = None
        note_change(session, WHO, "account", address, None, {"done": "link made, codes off"})
        secret = people.make_link(session, account, "reset", datetime.now(UTC))
    print(people.link_address(settings, secret))


@user.command("stop")
def user_stop(address: str) -> None:
    """Stop an account, everywhere and at once."""
    from app.storage.people import account_at
    from app.workflows import people

    with _database() as (db, _, _), db.write() as session:
        account = account_at(session, address)
        if account is None:
            raise InputError(f"there is no account at {address}")
        people.stop_account(session, account, WHO, stop=True)
    print(f"{_inert(address)} is stopped.")


@app.command()
def load(
    book_file: Annotated[Path, typer.Argument(metavar="BOOK.json")], as_json: AsJson = False
) -> None:
    """Load stations, soils, systems, farms, fields, seasons and events from a book file."""
    from app.book import read_book
    from app.workflows.load_book import load_book

    book = read_book(book_file)
    with _database() as (db, _, _), db.write() as session:
        loaded = load_book(session, book, WHO)
    outcome = asdict(loaded)
    text = f"Added {_counted(loaded.added)}; changed {_counted(loaded.changed)}; "
    text += f"{loaded.same} the same."
    if loaded.added or loaded.changed:
        text += " `rillbook advise` brings ledgers and advice up to date."
    _say(outcome, as_json, text)


def _counted(parts: dict[str, int]) -> str:
    """`2 soils, 1 field`; kinds come as the store names them, some in the plural."""
    kinds = {kind: kind.removesuffix("s").replace("irrigation_", "") for kind in parts}
    words = [f"{n} {kinds[kind]}{'' if n == 1 else 's'}" for kind, n in parts.items()]
    return ", ".join(words) or "nothing"


@app.command()
def schema() -> None:
    """Print the JSON Schema of a book file, with the handbook's crops, textures and wettings."""
    from app import handbook
    from app.book import Book

    described = Book.model_json_schema()
    choices = (
        ("SeasonPart", "crop", {key: row.crop_name for key, row in handbook.crops().items()}),
        ("LayerPart", "texture", {key: key.replace("_", " ") for key in handbook.soil_textures()}),
        ("SystemPart", "wetting", {key: key.replace("_", " ") for key in handbook.wettings()}),
    )
    for part, name, named in choices:
        place = described["$defs"][part]["properties"][name]
        place.pop("type", None)
        nothing = [{"type": "null"}] if place.pop("anyOf", None) else []
        place["oneOf"] = [{"const": key, "title": title} for key, title in named.items()] + nothing
    print(json.dumps(described, indent=2, ensure_ascii=False))


@app.command()
def intake(
    station: str,
    file: Annotated[Path, typer.Argument()],
    answer: Annotated[
        list[str] | None,
        typer.Option(help="What the file leaves open, such as time.order=mdy; may be repeated."),
    ] = None,
    mapping: Annotated[
        Path | None, typer.Option(help="How to read it, as --preview --json prints it.")
    ] = None,
    preview: Annotated[bool, typer.Option("--preview", help="Only say what would change.")] = False,
    ahead: Annotated[bool, typer.Option("--ahead", help="Take rows dated after now too.")] = False,
    on: On = None,
    as_json: AsJson = False,
) -> None:
    """Take a station's file in: checked, then applied whole or not at all."""
    from app.workflows import take_in

    chosen = _mapping(mapping)
    with _database(on) as (db, _, today):
        with file.open("rb") as source, _progress(f"Reading {file.name}") as step:
            number = take_in.receive(db, station, file.name, source, WHO, chosen, step, today=today)
        try:
            seen = _answered(db, number, answer or [], today)
        except InputError:
            take_in.discard(db, number, WHO)
            raise
        if preview:
            take_in.discard(db, number, WHO)
            _say(_preview_json(seen), as_json, _preview_text(seen))
            return
        if seen.message or any(question["blocking"] for question in seen.questions):
            take_in.discard(db, number, WHO)
            raise take_in.TakeInError(_why_not(seen))
        if seen.rows_ahead and not ahead:
            take_in.discard(db, number, WHO)
            late = seen.problems[0]
            raise take_in.TakeInError(
                f"{file.name}: {seen.rows_ahead} rows are dated after now, the first at "
                f"{late.value} (line {late.line}). {late.remedy} That is said with --ahead."
            )
        with _progress(f"Taking {file.name} in") as step:
            applied = take_in.apply(db, number, WHO, today, step, ahead=ahead)
    text = (
        f"{file.name}: {applied.rows} rows, all here already; nothing changed."
        if applied.already_here
        else f"{file.name}: intake {number}, {applied.rows} rows, {seen.rows_refused} refused, "
        f"{applied.days_changed} days changed from {applied.first_day}, "
        f"{applied.blocks} ledgers recomputed."
    )
    text = "\n".join([text, *_refusals(seen)])
    _say({"intake": number, **asdict(applied)}, as_json, text)


@app.command()
def events(
    file: Annotated[Path, typer.Argument(help="A table of events, or of soil readings.")],
    look: Annotated[bool, typer.Option("--look", help="Only say what it would bring.")] = False,
    order: Annotated[str | None, typer.Option(help="dmy or mdy, of dates such as 3/4.")] = None,
    beside: Annotated[
        bool, typer.Option("--beside", help="Water on a day that has some is more water.")
    ] = False,
    on: On = None,
    as_json: AsJson = False,
) -> None:
    """Log a file of irrigations, rain and what was seen, or of soil readings: whole or not."""
    from app.workflows.log_file import log_file

    if order not in (None, "dmy", "mdy"):
        raise InputError(f"--order is {order!r}; write dmy or mdy")
    with _database(on) as (db, _, today):
        data = file.read_bytes()
        told = log_file(db, data, WHO, today, order=order, beside=beside, keep=not look)
    if told.problems:
        lines = [
            f"line {one.line}, {one.column}: {one.value or 'empty'}: {one.why}. {one.remedy}"
            for one in told.problems
        ]
        if told.in_doubt:
            lines.append("If it is more water beside what is there, say so with --beside.")
        raise InputError("\n".join([f"{file.name}: nothing was logged.", *lines]))
    days = f" on {told.fields} fields, {told.first} to {told.last}" if told.new else ""
    said = "would be new" if look else "logged"
    text = f"{file.name}: {told.new} events {said}{days}; {told.already} were here already."
    _say(asdict(told), as_json, text)


def _answered(db: Any, number: int, answers: list[str], today: date) -> Any:
    """The preview of a received file, read again with the answers if there are any."""
    from app.intake import answer
    from app.workflows import take_in

    seen = take_in.preview_of(db, number)
    if not answers or seen.mapping is None:
        return seen
    given = {}
    for text in answers:
        field, sign, value = text.partition("=")
        if not sign:
            raise InputError(f"--answer is {text!r}; write it as FIELD=VALUE, as time.order=mdy")
        given[field.strip()] = value.strip()
    take_in.remap(db, number, answer(seen.mapping, given), WHO, today)
    return take_in.preview_of(db, number)


def _mapping(path: Path | None) -> Any:
    from pydantic import ValidationError

    from app.intake import IntakeError, Mapping

    if path is None:
        return None
    try:
        found = json.loads(path.read_bytes())
        if isinstance(found, dict) and isinstance(found.get("mapping"), dict):
            found = found["mapping"]  # the whole of what --preview --json prints will do
        return Mapping.model_validate(found)
    except ValueError as error:
        if not isinstance(error, ValidationError):
            raise IntakeError(f"{path}: not JSON ({error})") from None
        first = error.errors()[0]
        place = ".".join(str(step) for step in first["loc"]) or "top"
        raise IntakeError(
            f"{path}, {place}: {first['msg']}; take the mapping that "
            "`rillbook intake STATION FILE --preview --json` prints and change that"
        ) from None


def _preview_json(seen: Any) -> dict[str, Any]:
    outcome = asdict(seen)
    outcome["mapping"] = None if seen.mapping is None else seen.mapping.model_dump(mode="json")
    return outcome


def _preview_text(seen: Any) -> str:
    if seen.message:
        return f"{seen.file_name}: {seen.message}"
    lines = [f"{seen.file_name} for {seen.station_name}"]
    when = {column.position for column in seen.mapping.time.columns}
    for column, place in zip(seen.mapping.columns, seen.columns, strict=False):
        meaning = "says when" if column.position in when else "left out"
        if column.quantity:
            meaning = f"{column.quantity} [{column.unit or 'unit?'}]"
        lines.append(f"  {place['name']}: {meaning}. {place['why']}")
    lines += [_asked(question) for question in seen.questions]
    if any(question["blocking"] for question in seen.questions):
        return "\n".join([*lines, "No row can be read before that is answered (--answer)."])
    lines.append(
        f"{seen.rows_accepted} rows would be taken ({seen.rows_same} here already, "
        f"{seen.rows_differing} differ), {seen.rows_refused} refused; "
        f"{len(seen.days_changed)} days would change, {seen.fields_touched} fields with them."
    )
    return "\n".join([*lines, *_refusals(seen)])


def _refusals(seen: Any) -> list[str]:
    """What was left out or doubted: the first few, by line."""
    shown = seen.problems[:20]
    lines = [
        f"  line {problem.line}, {problem.column}, {problem.value!r}: "
        f"{problem.why.rstrip('.')}. {problem.remedy}"
        for problem in shown
    ]
    if seen.problems_total > len(shown):
        lines.append(f"  and {seen.problems_total - len(shown)} more; the Intake page shows them")
    return lines


def _asked(question: dict[str, Any]) -> str:
    choices = ", ".join(f"{choice['value']} ({choice['label']})" for choice in question["choices"])
    ask = "to be answered" if question["blocking"] else "to be confirmed"
    return f"  {ask}, {question['field']}: {question['asks']} {choices}. {question['why']}"


def _why_not(seen: Any) -> str:
    if seen.message:
        return f"{seen.file_name}: {seen.message}"
    asked = "\n".join(_asked(question) for question in seen.questions if question["blocking"])
    return (
        f"{seen.file_name} needs an answer first:\n{asked}\nGive each with --answer FIELD=VALUE, "
        "or set it in what --preview --json prints and give that with --mapping."
    )


@app.command()
def recompute(on: On = None, as_json: AsJson = False) -> None:
    """Bring station days, ledgers and this morning's advice up to date."""
    _up_to_date(on, as_json)


@app.command()
def advise(on: On = None, as_json: AsJson = False) -> None:
    """Issue the morning's advice for every field, and say how many stand where."""
    _up_to_date(on, as_json)


def _up_to_date(on: str | None, as_json: bool) -> None:
    from app.storage.exports import standings
    from app.workflows.bring_up_to_date import bring_up_to_date

    with _database(on) as (db, _, today):
        with notes.status("Recomputing what changed"):
            done = bring_up_to_date(db, today)
        with db.read() as session:
            counted = standings(session, today)
    words = ", ".join(f"{count} {standing}" for standing, count in counted.items()) or "no crops"
    text = (
        f"{today}: {done.station_days} station days and {done.ledger_days} ledger days "
        f"recomputed, {done.advices} advices issued; standing: {words}."
    )
    if done.advised_until:
        text += (
            f" Advice stands already for the morning of {done.advised_until}; none is issued for "
            "one before it."
        )
    _say({"on": today, **asdict(done), "standing": counted}, as_json, text)


@app.command()
def letters(
    on: On = None,
    preview: Annotated[bool, typer.Option("--preview", help="Print what is due.")] = False,
    send: Annotated[bool, typer.Option("--send", help="Send what is released and due.")] = False,
    release: Annotated[
        bool, typer.Option("--release", help="With --send: release what is due first.")
    ] = False,
    as_json: AsJson = False,
) -> None:
    """Look at the letters that are due, through the end of --on where given, or send them."""
    from app.workflows.day_it_is import end_of_day, moment_it_is

    if preview == send or (release and not send):
        raise InputError("say either --preview or --send; --release goes with --send")
    with _database(on) as (db, settings, today):
        now = moment_it_is(db, settings) if on is None else end_of_day(db, today)
        if preview:
            _print_letters(db, settings, now, today, as_json)
        else:
            _send_letters(db, settings, now, today, release, as_json)


def _print_letters(db: Any, settings: Settings, now: datetime, today: date, as_json: bool) -> None:
    from app.workflows.print_letters import letters_due

    found = list(letters_due(db, settings, now, today))
    text = "\n".join(
        f"{one.farm}, to {one.to}: {one.state}, due {one.due:%Y-%m-%d %H:%M} UTC\n"
        f"{one.subject or 'No advice has been worked out to write from.'}\n\n{one.text}\n"
        for one in found
    )
    _say({"letters": [asdict(one) for one in found]}, as_json, text or "No letter is due.")


def _send_letters(
    db: Any, settings: Settings, now: datetime, today: date, release: bool, as_json: bool
) -> None:
    from app.workflows.post_letters import post, still_waiting
    from app.workflows.print_letters import release_due

    if release:
        release_due(db, settings, WHO, now, today)
    posted = post(db, settings, lambda: now, lambda: today)
    waiting = still_waiting(db, now)
    text = f"{posted.sent} sent, {posted.put_off} put off, {posted.refused} refused, "
    text += f"{posted.unsure} unsure. "
    if not settings.mail.host:
        text += f"No mail server is set: written to {settings.mail.folder.absolute()}. "
    if waiting:
        text += "Due and not sent: " + ", ".join(f"{n} {state}" for state, n in waiting.items())
        text += "; see the Letters page, or --release."
    _say({**asdict(posted), "waiting": waiting}, as_json, text.strip())
    if posted.put_off or posted.refused or posted.unsure:
        sys.exit(1)


@export.command("ledger")
def export_ledger(
    field: Annotated[str, typer.Option(help="Key of the field.")],
    block: Annotated[str | None, typer.Option(help="Key of one block.")] = None,
    out: Out = None,
) -> None:
    """A field's ledger, every column."""
    from app.workflows.export import ledger_csv

    with _database() as (db, _, _):
        _write(ledger_csv(db, field, block), out)


@export.command("station-days")
def export_station_days(
    station: Annotated[str, typer.Option(help="Key of the station.")], out: Out = None
) -> None:
    """A station's days with rungs and reference ET."""
    from app.workflows.export import station_days_csv

    with _database() as (db, _, _):
        _write(station_days_csv(db, station), out)


@export.command("advice")
def export_advice(on: On = None, out: Out = None) -> None:
    """The advice of a morning."""
    from app.workflows.export import advice_csv

    with _database(on) as (db, _, today):
        _write(advice_csv(db, today), out)


def _write(parts: Iterator[str], out: Path | None) -> None:
    """To the terminal as it comes; to a file whole or not at all."""
    if out is None:
        for part in parts:
            sys.stdout.write(part)
        return
    if out.is_dir():
        raise InputError(f"{out}: is a folder; name the file to write in it")
    if not out.absolute().parent.is_dir():
        raise InputError(f"{out}: there is no folder {out.absolute().parent}")
    half = out.with_name(f".{out.name}.part")
    try:
        with half.open("w", encoding="utf-8", newline="") as file:
            file.writelines(parts)
        os.replace(half, out)
    finally:
        half.unlink(missing_ok=True)


if __name__ == "__main__":
    main()
