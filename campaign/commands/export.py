"""``campaign export``: tables for others, and for another catalogue."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from dataclasses import replace
from typing import TYPE_CHECKING, Annotated, Any

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, QuietOption, YesOption, option
from campaign.commands.parsing import clock_instant, one_of, plain
from campaign.errors import UsageRefused

if TYPE_CHECKING:
    from campaign.model.exchange_columns import Cell
    from campaign.model.exported import ExchangeForm, OutgoingTable
    from campaign.output.progress import Progress
    from campaign.studies.export import Asked

Text = str | None
Words = list[str] | None
STDOUT = "-"
_SPOOL_BYTES = 32 << 20
_TOLD_EVERY = 1_000


def _repeated(flag: str, metavar: str, text: str) -> Any:
    return typer.Option(flag, metavar=metavar, help=f"{text}; may be repeated.", show_default=False)


def export(
    kind: Annotated[
        Text, typer.Argument(metavar="KIND", help="observations, systems, solutions or episodes.")
    ] = None,
    system: Annotated[
        Words, typer.Argument(metavar="SYSTEM", help="Only these, by name or alias; else all.")
    ] = None,
    to: Annotated[
        Text, option("--to", "FILE", "Its ending says the form: .csv, .ecsv, .vot, .json; - is stdout.")
    ] = None,
    as_: Annotated[Text, option("--as", "FORM", "csv, ecsv, votable or json, whatever the ending.")] = None,
    what: Annotated[Words, _repeated("--kind", "KIND", "Only photometry, velocity, shell, ...")] = None,
    band: Annotated[Words, _repeated("--band", "BAND", "Only this band")] = None,
    from_: Annotated[Text, option("--from", "INSTANT", "Only what was observed then or later.")] = None,
    until: Annotated[Text, option("--until", "INSTANT", "Only what was observed then or before.")] = None,
    site: Annotated[Text, option("--site", "SITE", "Only what was observed there.")] = None,
    source: Annotated[Text, option("--source", "TEXT", "Only where the source holds this text.")] = None,
    quality: Annotated[Words, _repeated("--quality", "WORD", "Only good, doubtful or bad")] = None,
    also_withdrawn: Annotated[
        bool,
        typer.Option(
            "--also-withdrawn", help="Also what was superseded or withdrawn, marked.", show_default=False
        ),
    ] = False,
    db: DbOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
    yes: YesOption = False,
) -> None:
    """Write a table for others, or for another catalogue."""
    from campaign.studies.export import outgoing_table

    chosen = {"--kind": what, "--band": band, "--from": from_, "--until": until, "--site": site,
              "--source": source, "--quality": quality}  # fmt: skip
    asked = _asked(kind, system, chosen, also_withdrawn)
    path, form = _place(to, as_, json=json)
    if path is None:
        _to_stdout(common.database(db), asked, form, quiet=quiet)
        return
    from campaign.output.files import is_kept_file

    if is_kept_file(path):
        common.confirm(f"Replace {path}?", yes=yes)
    try:
        with outgoing_table(common.database(db), asked) as table:
            _to_file(table, form, path, json=json, quiet=quiet)
    except KeyboardInterrupt:
        common.tell(f"Interrupted: {path} was not written, and nothing was left behind.", quiet=quiet)
        raise


def _asked(kind: str | None, systems: Words, chosen: dict[str, Any], also_withdrawn: bool) -> Asked:
    from campaign.model.exchange_columns import EXCHANGE_KINDS, OUT_OF_USE_COLUMNS
    from campaign.model.observations import OBSERVATION_KINDS
    from campaign.studies.export import Asked
    from campaign.studies.observations import Wanted

    if kind is None:
        raise UsageRefused(
            "What is to be exported?",
            why=f"It is one of: {', '.join(EXCHANGE_KINDS)}.",
            hint="For example: campaign export observations --to observations.csv",
        )
    asked_kind: Any = one_of(kind, EXCHANGE_KINDS, "KIND")
    given = [flag for flag, value in chosen.items() if value]
    if asked_kind != "observations" and given:
        raise UsageRefused(
            f"{given[0]} chooses among observations, not among {asked_kind}.",
            why=f"The table of {asked_kind} can be narrowed by system only.",
            hint=f"Leave {given[0]} out, or export observations.",
        )
    if also_withdrawn and not OUT_OF_USE_COLUMNS[asked_kind]:
        raise UsageRefused(
            f"--also-withdrawn has no meaning for {asked_kind}.",
            why="Only observations and episodes stay in the table when they are withdrawn.",
            hint="Leave --also-withdrawn out; retired systems are exported anyway.",
        )
    return Asked(
        asked_kind,
        systems=tuple(systems or ()),
        wanted=Wanted(
            kinds=_words(chosen["--kind"], OBSERVATION_KINDS, "--kind"),
            bands=tuple(plain(each, "--band", 50) or "" for each in chosen["--band"] or ()) or None,
            since=clock_instant(chosen["--from"], "--from"),
            until=clock_instant(chosen["--until"], "--until"),
            site=chosen["--site"],
            source=plain(chosen["--source"], "--source", 500),
            qualities=_words(chosen["--quality"], ("good", "doubtful", "bad"), "--quality"),
        ),
        also_out_of_use=also_withdrawn,
    )


def _words(given: Words, accepted: tuple[str, ...], flag: str) -> Any:
    return tuple(one_of(each, accepted, flag) for each in given or ()) or None


def _place(to: str | None, as_: str | None, *, json: bool) -> tuple[str | None, ExchangeForm]:
    """Path, None for standard output, and form of the table."""
    from campaign.model.exported import EXCHANGE_FORMS
    from campaign.output.exported import form_of_name

    if to is None:
        raise UsageRefused(
            "Where is the table to be written?",
            why="A table is written into a file, or to standard output.",
            hint="Add --to FILE, for example --to observations.csv, or --to - --as csv.",
        )
    form: Any = one_of(as_, EXCHANGE_FORMS, "--as")
    if to != STDOUT:
        return to, form or form_of_name(to)
    if json and form not in (None, "json"):
        raise UsageRefused(
            f"Standard output cannot hold {form} and the document of --json.",
            why="With --json there is one document on standard output, and nothing else.",
            hint="Leave --json out, or write the table into a file.",
        )
    if form is None and not json:
        raise UsageRefused(
            "In which form is the table to be written?",
            why="Standard output has no name whose ending could tell.",
            hint=f"Add --as with one of {', '.join(EXCHANGE_FORMS)}.",
        )
    return None, form or "json"


def _progress(*, quiet: bool) -> Progress:
    from campaign.output.progress import Progress

    return Progress(common.stderr_screen(), time.monotonic, quiet=quiet)


def _counted(table: OutgoingTable, told: Callable[[str, int, int | None], None]) -> OutgoingTable:
    """The same table, which tells how many of its rows were taken."""

    def rows() -> Iterator[tuple[Cell, ...]]:
        for number, row in enumerate(table.rows, start=1):
            yield row
            if number % _TOLD_EVERY == 0:
                told("writing", number, table.row_count)

    return replace(table, rows=rows())


def _to_file(table: OutgoingTable, form: ExchangeForm, path: str, *, json: bool, quiet: bool) -> None:
    from campaign.model.exported import Exported
    from campaign.output.exchange import table_text
    from campaign.output.exported import exported_json, exported_line
    from campaign.output.files import write_whole

    with _progress(quiet=quiet) as progress:
        size = write_whole(path, table_text(_counted(table, progress.told), form))
    done = Exported(table.kind, form, path, table.row_count, size)
    if json:
        common.write_json(exported_json(done, common.now_iso()))
    else:
        common.tell(exported_line(done), quiet=quiet)


def _to_stdout(db: str, asked: Asked, form: ExchangeForm, *, quiet: bool) -> None:
    from shutil import copyfileobj
    from tempfile import SpooledTemporaryFile

    from campaign.output.exchange import table_text
    from campaign.studies.export import outgoing_table

    with SpooledTemporaryFile(max_size=_SPOOL_BYTES) as spool:
        # Everything is read before anything is shown: whoever reads slowly must not keep the catalogue open.
        with outgoing_table(db, asked) as table, _progress(quiet=quiet) as progress:
            for piece in table_text(_counted(table, progress.told), form):
                spool.write(piece.encode("utf-8"))
        spool.seek(0)
        if hasattr(sys.stdout, "buffer"):
            # Bytes, so that no locale changes the table.
            copyfileobj(spool, sys.stdout.buffer)
        elif sys.stdout is not None:
            sys.stdout.write(spool.read().decode("utf-8"))
