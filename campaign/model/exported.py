"""Tables that leave the catalogue and come back, and what an export came to."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Literal

from campaign.model.exchange_columns import Cell, ExchangeColumn, ExchangeKind
from campaign.model.observations import Observation
from campaign.model.systems import DustRule, Episode, Site, Solution, System

ExchangeForm = Literal["csv", "ecsv", "votable", "json"]
EXCHANGE_FORMS: tuple[ExchangeForm, ...] = ("csv", "ecsv", "votable", "json")


@dataclass(frozen=True, slots=True)
class OutgoingTable:
    """A table on its way out: rows come one at a time, each with one cell a column.

    ``value_unit`` is the unit that the values of all observations have in common, if there is one.
    """

    kind: ExchangeKind
    columns: tuple[ExchangeColumn, ...]
    rows: Iterator[tuple[Cell, ...]]
    row_count: int
    value_unit: str | None = None

    def unit_of(self, column: ExchangeColumn) -> str | None:
        """The unit of a column; observed values have one where all of the table share it."""
        if self.kind == "observations" and column.name in ("value", "value_minus", "value_plus"):
            return self.value_unit
        return column.unit

    @property
    def axis_columns(self) -> list[str]:
        """Names of the columns that hold instants on the catalogue's axis."""
        return [column.name for column in self.columns if column.on_axis]


@dataclass(frozen=True, slots=True)
class Exported:
    """What ``export`` wrote; ``path`` is None for standard output."""

    kind: ExchangeKind
    form: ExchangeForm
    path: str | None
    rows: int
    size_bytes: int
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class CellFault:
    """One cell, or (without ``column``) one row, of a table that cannot be read."""

    column: str | None
    text: str
    code: str
    why: str


@dataclass(frozen=True, slots=True)
class ExchangeRow:
    """One row as read: ``raw`` as it stood, ``cells`` by column; of no use where there are faults."""

    line: int
    raw: tuple[str, ...]
    cells: Mapping[str, Cell]
    faults: tuple[CellFault, ...] = ()


@dataclass(frozen=True, slots=True)
class ExchangeTable:
    """A table that ``export`` wrote, on its way back; rows come one at a time.

    ``as_csv`` turns the cells of a row, as they stood, into what they would be in CSV.
    """

    kind: ExchangeKind
    columns: tuple[str, ...]
    rows: Iterator[ExchangeRow]
    as_csv: Callable[[Sequence[str]], tuple[str, ...]] = tuple


@dataclass(frozen=True, slots=True)
class ExchangedObservation:
    """An observation by the name of its system, with its site as described beside it."""

    system: str
    observation: Observation
    site: Site | None = None
    out_of_use: Literal["superseded", "withdrawn"] | None = None
    superseded_by: str | None = None
    withdrawn_why: str | None = None


@dataclass(frozen=True, slots=True)
class ExchangedSystem:
    """A system with the dust rule in force; its numbers are 0."""

    system: System
    rule: DustRule | None = None


@dataclass(frozen=True, slots=True)
class ExchangedSolution:
    """A solution by the name of its system, with ``adopted`` and ``weight``."""

    system: str
    solution: Solution


@dataclass(frozen=True, slots=True)
class ExchangedEpisode:
    """An episode by the name of its system."""

    system: str
    episode: Episode
    withdrawn: bool = field(default=False)
