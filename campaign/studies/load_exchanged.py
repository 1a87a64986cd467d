"""Tables that ``export`` wrote, back into a catalogue: bit for bit, in one operation or not at all."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

from sqlalchemy.exc import DBAPIError

from campaign.catalogue import sites, store, systems
from campaign.catalogue.store import Writing
from campaign.errors import CampaignError, UsageRefused
from campaign.model.exported import ExchangeForm, ExchangeRow, ExchangeTable
from campaign.model.kept import Stamp
from campaign.model.loading import (
    FINISHING,
    SHOWN_TEXT,
    BadCell,
    LoadConflict,
    Loaded,
    LoadWanted,
    LoadWarning,
    Rejected,
    Understood,
)
from campaign.reading.exchange import read_exchange
from campaign.reading.numbers import quoted
from campaign.reading.tablefile import TableFile

Told = Callable[[str, int, int | None], None]
Shown = Callable[[Understood], None]


@dataclass(slots=True)
class Tally:
    """What has come of an exchanged table so far."""

    keeps_rejected: bool
    as_csv: Callable[[Sequence[str]], tuple[str, ...]] = tuple
    rows: int = 0
    added: int = 0
    already_known: int = 0
    repeated: int = 0
    bad_rows: int = 0
    bad: list[BadCell] = field(default_factory=list)
    rejected: list[Rejected] = field(default_factory=list)
    conflicts: list[LoadConflict] = field(default_factory=list)
    warnings: list[LoadWarning] = field(default_factory=list)
    made: dict[str, int] = field(default_factory=dict)

    def refuse(self, row: ExchangeRow, *bad: BadCell) -> None:
        """Keep what is wrong with a row."""
        self.bad_rows += 1
        self.bad += bad
        if self.keeps_rejected:
            self.rejected.append(Rejected(self.as_csv(row.raw), bad))

    def refuse_for(self, row: ExchangeRow, error: CampaignError) -> None:
        """Keep that an error of ours stands against a row."""
        column = error.details.get("column")
        text = str(error.details.get("text", " | ".join(row.raw)))[:SHOWN_TEXT]
        why = " ".join(part for part in (error.message, error.why) if part)
        self.refuse(row, BadCell(row.line, column, error.code, why, text))


class _NothingKept(Exception):  # noqa: N818 - never leaves this module
    """Leaves the transaction without a commit, although nothing went wrong."""


def load_exchanged(
    db: str,
    stamp: Stamp,
    file: TableFile,
    form: ExchangeForm,
    wanted: LoadWanted,
    shown: Shown,
    told: Told,
) -> Loaded:
    """Load a table that ``export`` wrote.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    file : TableFile
        At its first byte.
    form : str
        As recognised.
    wanted : LoadWanted
        Its columns are known, so that nothing may be said of them.
    shown, told : callable
        As in ``campaign.studies.load.load_table``.

    Returns
    -------
    Loaded
        ``is_refused`` when nothing went in because of bad rows or conflicts.

    Raises
    ------
    InputRefused, UsageRefused
        The file breaks off, or columns were named.

    Notes
    -----
    Accuracy: exact; instants are kept in days as they stand, never converted again.

    Source: project convention (tables of ``export``).
    """
    table = read_exchange(file.stream, form)
    _refuse_said(wanted, table)
    understood = Understood(
        file.name, f"a table that campaign exported ({form})", table.kind, (), (), ("its columns are known",)
    )
    shown(understood)
    tally = Tally(wanted.keeps_rejected, table.as_csv)
    opening = store.rehearsing if wanted.rehearse else store.writing
    is_refused = False
    operation_id: int | None = None
    try:
        with opening(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
            _ENTERERS[table.kind](
                writing, table, tally, wanted, lambda: told("loading", file.counter.bytes, file.size_bytes)
            )
            is_refused = (tally.bad_rows > 0 and not wanted.skip_bad) or (
                bool(tally.conflicts) and not wanted.also_conflicts
            )
            if is_refused:
                raise _NothingKept
            writing.summarise(f"loaded {tally.added} {table.kind} from {quoted(file.name)}")
            operation_id = writing.operation_id if writing.changed and not wanted.rehearse else None
            told(FINISHING, 0, None)
    except _NothingKept:
        pass
    return Loaded(
        understood,
        rows_read=tally.rows,
        values_read=tally.rows - tally.bad_rows,
        added=0 if is_refused else tally.added,
        already_known=tally.already_known,
        repeated=tally.repeated,
        bad_rows=tally.bad_rows,
        bad=tuple(tally.bad),
        conflicts=tuple(tally.conflicts),
        warnings=tuple(tally.warnings),
        rehearsed=wanted.rehearse,
        is_refused=is_refused,
        operation_id=operation_id,
        made={} if is_refused else dict(tally.made),
        columns=table.columns,
        rejected=tuple(tally.rejected),
    )


def _refuse_said(wanted: LoadWanted, table: ExchangeTable) -> None:
    request = wanted.request
    said = {
        "--column": bool(request.columns),
        "--constant or --system": bool(request.constants),
        "--missing": bool(request.missing),
        "--mapping": wanted.mapping is not None,
        "--keep-mapping": wanted.keep_mapping is not None,
        "--encoding": wanted.encoding is not None,
        "--as": request.kind is not None and request.kind != table.kind,
    }
    for option, is_said in said.items():
        if is_said:
            raise UsageRefused(
                f"{option} does not go with a table that campaign exported.",
                why=f"It is a table of {table.kind}, and what its columns hold is known.",
                hint=f"Leave {option} out.",
            )


def attempted(writing: Writing, tally: Tally, row: ExchangeRow, enter: Callable[[], None]) -> bool:
    """Enter something in a way that leaves nothing when it is refused; the refusal goes to the row.

    Parameters
    ----------
    writing : Writing
        The operation under way.
    tally : Tally
        Gets the refusal.
    row : ExchangeRow
        Where it stood.
    enter : callable
        Writes.

    Returns
    -------
    bool
        Whether it was entered.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    # The row of the operation itself must not go with what is taken back.
    assert writing.operation_id
    changed = writing.changed
    savepoint = writing.connection.begin_nested()
    try:
        enter()
    except CampaignError as refused:
        savepoint.rollback()
        writing.changed = changed
        tally.refuse_for(row, refused)
        return False
    except DBAPIError as error:
        savepoint.rollback()
        writing.changed = changed
        why = f"The catalogue does not accept it: {' '.join(str(error.orig).split())[:SHOWN_TEXT]}."
        tally.refuse(
            row, BadCell(row.line, None, "value-out-of-range", why, " | ".join(row.raw)[:SHOWN_TEXT])
        )
        return False
    savepoint.commit()
    return True


