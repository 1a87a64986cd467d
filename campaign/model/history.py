"""Who changed what and when, what an undo would take back, and observations as a list with their fate."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any, Literal

from campaign.model.observations import Observation

EffectKind = Literal["added", "changed", "removed", "replaced"]
BulkKind = Literal["brought", "withdrawn", "restored"]


@dataclass(frozen=True, slots=True)
class Operation:
    """One command that changed the catalogue.

    ``undoes_id`` is the operation that it took back; ``undone_by_id`` the one that took it back. It
    ``stands`` when what it did holds: never taken back, or taken back and put back again.
    """

    id: int
    at: datetime
    who: str
    command: str
    summary: str
    undoes_id: int | None = None
    undone_by_id: int | None = None
    stands: bool = True


@dataclass(frozen=True, slots=True)
class RowEffect:
    """What an operation came to for one row of a table.

    ``added``: ``after`` is the whole row. ``removed``: ``before`` is. ``changed``: both hold the columns
    that differ. ``replaced``: both are whole rows under one number.
    """

    table: str
    row_id: int
    kind: EffectKind
    before: Mapping[str, Any]
    after: Mapping[str, Any]


@dataclass(frozen=True, slots=True)
class BulkEffect:
    """What an operation came to for all observations that the load ``brought_by`` brought."""

    kind: BulkKind
    brought_by: int
    rows: int
    withdrawn_at: datetime | None = None


Effect = RowEffect | BulkEffect


@dataclass(frozen=True, slots=True)
class Dependant:
    """A later operation that builds on the one to be taken back; ``reason`` completes "it ..."."""

    operation: Operation | None
    reason: str


@dataclass(frozen=True, slots=True)
class FieldChange:
    """One field before and after, in ``unit``: a number, a text, a ``Measured``, ``Limit`` or ``Moment``."""

    name: str
    unit: str
    before: Any
    after: Any


@dataclass(frozen=True, slots=True)
class EntryChange:
    """What happened to one entry of the catalogue, in the words of the people who keep it.

    ``action`` is one of: added, changed, removed, withdrawn, put back, replaced, ended, loaded.
    ``subject`` says what kind of entry (``solution 'Orrery 2029'``, ``observation 12``), ``system`` whose
    it is. ``rows`` counts the observations of a load.
    """

    subject: str
    action: str
    system: str | None = None
    fields: tuple[FieldChange, ...] = ()
    rows: int | None = None
    note: str = ""


@dataclass(frozen=True, slots=True)
class ToldOperation:
    """One operation with everything that it changed."""

    operation: Operation
    changes: tuple[EntryChange, ...]


@dataclass(frozen=True, slots=True)
class History:
    """Operations, newest first. ``more`` says that older ones were left out."""

    about: str
    operations: tuple[ToldOperation, ...]
    more: bool = False
    observation: Observation | None = None


@dataclass(frozen=True, slots=True)
class Undone:
    """What an undo did, or would do.

    ``operation`` is the one taken back and ``by_id`` the new one; ``first`` is the command at the start,
    where undos were undone in between.
    """

    operation: Operation
    first: Operation
    changes: tuple[EntryChange, ...]
    puts_back: bool
    by_id: int | None = None


@dataclass(frozen=True, slots=True)
class ListedObservation:
    """One observation with its system, and its fate where it is out of use."""

    observation: Observation
    system: str
    utc: str | None
    entered_at: datetime
    entered_by: str
    operation_id: int
    superseded_by_id: int | None = None
    superseded_at: datetime | None = None
    withdrawn_at: datetime | None = None
    withdrawn_why: str | None = None

    @property
    def in_use(self) -> bool:
        """Whether it counts: neither replaced nor withdrawn."""
        return self.superseded_at is None and self.withdrawn_at is None


@dataclass(frozen=True, slots=True)
class ObservationList:
    """Observations in order of time; ``found`` counts those that the filters let through."""

    rows: tuple[ListedObservation, ...]
    found: int
    filters: Mapping[str, Any] = field(default_factory=dict)
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Amended:
    """A corrected observation: ``id`` takes the place of ``replaced_id``; equal when nothing differed."""

    system: str
    id: int
    replaced_id: int
    fields: tuple[FieldChange, ...]
    changed: bool
    written: bool
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Withdrawn:
    """Observations taken out of use, for one reason."""

    observations: tuple[ListedObservation, ...]
    why: str
    written: bool
