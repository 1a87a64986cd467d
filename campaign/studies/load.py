"""Load a table of somebody: understood first, checked row by row, then all in one operation or nothing."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from datetime import UTC
from typing import BinaryIO

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Connection

from campaign.catalogue import bulk, mappings, sites, store, systems
from campaign.catalogue.store import Writing
from campaign.errors import Conflict, InputRefused, UsageRefused
from campaign.model.columns import ObservationColumns
from campaign.model.kept import Stamp
from campaign.model.loading import (
    FINISHING,
    KNOWLEDGE_KINDS,
    ForeignTable,
    Loaded,
    LoadWanted,
    MappingRequest,
    TableMapping,
    Understood,
)
from campaign.model.suspicion import Suspicion
from campaign.model.systems import Site, System
from campaign.reading.columnfields import field_named
from campaign.reading.columnnames import understand
from campaign.reading.exchange import recognise
from campaign.reading.foreign import read_foreign_table
from campaign.reading.numbers import quoted
from campaign.reading.tablefile import TableFile, opened_table
from campaign.studies.collecting import collector_at_rest
from campaign.studies.load_axis import on_axis
from campaign.studies.load_known import KnownCheck, check_known
from campaign.studies.load_rows import CheckedRows, RowChecker
from campaign.studies.load_understood import names_for_rejects, understood_mapping
from campaign.studies.load_warnings import load_warnings

# What is being done, how far it is, and out of how much (None: nobody knows).
Told = Callable[[str, int, int | None], None]
Shown = Callable[[Understood], None]
_MJD_OF_UNIX_EPOCH = 40_587.0


def load_table(
    db: str,
    stamp: Stamp,
    path: str,
    standard_input: BinaryIO | None,
    wanted: LoadWanted,
    shown: Shown,
    told: Told,
) -> Loaded:
    """Load a table into the catalogue, whole or not at all.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    path : str
        The file; ``-`` for ``standard_input``.
    standard_input : binary file or None
        Read to its end.
    wanted : LoadWanted
        What the user said of the table, and how strict to be.
    shown : callable
        Gets what was understood of the table before anything is written.
    told : callable
        Gets what is being done, how far it is and out of how much; ``FINISHING`` comes last, before what was
        entered is committed.

    Returns
    -------
    Loaded
        With every bad cell, conflict and warning; ``is_refused`` when nothing went in because of them.

    Raises
    ------
    NotFound, InputRefused, UsageRefused, Conflict
        The file cannot be read as a table, or its columns are not understood; nothing was changed.

    Notes
    -----
    Accuracy: each row is the same to the last bit as when it is logged alone.

    Source: design, sections 4 (time, values) and 5.
    """
    with collector_at_rest(), opened_table(path, standard_input) as file:
        form = recognise(file.head)
        if form is not None:
            from campaign.studies.load_exchanged import load_exchanged

            return load_exchanged(db, stamp, file, form, wanted, shown, told)
        request = _request(db, wanted)
        file.counter.heard = lambda: told("reading", file.counter.bytes, file.size_bytes)
        table = read_foreign_table(file, wanted.encoding)
        mapping = understand(table.columns, request)
        understood = understood_mapping(file.name, table, mapping)
        shown(understood)
        if mapping.kind in KNOWLEDGE_KINDS:
            from campaign.studies.load_knowledge import load_knowledge

            request = kept_request(mapping, request)
            return load_knowledge(db, stamp, file, table, mapping, wanted, understood, request, told)
        return _load_observations(db, stamp, file, table, mapping, wanted, understood, request, told)


def _request(db: str, wanted: LoadWanted) -> MappingRequest:
    """What was said of the columns: by a kept mapping, and by options, which come first."""
    said = wanted.request
    if wanted.mapping is None:
        return said
    with store.reading(db) as connection:
        kept = mappings.find_mapping(connection, wanted.mapping)
    if said.kind is not None and said.kind != kept.kind:
        raise UsageRefused(
            f"--as {said.kind} and the mapping {quoted(wanted.mapping)} contradict each other.",
            why=f"The mapping is one of {kept.kind}.",
            hint="Leave one of them out.",
        )
    return MappingRequest(
        kept.kind,
        {**kept.columns, **said.columns},
        {**kept.constants, **said.constants},
        tuple(dict.fromkeys((*kept.missing, *said.missing))),
    )


def kept_request(mapping: TableMapping, request: MappingRequest) -> MappingRequest:
    """What would have to be said for the same understanding, whatever names say then.

    Parameters
    ----------
    mapping : TableMapping
        As understood.
    request : MappingRequest
        As said.

    Returns
    -------
    MappingRequest
        Columns by field as typed, or by their names.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    typed = {}
    for name, text in request.columns.items():
        field = field_named(mapping.kind, name)
        typed["time" if field is None else field.name] = text
    # Two columns of one time are known by their names again.
    named = {name: use.column for name, use in mapping.columns.items() if use.clock_number is None}
    return MappingRequest(mapping.kind, {**named, **typed}, request.constants, request.missing)


