"""Tell who changed what and when: of the whole catalogue, of one system, or of one observation."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

from sqlalchemy import Connection

from campaign.catalogue import involved, journal, observed, store, systems
from campaign.catalogue.telling import Teller
from campaign.errors import NotFound
from campaign.model.history import EntryChange, History, Operation, ToldOperation
from campaign.model.instants import TypedInstant
from campaign.studies.instants import refuse_reversed

_MJD_ZERO = datetime(1858, 11, 17, tzinfo=UTC)


def tell_history(
    db: str,
    about: str | None = None,
    *,
    who: str | None = None,
    since: TypedInstant | None = None,
    until: TypedInstant | None = None,
    limit: int | None = None,
    operation_id: int | None = None,
) -> History:
    """Operations with everything that they changed, newest first.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    about : str, optional
        Name or alias of a system, or the number of an observation: only what concerns it.
    who : str, optional
        Only what this person did.
    since, until : TypedInstant, optional
        Only what was done in this time; a day counts whole.
    limit : int, optional
        At most so many operations.
    operation_id : int, optional
        Only this operation.

    Returns
    -------
    History
        ``more`` says that the limit left some out.

    Raises
    ------
    NotFound
        Unknown system, observation or operation.
    InputRefused
        Dates that end before they begin.

    Notes
    -----
    Accuracy: entry times are those of the clock of whoever made the entry. Source: the catalogue.
    """
    refuse_reversed(since, until)
    with store.reading(db) as connection:
        subject = _subject(connection, about)
        numbers = subject.operations
        if operation_id is not None:
            journal.get_operation(connection, operation_id)
            numbers = {operation_id} if numbers is None else numbers & {operation_id}
        found = journal.list_operations(
            connection,
            numbers,
            who=who,
            since=entry_time(since, latest=False),
            until=entry_time(until, latest=True),
            limit=None if limit is None else limit + 1,
        )
        more = limit is not None and len(found) > limit
        teller = Teller(connection)
        told = tuple(ToldOperation(each, subject.tell(teller, each)) for each in found[:limit])
        observation = None
        if subject.observation_ids:
            observation = observed.get_observation(connection, subject.observation_ids[-1])
    return History(subject.name, told, more, observation)


def entry_time(instant: TypedInstant | None, *, latest: bool) -> datetime | None:
    """An instant of the question as a time of entry; a day, month or year from its start to its end.

    Parameters
    ----------
    instant : TypedInstant or None
        In UTC.
    latest : bool
        Whether the end is meant.

    Returns
    -------
    datetime or None
        Aware, UTC.

    Notes
    -----
    Accuracy: 1 microsecond, but for the day of a leap second. Source: project convention.
    """
    if instant is None:
        return None
    edge = instant.mjd + (0.5 if latest else -0.5) * instant.width_d
    return _MJD_ZERO + timedelta(days=edge)


class _Subject:
    """What the history is about: everything."""

    name = "the catalogue"
    operations: set[int] | None = None
    observation_ids: tuple[int, ...] = ()

    def __init__(self, connection: Connection) -> None:
        self._connection = connection

    def tell(self, teller: Teller, operation: Operation) -> tuple[EntryChange, ...]:
        """The operation's changes that concern the subject."""
        return teller.tell(operation.id, journal.effects_of(self._connection, operation.id))


class _OfSystem(_Subject):
    def __init__(self, connection: Connection, name: str) -> None:
        super().__init__(connection)
        system = systems.find_system(connection, name)
        self._system_id = system.id
        self.name = system.name
        self.operations = involved.operations_of_system(connection, system.id)

    def tell(self, teller: Teller, operation: Operation) -> tuple[EntryChange, ...]:
        effects = journal.effects_of(self._connection, operation.id)
        load = involved.load_of(effects)
        told = []
        for change in teller.tell(operation.id, effects):
            if change.rows is not None and load is not None:
                rows = involved.rows_of_system(self._connection, load.brought_by, self._system_id)
                if rows:
                    told.append(EntryChange(change.subject, change.action, self.name, rows=rows))
            elif change.system == self.name:
                told.append(change)
        return tuple(told)


class _OfObservation(_Subject):
    def __init__(self, connection: Connection, observation_id: int) -> None:
        super().__init__(connection)
        observed.get_observation(connection, observation_id)
        versions = involved.versions_of(connection, observation_id)
        self.observation_ids = tuple(versions)
        self.name = f"observation {observation_id}"
        self.operations = involved.operations_of_observations(connection, versions)

    def tell(self, teller: Teller, operation: Operation) -> tuple[EntryChange, ...]:
        numbers = list(self.observation_ids)
        effects = journal.effects_of(self._connection, operation.id)
        told = list(teller.tell(operation.id, involved.effects_on_observations(effects, numbers)))
        load = involved.load_of(effects)
        if load is not None:
            of_load = [n for n in numbers if teller.brought_by(n) == load.brought_by]
            told += [teller.tell_loaded(n, operation.id, load) for n in of_load]
        return tuple(told)


def _subject(connection: Connection, about: str | None) -> _Subject:
    if about is None:
        return _Subject(connection)
    if not (about.isascii() and about.isdigit()):
        return _OfSystem(connection, about)
    try:
        return _OfObservation(connection, int(about))
    except NotFound:
        # A system may bear a number for a name.
        try:
            return _OfSystem(connection, about)
        except NotFound:
            raise observed.no_observation(int(about)) from None
