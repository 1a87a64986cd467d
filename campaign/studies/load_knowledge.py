"""Tables of others with systems, solutions or episodes: few rows, each read like the options of a command."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import Any

from sqlalchemy.exc import DBAPIError

from campaign.catalogue import mappings, solutions, store, systems
from campaign.catalogue.naming import name_key
from campaign.catalogue.store import Writing
from campaign.errors import CampaignError, Conflict, InputRefused
from campaign.model.instants import TypedInstant
from campaign.model.kept import Stamp
from campaign.model.loading import (
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
from campaign.model.measured import Measured
from campaign.model.systems import Episode, Solution, Star, System
from campaign.reading.angles import read_declination, read_right_ascension
from campaign.reading.columncells import without_missing
from campaign.reading.columnfields import FIELDS
from campaign.reading.columntimes import read_times
from campaign.reading.instants import read_instant
from campaign.reading.numbers import check_plain_text, quoted, read_number
from campaign.reading.tablefile import TableFile
from campaign.reading.values import read_measured, read_measured_or_bound
from campaign.studies.episodes import enter_episode
from campaign.studies.instants import moment_of
from campaign.studies.load_names import alias_warnings, place_warning, system_index
from campaign.studies.solutions import enter_solution

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
_ELEMENTS = {
    "eccentricity": "eccentricity", "omega": "omega_deg", "inclination": "inclination_deg",
    "node": "node_deg", "k_a": "k_a_kms", "k_b": "k_b_kms", "gamma": "gamma_kms", "a_au": "a_au",
    "a_arcsec": "a_arcsec",
}  # fmt: skip
# Enters one row, appends what an observer should look at, and tells whether the row was new.
_Enterer = Callable[[Writing, Mapping[str, Any], list[LoadWarning]], bool]
_STAGES = ("onset", "maximum", "end")


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
    rows = _Rows(mapping).read(table)
    enter = _ENTERERS[mapping.kind]
    opening = store.rehearsing if wanted.rehearse else store.writing
    added = known = 0
    operation_id: int | None = None
    is_refused = False
    warnings: list[LoadWarning] = []
    try:
        with opening(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
            for row in rows:
                if not row.bad:
                    is_new = _tried(writing, row, enter, warnings)
                    added += is_new is True
                    known += is_new is False
            warnings += _aliases(writing, rows)
            is_refused = any(row.bad for row in rows) and not wanted.skip_bad
            if is_refused:
                raise _NothingKept
            if wanted.keep_mapping is not None:
                mappings.keep_mapping(writing, wanted.keep_mapping, mapping.kind, request)
            writing.summarise(f"loaded {added} {mapping.kind} from {quoted(file.name)}")
            operation_id = writing.operation_id if writing.changed and not wanted.rehearse else None
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
        columns=tuple(column.name for column in table.columns),
        rejected=tuple(Rejected(row.cells, tuple(row.bad)) for row in kept_rows),
    )


class _NothingKept(Exception):  # noqa: N818 - never leaves this module
    """Leaves the transaction without a commit, although nothing went wrong."""


class _Rows:
    """Rows of a table, cell by cell."""

    def __init__(self, mapping: TableMapping) -> None:
        self._mapping = mapping
        self._fields = {field.name: field for field in FIELDS[mapping.kind]}

    def read(self, table: ForeignTable) -> list[_Row]:
        rows: list[_Row] = []
        for block in table.blocks:
            for misfit in block.misfits:
                if not any(map(str.strip, misfit.cells)):
                    continue
                text = " | ".join(misfit.cells)[:SHOWN_TEXT]
                bad = [BadCell(misfit.line, None, misfit.code, misfit.why, text)]
                rows.append(_Row(misfit.line, misfit.cells, {}, bad))
            for place, line in enumerate(block.lines):
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


def _tried(writing: Writing, row: _Row, enter: _Enterer, warnings: list[LoadWarning]) -> bool | None:
    """Whether the row was new; None when it was refused, and then nothing of it is left."""
    assert writing.operation_id
    changed = writing.changed
    savepoint = writing.connection.begin_nested()
    told: list[LoadWarning] = []
    try:
        is_new = enter(writing, row.values, told)
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
    warnings += [replace(each, lines=(row.line,)) for each in told]
    return is_new


def _with_error(values: Mapping[str, Any], name: str) -> Any:
    """A value with its error from the column beside it, if its cell has none."""
    value, error = values.get(name), values.get(f"{name}_error")
    if error is None or not isinstance(value, Measured):
        return value
    if value.minus is not None:
        raise InputRefused(
            f"The error of {name} is given twice.",
            why="It stands in the cell of the value and in its own column.",
            hint="Leave one of them out.",
            code="error-twice",
        )
    return Measured(value.value, error.value, error.value)


def _dated(values: Mapping[str, Any], name: str) -> TypedInstant | None:
    """An instant with its error from the column beside it; no narrower than a day or month that it names."""
    typed: TypedInstant | None = values.get(name)
    error: Measured | None = values.get(f"{name}_error")
    if typed is None or error is None:
        return typed
    floor = (typed.minus_d or 0.0) if typed.width_d else 0.0
    size = max(error.value, floor)
    return replace(typed, minus_d=size, plus_d=size, width_d=typed.width_d if size <= floor else 0.0)


def _enter_system(writing: Writing, values: Mapping[str, Any], told: list[LoadWarning]) -> bool:
    priority = values.get("priority", 3.0)
    if priority not in range(1, 10):
        raise InputRefused(
            "The priority is refused.", why="It is a whole number from 1 to 9.", code="priority-refused"
        )
    aliases = tuple(name for part in values.get("aliases", "").split(";") if (name := part.strip()))
    system = System(
        id=0,
        name=values["name"],
        ra_deg=values["ra"],
        dec_deg=values["dec"],
        distance_pc=_with_error(values, "distance"),
        parallax_mas=_with_error(values, "parallax"),
        state=values.get("state", "episodic"),
        priority=int(priority),
        notes=values.get("notes", ""),
        aliases=aliases,
        star_a=Star("A", spectral_type=values.get("spectral_type_a")),
        star_b=Star("B", spectral_type=values.get("spectral_type_b")),
    )
    wanted = name_key(system.name)
    known = systems.list_systems(writing.connection, include_retired=True)
    for there in known:
        if name_key(there.name) == wanted:
            if _says_nothing_new(system, there, values):
                return False
            raise Conflict(
                f"The system {there.name!r} is known with other values.",
                why="What is known is never changed by a load.",
                hint=f'Change it with: campaign system change "{there.name}".',
                code="known-otherwise",
            )
    systems.add_system(writing, system)
    near = place_warning(system, known, 0)
    told += [] if near is None else [near]
    return True


def _says_nothing_new(new: System, there: System, values: Mapping[str, Any]) -> bool:
    """Whether everything that the row says is known of the system."""
    pairs = {
        "ra": ("ra_deg",), "dec": ("dec_deg",), "distance": ("distance_pc",), "parallax": ("parallax_mas",),
        "state": ("state",), "priority": ("priority",), "notes": ("notes",),
    }  # fmt: skip
    alike = all(
        getattr(new, field) == getattr(there, field)
        for name, names in pairs.items()
        if name in values
        for field in names
    )
    names_there = {name_key(name) for name in there.aliases}
    types = ((new.star_a, there.star_a), (new.star_b, there.star_b))
    return (
        alike
        and all(name_key(name) in names_there for name in new.aliases)
        and all(one.spectral_type in (None, other.spectral_type) for one, other in types)
    )


def _enter_solution(writing: Writing, values: Mapping[str, Any], told: list[LoadWarning]) -> bool:
    elements: dict[str, Any] = {column: _with_error(values, name) for name, column in _ELEMENTS.items()}
    if elements["omega_deg"] is not None and values.get("omega_of") is None:
        raise InputRefused(
            "The row does not say which star omega belongs to.",
            why="omega of star A and omega of star B differ by 180 deg.",
            hint="Add a column omega_of, or say it for all rows: --constant omega_of=A.",
            code="omega-of-missing",
        )
    draft = Solution(
        id=0,
        system_id=0,
        label=values.get("label", ""),
        period_d=_with_error(values, "period"),
        epoch_marks=values.get("epoch_marks", "periastron"),
        omega_of=values.get("omega_of"),
        source=values.get("source", ""),
        note=values.get("note", ""),
        **elements,
    )
    system = systems.find_system(writing.connection, values["system"])
    epoch = _dated(values, "epoch")
    moment = None if epoch is None else moment_of(epoch, system)
    for there in solutions.solutions_of(writing.connection, system.id):
        same = replace(
            there, id=0, system_id=0, label=draft.label, adopted=False, weight=None, epoch=None,
            epoch_cycle=None, published_cycle_offset=None, covariance=None, data_until_bmjd_tdb=None,
        ) == draft  # fmt: skip
        label_fits = not draft.label or name_key(draft.label) == name_key(there.label)
        at, known_at = (None if m is None else m.bmjd_tdb for m in (moment, there.epoch))
        if same and label_fits and at == known_at:
            return False
    enter_solution(writing, values["system"], draft, epoch, None, None, adopt=False)
    return True


def _enter_episode(writing: Writing, values: Mapping[str, Any], told: list[LoadWarning]) -> bool:
    dates = {
        stage: (typed, values.get("band"), values.get("method"))
        for stage in _STAGES
        if (typed := _dated(values, stage)) is not None
    }
    cycle = values.get("cycle")
    if cycle is not None and cycle != int(cycle):
        raise InputRefused("The cycle is refused.", why="It is a whole number.", code="cycle-refused")
    draft = Episode(
        id=0,
        system_id=0,
        cycle=None if cycle is None else int(cycle),
        state=values.get("state", "confirmed"),
        source=values.get("source", ""),
        note=values.get("note", ""),
    )
    kept = enter_episode(writing, values["system"], draft, dates)
    told += [LoadWarning("future", f"{values['system']}: {text}", 1) for text in kept.warnings]
    return kept.changed


_ENTERERS: Mapping[str, _Enterer] = {
    "systems": _enter_system,
    "solutions": _enter_solution,
    "episodes": _enter_episode,
}