def _load_observations(
    db: str,
    stamp: Stamp,
    file: TableFile,
    table: ForeignTable,
    mapping: TableMapping,
    wanted: LoadWanted,
    understood: Understood,
    request: MappingRequest,
    told: Told,
) -> Loaded:
    with store.reading(db) as connection:
        known_systems = systems.list_systems(connection, include_retired=True)
        known_sites = sites.list_sites(connection)
    checker = RowChecker(mapping, known_systems, known_sites, keeps_rejected=wanted.keeps_rejected)
    for block in table.blocks:
        checker.take(block)
    rows = checker.finish()
    result = Loaded(
        understood,
        rows_read=checker.rows_read,
        values_read=rows.size,
        without_value=checker.without_value,
        bad_rows=checker.bad_rows,
        bad=tuple(sorted(checker.bad, key=lambda cell: cell.line)),
        rehearsed=wanted.rehearse,
        line_word=table.line_word,
        columns=names_for_rejects(table, mapping),
        rejected=tuple(sorted(checker.rejected, key=lambda row: row.bad[0].line)),
    )
    if not checker.rows_read:
        raise InputRefused(
            f"{file.name} holds no rows.",
            why="It has nothing under the names of its columns.",
            hint="Check the file.",
            code="table-empty",
        )
    if checker.bad_rows and not wanted.skip_bad:
        return replace(result, is_refused=True)
    if not rows.size:
        return result
    told("checking", 0, rows.size)
    columns = rows.columns(known_systems, known_sites, on_axis(rows, known_systems, known_sites))
    entry = _Entry(stamp, wanted, checker, rows, columns, known_systems, known_sites, told)
    if wanted.rehearse:
        with store.reading(db) as connection:
            return entry.compared(connection, result)[0]
    with store.loading(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        return entry.written(writing, result, file.name, kept_request(mapping, request))


class _Entry:
    """Good rows on their way into the catalogue."""

    def __init__(
        self,
        stamp: Stamp,
        wanted: LoadWanted,
        checker: RowChecker,
        rows: CheckedRows,
        columns: ObservationColumns,
        known_systems: list[System],
        known_sites: list[Site],
        told: Told,
    ) -> None:
        self._now_mjd = _MJD_OF_UNIX_EPOCH + stamp.at.astimezone(UTC).timestamp() / 86_400.0
        self._wanted = wanted
        self._checker = checker
        self._rows = rows
        self._columns = columns
        self._systems = known_systems
        self._sites = known_sites
        self._told = told
        self._digests = bulk.digests_of(columns)

    def compared(self, connection: Connection, result: Loaded) -> tuple[Loaded, KnownCheck]:
        """What would be added, with conflicts and warnings."""
        size = self._rows.size
        check = check_known(
            connection, self._rows, self._columns, self._digests, self._systems,
            lambda done: self._told("checking", done, size),
        )  # fmt: skip
        warnings = load_warnings(
            connection, self._rows, self._columns, check, self._systems, self._sites, self._checker.systems,
            self._now_mjd,
        )  # fmt: skip
        is_refused = bool(check.conflicts) and not self._wanted.also_conflicts
        fresh = int(np.count_nonzero(~(check.known | check.repeated)))
        return replace(
            result,
            added=0 if is_refused else fresh,
            already_known=int(np.count_nonzero(check.known)),
            repeated=int(np.count_nonzero(check.repeated & ~check.known)),
            conflicts=tuple(check.conflicts),
            warnings=warnings,
            is_refused=is_refused,
        ), check

    def written(self, writing: Writing, result: Loaded, name: str, request: MappingRequest) -> Loaded:
        """The same, and everything in the catalogue."""
        self._refuse_changed(writing.connection)
        result, check = self.compared(writing.connection, result)
        if result.is_refused:
            return result
        fresh = np.flatnonzero(~(check.known | check.repeated))
        added = bulk.add_columns(
            writing, self._columns, self._digests, fresh,
            lambda done: self._told("writing", done, len(fresh)),
        )  # fmt: skip
        kind = str(self._columns.same["kind"])
        if self._wanted.keep_mapping is not None:
            mappings.keep_mapping(writing, self._wanted.keep_mapping, self._checker.kind, request)
        number = len(np.unique(self._rows.system[fresh]))
        writing.summarise(
            f"loaded {added} {kind} {'row' if added == 1 else 'rows'} of {number} "
            f"{'system' if number == 1 else 'systems'} from {quoted(name)}"
            if added
            else f"kept the mapping {quoted(self._wanted.keep_mapping or '')}"
        )
        suspicions = self._suspicions(writing.connection, fresh) if kind == "photometry" and added else ()
        self._told(FINISHING, 0, None)
        return replace(
            result,
            added=added,
            suspicions=suspicions,
            kept_mapping=self._wanted.keep_mapping,
            operation_id=writing.operation_id if writing.changed else None,
        )

    def _suspicions(self, connection: Connection, fresh: NDArray[np.intp]) -> tuple[Suspicion, ...]:
        from campaign.studies.load_suspicions import load_suspicions

        numbers = np.array([system.id for system in self._systems])[self._rows.system[fresh]]
        return load_suspicions(connection, numbers, self._columns.numbers["bmjd_tdb"][fresh], self._now_mjd)

    def _refuse_changed(self, connection: Connection) -> None:
        """Names and positions must still be those that the rows were read by."""
        if (
            systems.list_systems(connection, include_retired=True) != self._systems
            or sites.list_sites(connection) != self._sites
        ):
            raise Conflict(
                "Systems or sites were changed by somebody else while the table was read.",
                why="The rows were checked against what was there before.",
                hint="Nothing was loaded; repeat the command.",
                code="changed-meanwhile",
            )