def good_rows(table: ExchangeTable, tally: Tally, told: Callable[[], None]) -> Any:
    """Rows that could be read, one by one; the others go to the tally.

    Parameters
    ----------
    table : ExchangeTable
        Read as it is taken.
    tally : Tally
        Counts every row.
    told : callable
        Called now and then.

    Yields
    ------
    ExchangeRow
        Units as in ``campaign.model.exchange_columns``.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    for row in table.rows:
        tally.rows += 1
        if tally.rows % 1000 == 0:
            told()
        if row.faults:
            cells = [
                BadCell(row.line, fault.column, fault.code, fault.why, fault.text) for fault in row.faults
            ]
            tally.refuse(row, *cells)
        else:
            yield row


def _observations(
    writing: Writing, table: ExchangeTable, tally: Tally, wanted: LoadWanted, told: Callable[[], None]
) -> None:
    from campaign.studies.load_exchanged_observations import enter_observations

    known = systems.list_systems(writing.connection, include_retired=True)
    enter_observations(
        writing, good_rows(table, tally, told), tally, known, sites.list_sites(writing.connection)
    )


def _systems(
    writing: Writing, table: ExchangeTable, tally: Tally, wanted: LoadWanted, told: Callable[[], None]
) -> None:
    from campaign.studies.load_exchanged_knowledge import enter_systems

    enter_systems(writing, good_rows(table, tally, told), tally)


def _solutions(
    writing: Writing, table: ExchangeTable, tally: Tally, wanted: LoadWanted, told: Callable[[], None]
) -> None:
    from campaign.studies.load_exchanged_knowledge import enter_solutions

    enter_solutions(writing, good_rows(table, tally, told), tally)


def _episodes(
    writing: Writing, table: ExchangeTable, tally: Tally, wanted: LoadWanted, told: Callable[[], None]
) -> None:
    from campaign.studies.load_exchanged_knowledge import enter_episodes

    enter_episodes(writing, good_rows(table, tally, told), tally)


_ENTERERS: dict[str, Callable[[Writing, ExchangeTable, Tally, LoadWanted, Callable[[], None]], None]] = {
    "observations": _observations,
    "systems": _systems,
    "solutions": _solutions,
    "episodes": _episodes,
}
