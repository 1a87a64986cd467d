"""Tables for others: what the catalogue holds, row by row, in an order that no catalogue changes."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Any

from campaign.model.exchange_columns import UNIT_WORDS, Cell, ExchangeKind, exchange_columns
from campaign.model.exported import OutgoingTable
from campaign.model.records import SystemRecord
from campaign.model.systems import Episode
from campaign.studies.exchange_rows import Cells, episode_cells, in_order, solution_cells, system_cells
from campaign.studies.observations import Wanted, filters_of

if TYPE_CHECKING:
    from sqlalchemy import Connection


@dataclass(frozen=True, slots=True)
class Asked:
    """What is to be exported: of which systems (empty: of all), and which observations.

    ``wanted`` concerns observations alone; its ``system`` and ``out_of_use`` are not looked at.
    """

    kind: ExchangeKind
    systems: tuple[str, ...] = ()
    wanted: Wanted = field(default_factory=Wanted)
    also_out_of_use: bool = False


@contextmanager
def outgoing_table(db: str, asked: Asked) -> Iterator[OutgoingTable]:
    """Open the catalogue and hand over the table asked for; its rows are read as they are taken.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    asked : Asked
        Kind, systems by name or alias, and for observations the rest.

    Yields
    ------
    OutgoingTable
        Columns with their units, and rows: by the key of the primary name and then observations by
        ``bmjd_tdb`` (days) and ``uid``, solutions by label, episodes by date. Of one catalogue and of its
        copy they are the same. Good only inside the ``with``.

    Raises
    ------
    NotFound
        Unknown system or site; the nearest names are in the details.

    Notes
    -----
    Accuracy: exact. Source: the catalogue.
    """
    from campaign.catalogue import records, store, systems

    with store.reading(db) as connection:
        ids = [systems.find_system(connection, name).id for name in asked.systems] if asked.systems else None
        if asked.kind == "observations":
            known = systems.load_systems(connection, ids, include_retired=True)
            yield _observations(connection, asked, [(each.id, each.name) for each in known])
        else:
            found = records.load_records(connection, ids, include_retired=True)
            yield _knowledge(connection, asked, found)


def _observations(connection: Connection, asked: Asked, systems: Sequence[tuple[int, str]]) -> OutgoingTable:
    from campaign.catalogue.exchanged import count_exchanged, exchanged_observations

    filters = replace(
        filters_of(connection, replace(asked.wanted, system=None)), out_of_use=asked.also_out_of_use
    )
    counts = count_exchanged(connection, {number for number, _ in systems}, filters)
    units = {unit for unit in counts if unit is not None}
    common = units.pop() if len(units) == 1 else None
    return OutgoingTable(
        kind="observations",
        columns=exchange_columns("observations", also_out_of_use=asked.also_out_of_use),
        rows=exchanged_observations(connection, _by_name(systems), filters),
        row_count=sum(counts.values()),
        value_unit=None if common is None else UNIT_WORDS.get(common),
    )


def _by_name(systems: Sequence[tuple[int, str]]) -> list[tuple[int, str]]:
    return sorted(systems, key=lambda each: _name_order(each[1]))


def _name_order(name: str) -> tuple[str, str]:
    from campaign.catalogue.naming import name_key

    return name_key(name), name


def _knowledge(connection: Connection, asked: Asked, found: Sequence[SystemRecord]) -> OutgoingTable:
    """Systems, solutions or episodes: few enough to be held at once."""
    columns = exchange_columns(asked.kind, also_out_of_use=asked.also_out_of_use)
    ordered = sorted(found, key=lambda record: _name_order(record.system.name))
    if asked.kind == "systems":
        cells = [system_cells(record.system, record.rule) for record in ordered]
    elif asked.kind == "solutions":
        cells = [each for record in ordered for each in _solutions(record)]
    else:
        cells = [each for record in ordered for each in _episodes(connection, asked, record)]
    return OutgoingTable(asked.kind, columns, in_order(columns, iter(cells)), len(cells))


def _solutions(record: SystemRecord) -> list[Cells]:
    ordered = sorted(record.solutions, key=lambda solution: _name_order(solution.label))
    return [solution_cells(record.system.name, solution) for solution in ordered]


def _episodes(connection: Connection, asked: Asked, record: SystemRecord) -> list[Cells]:
    name = record.system.name
    cells = [episode_cells(name, episode) for episode in record.episodes]
    if asked.also_out_of_use:
        from campaign.catalogue.episodes import load_withdrawn_episodes

        withdrawn = load_withdrawn_episodes(connection, {record.system.id})
        gone: Sequence[Episode] = withdrawn.get(record.system.id, ())
        cells += [episode_cells(name, episode) | {"out_of_use": "withdrawn"} for episode in gone]
    return sorted(cells, key=_date_order)


def _date_order(cells: Cells) -> tuple[Any, ...]:
    """By date, then by cycle, then by anything that tells two episodes apart."""
    dates = [cells.get(f"{stage}_bmjd_tdb") for stage in ("onset", "maximum", "end")]
    known = [date for date in dates if isinstance(date, float)]
    cycle = cells.get("cycle")
    rest: list[tuple[str, Cell]] = sorted(cells.items(), key=lambda item: item[0])
    return min(known, default=float("inf")), cycle is None, cycle or 0, repr(rest)
