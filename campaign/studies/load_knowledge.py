"""Tables of others with systems, solutions or episodes: few rows, each read like the options of a command."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import Any

from sqlalchemy.exc import DBAPIError

from campaign.catalogue import mappings, store, systems
from campaign.catalogue.store import Writing
from campaign.errors import CampaignError, InputRefused
from campaign.model.instants import TypedInstant
from campaign.model.kept import Stamp
from campaign.model.loading import (
    FINISHING,
    SHOWN_TEXT,
    BadCell,
    ColumnUse,
    ForeignTable,
    Loaded,
    LoadWanted,
    LoadWarning,
    MappingRequest,
    Rejected,
    TableMapping,
    Understood,
)
from campaign.reading.angles import read_declination, read_right_ascension
from campaign.reading.columncells import without_missing
from campaign.reading.columnfields import FIELDS
from campaign.reading.columntimes import read_times
from campaign.reading.instants import read_instant
from campaign.reading.numbers import check_plain_text, quoted, read_number
from campaign.reading.tablefile import TableFile
from campaign.reading.tabletext import COMMENTED
from campaign.reading.values import read_measured, read_measured_or_bound
from campaign.studies.load_knowledge_entry import ENTERERS, Enterer, KnownSystems
from campaign.studies.load_names import alias_warnings, comment_warning, system_index
from campaign.studies.load_understood import names_for_rejects

# What is being done, how far it is, and out of how much (None: nobody knows).
Told = Callable[[str, int, int | None], None]

_TOLD_EVERY = 100
_LONGEST = {"notes": 2000, "note": 2000, "source": 400, "aliases": 2000}
_WORDS: Mapping[str, Mapping[str, str]] = {
    "systems.state": {word: word for word in ("episodic", "persistent", "candidate", "retired")},
    "episodes.state": {word: word for word in ("proposed", "confirmed", "rejected")},
    "solutions.omega_of": {"a": "A", "b": "B"},
    "solutions.epoch_marks": {
        "periastron": "periastron", "a in front": "A in front", "b in front": "B in front", "onset": "onset",
        "maximum": "maximum",
    },
}  # fmt: skip
# Where values may lie, as at the terminal: lowest, highest, and whether these are left out.
_DOMAINS: Mapping[str, tuple[float | None, float | None, bool, bool]] = {
    "distance": (0.0, None, True, False),
    "period": (0.0, None, True, False),
    "eccentricity": (0.0, 1.0, False, True),
    "omega": (-360.0, 360.0, False, False),
    "inclination": (0.0, 180.0, False, False),
    "node": (-360.0, 360.0, False, False),
    "k_a": (0.0, None, True, False),
    "k_b": (0.0, None, True, False),
    "a_au": (0.0, None, True, False),
    "a_arcsec": (0.0, None, True, False),
}


@dataclass(slots=True)
class _Row:
    """One row as read: values by field; what is wrong is among ``bad``."""

    line: int
    cells: tuple[str, ...]
    values: dict[str, Any]
    bad: list[BadCell]


def load_knowledge(
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
    """Load systems, solutions or episodes from a table of somebody.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    file : TableFile
        For its name.
    table : ForeignTable
        Rows are read as they are taken.
    mapping : TableMapping
        Columns and their units.
    wanted : LoadWanted
        How strict to be.
    understood : Understood
        As shown.
    request : MappingRequest
        To be kept, if that is wanted.
    told : callable
        Gets what is being done, how far it is and out of how much.

    Returns
    -------
    Loaded
        ``is_refused`` when a row is bad and those are not to be left out.

    Raises
    ------
    InputRefused
        The file breaks off.

    Notes
    -----
    Accuracy: as the readers of single values. Source: project convention.
    """
    reader = _Rows(mapping)
    rows = reader.read(table, lambda: told("reading", file.counter.bytes, file.size_bytes))
    enter = ENTERERS[mapping.kind]
    opening = store.rehearsing if wanted.rehearse else store.writing
    added = known = 0
    operation_id: int | None = None
    is_refused = False
    warnings = comment_warning(reader.passed_over)
    try:
        with opening(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
            known_systems = KnownSystems(systems.list_systems(writing.connection, include_retired=True))
            for number, row in enumerate(rows):
                told("loading", number, len(rows))
                if not row.bad:
                    is_new = _tried(writing, row, enter, known_systems)
                    added += is_new is True
                    known += is_new is False
            warnings += [*known_systems.told, *_aliases(writing, rows)]
            is_refused = any(row.bad for row in rows) and not wanted.skip_bad
            if is_refused:
                raise _NothingKept
            if wanted.keep_mapping is not None:
                mappings.keep_mapping(writing, wanted.keep_mapping, mapping.kind, request)
            writing.summarise(f"loaded {added} {mapping.kind} from {quoted(file.name)}")
            operation_id = writing.operation_id if writing.changed and not wanted.rehearse else None
            told(FINISHING, 0, None)
    except _NothingKept:
        pass
    bad_rows = [row for row in rows if row.bad]
    kept_rows = bad_rows if wanted.keeps_rejected else []
    return Loaded(
        understood,
        rows_read=len(rows),
        values_read=len(rows) - len(bad_rows),
        added=0 if is_refused else added,
        already_known=known,
        bad_rows=len(bad_rows),
        bad=tuple(cell for row in bad_rows for cell in row.bad),
        warnings=tuple(warnings),
        rehearsed=wanted.rehearse,
        is_refused=is_refused,
        kept_mapping=None if is_refused or wanted.rehearse else wanted.keep_mapping,
        operation_id=operation_id,
        line_word=table.line_word,
        columns=names_for_rejects(table, mapping),
        rejected=tuple(Rejected(row.cells, tuple(row.bad)) for row in kept_rows),
    )


class _NothingKept(Exception):  # noqa: N818 - never leaves this module
    """Leaves the transaction without a commit, although nothing went wrong."""


class _Rows:
    """Rows of a table, cell by cell."""

    def __init__(self, mapping: TableMapping) -> None:
        self._mapping = mapping
        self._fields = {field.name: field for field in FIELDS[mapping.kind]}
        self.passed_over: list[int] = []

    def read(self, table: ForeignTable, told: Callable[[], None]) -> list[_Row]:
        rows: list[_Row] = []
        for block in table.blocks:
            for misfit in block.misfits:
                if misfit.code == COMMENTED:
                    self.passed_over.append(misfit.line)
                    continue
                if not any(map(str.strip, misfit.cells)):
                    continue
                text = " | ".join(misfit.cells)[:SHOWN_TEXT]
                bad = [BadCell(misfit.line, None, misfit.code, misfit.why, text)]
                rows.append(_Row(misfit.line, misfit.cells, {}, bad))
            for place, line in enumerate(block.lines):
                if place % _TOLD_EVERY == 0:
                    told()
                cells = tuple(column[place] for column in block.columns)
                if any(map(str.strip, cells)):
                    rows.append(self._row(line, cells))
        return rows

    def _row(self, line: int, cells: tuple[str, ...]) -> _Row:
        row = _Row(line, cells, {}, [])
        shown = without_missing(cells, self._mapping.missing)
        for name, use in self._mapping.columns.items():
            text = shown[use.number - 1]
            if self._mapping.has_decimal_commas and self._is_number(name):
                text = text.replace(",", ".")
            self._take(row, name, text, use)
        for name, text in self._mapping.constants.items():
            self._take(row, name, text, None)
        for name, field in self._fields.items():
            used = self._mapping.columns.get(name)
            column = None if used is None else used.column
            is_told = column is not None and any(cell.column == column for cell in row.bad)
            if field.is_required and row.values.get(name) is None and not is_told:
                why = f"The row has no {field.spoken}."
                row.bad.append(BadCell(line, column, f"{name}-missing", why, ""))
        return row

    def _is_number(self, name: str) -> bool:
        meaning = self._mapping.instants.get(name)
        return self._fields[name].type in ("number", "measured") or (
            meaning is not None and meaning.count != "text"
        )

    def _take(self, row: _Row, name: str, text: str, use: ColumnUse | None) -> None:
        if not text.strip():
            return
        column = use.column if use is not None else f"--constant {name}"
        try:
            row.values[name] = self._read(name, text, column, use)
        except InputRefused as refused:
            why = refused.why or refused.message
            row.bad.append(BadCell(row.line, column, refused.code, why, text[:SHOWN_TEXT]))

    def _read(self, name: str, text: str, column: str, use: ColumnUse | None) -> Any:
        field = self._fields[name]
        if field.type == "word":
            words = _WORDS.get(f"{self._mapping.kind}.{name}")
            if words is None:
                return check_plain_text(text, column, _LONGEST.get(name, 120))
            return _chosen(text, words)
        if field.type == "position":
            return read_right_ascension(text, column) if name == "ra" else read_declination(text, column)
        if field.type == "instant":
            return self._instant(name, text, column)
        if field.type == "number" and not field.unit:
            return read_number(text, column)
        return self._measured(name, text, column, field.unit, use.unit if use is not None else None)

    def _measured(self, name: str, text: str, column: str, unit: str, own: str | None) -> Any:
        low, high, low_open, high_open = _DOMAINS.get(name, (None, None, False, False))
        if name.endswith("_error"):
            low = 0.0
        domain: dict[str, Any] = {"low": low, "high": high, "low_open": low_open, "high_open": high_open}
        reader = read_measured_or_bound if name == "period" else read_measured
        if own is not None:
            # A cell may say its unit itself; otherwise it has that of the column.
            try:
                return reader(f"{text} {own}", unit, column, **domain)
            except InputRefused:
                pass
        return reader(text, unit, column, **domain)

    def _instant(self, name: str, text: str, column: str) -> TypedInstant:
        meaning = self._mapping.instants.get(name)
        if meaning is None or meaning.count == "text":
            scale: Any = "utc" if meaning is None or meaning.scale is None else meaning.scale
            place: Any = "observatory" if meaning is None or meaning.place is None else meaning.place
            return read_instant(text, scale, place, column)
        times = read_times([text], meaning, column)
        if times.faults:
            raise InputRefused(
                f"{column} cannot be read.", why=times.faults[0].why, code=times.faults[0].code
            )
        return read_instant(times.texts[0], meaning.scale or "utc", meaning.place or "observatory", column)


def _chosen(text: str, words: Mapping[str, str]) -> str:
    word = words.get(" ".join(text.split()).casefold())
    if word is None:
        accepted = ", ".join(dict.fromkeys(words.values()))
        raise InputRefused(
            "The word is not known.", why=f"One of {accepted} is expected.", code="choice-refused"
        )
    return word


def _aliases(writing: Writing, rows: list[_Row]) -> list[LoadWarning]:
    """Systems that good rows call by another name than their own."""
    known = systems.list_systems(writing.connection, include_retired=True)
    index = system_index(known)
    for row in rows:
        if not row.bad and "system" in row.values:
            index.read(row.values["system"])
    return alias_warnings(index, known)


def _tried(writing: Writing, row: _Row, enter: Enterer, known: KnownSystems) -> bool | None:
    """Whether the row was new; None when it was refused, and then nothing of it is left."""
    assert writing.operation_id
    changed = writing.changed
    savepoint = writing.connection.begin_nested()
    before = len(known.told)
    try:
        is_new = enter(writing, row.values, known)
    except (CampaignError, DBAPIError) as refused:
        savepoint.rollback()
        writing.changed = changed
        text = " | ".join(row.cells)[:SHOWN_TEXT]
        if isinstance(refused, CampaignError):
            why = " ".join(part for part in (refused.message, refused.why) if part)
            row.bad.append(BadCell(row.line, None, refused.code, why, text))
        else:
            why = f"The catalogue does not accept it: {' '.join(str(refused.orig).split())[:SHOWN_TEXT]}."
            row.bad.append(BadCell(row.line, None, "value-out-of-range", why, text))
        return None
    savepoint.commit()
    known.told[before:] = [replace(each, lines=(row.line,)) for each in known.told[before:]]
    return is_new
