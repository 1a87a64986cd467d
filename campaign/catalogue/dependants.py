"""What stands against taking an operation back: later operations that build on what it did.

A later operation depends on an earlier one when it changed the same entry in the same respect, when what
it entered refers to what would go out of use, or (``campaign.catalogue.returning``) when it holds the
place of what would come back. Later operations that were themselves taken back do not count.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from typing import Any

from sqlalchemy import ColumnElement, Connection, Table, and_, exists, select

from campaign.catalogue.journal import Undos, in_portions, operations_by_id
from campaign.catalogue.lifecycle import (
    FOLLOWING,
    SPOKEN,
    entered_by,
    goes_out,
    is_lasting,
    loads_out,
    references,
    row_in_use,
    rows_out,
)
from campaign.catalogue.returning import holders_of_what_returns
from campaign.catalogue.tables import (
    adoptions,
    changes,
    dust_rules,
    episodes,
    metadata,
    observations,
    solutions,
    systems,
)
from campaign.model.history import BulkEffect, Dependant, Effect, RowEffect

# Of these a system has one state at a time: any later change of the state depends on the one before.
_ONE_A_SYSTEM = ((adoptions, "adopted otherwise later"), (dust_rules, "set the dust rule later"))
_ANCHOR = frozenset({"cycle_anchor_bmjd_tdb", "cycle_anchor_period_d"})


def dependants_of(connection: Connection, operation_id: int, effects: Sequence[Effect]) -> list[Dependant]:
    """Later operations that depend on this one, newest first; those that cannot be named last."""
    undos = Undos(connection)
    kept = [effect for effect in effects if not is_lasting(effect)]
    search = _Search(connection, operation_id, kept, undos.without_effect_since(operation_id))
    reasons = dict(search.reasons())
    for number, reason in holders_of_what_returns(connection, kept):
        reasons.setdefault(number, reason)
    reasons.pop(operation_id, None)
    found = operations_by_id(connection, [number for number in reasons if number is not None], undos)
    named = [Dependant(found[n], reasons[n]) for n in sorted(found, reverse=True)]
    return named + [Dependant(None, reason) for number, reason in reasons.items() if number is None]


class _Search:
    """One reason for each later operation that builds on the effects."""

    def __init__(
        self, connection: Connection, operation_id: int, effects: Sequence[Effect], idle: Collection[int]
    ) -> None:
        self._connection = connection
        self._operation_id = operation_id
        self._effects = effects
        self._idle = idle
        self._reasons: dict[int | None, str] = {}

    def reasons(self) -> Mapping[int | None, str]:
        self._same_entries()
        self._same_entries_with_their_load()
        self._same_state_of_a_system()
        self._same_load()
        self._counted_from_the_anchor()
        for child in metadata.tables.values():
            for column, parent in references(child):
                for some in in_portions(rows_out(self._effects, parent)):
                    self._children(child, column.in_(some), parent)
        return self._reasons

    def _add(self, operation_id: int | None, reason: str) -> None:
        self._reasons.setdefault(operation_id, reason)

    def _rows(self, *kinds: str) -> dict[str, dict[int, RowEffect]]:
        """Effects on single rows, by table and number."""
        found: dict[str, dict[int, RowEffect]] = {}
        for effect in self._effects:
            if isinstance(effect, RowEffect) and effect.kind in kinds:
                found.setdefault(effect.table, {})[effect.row_id] = effect
        return found

    def _later_changes(self, condition: ColumnElement[bool]) -> list[Any]:
        """Changes by later operations that came to something."""
        columns = changes.c
        rows = self._connection.execute(
            select(columns.operation_id, columns.row_id, columns.action, columns.before, columns.after)
            .where(columns.operation_id > self._operation_id, condition)
            .order_by(columns.id)
        )
        return [row for row in rows if row.operation_id not in self._idle]

    def _same_entries(self) -> None:
        # A row that was removed has a number that may have been given again: it is nobody's.
        for table, effects in self._rows("added", "changed", "replaced").items():
            for some in in_portions(effects):
                same = and_(changes.c.table_name == table, changes.c.row_id.in_(some))
                for row in self._later_changes(same):
                    effect = effects[row.row_id]
                    touched = set(row.before or ()) | set(row.after or ())
                    if goes_out(effect) and effect.kind != "replaced":
                        depends = not touched <= FOLLOWING.get(table, frozenset())
                    else:
                        depends = row.action != "update" or bool(touched & effect.before.keys())
                    if depends:
                        self._add(row.operation_id, "changed the same entry later")

    def _same_entries_with_their_load(self) -> None:
        """Loads taken back or put back as a whole, which changes each observation that they brought."""
        own = self._rows("added", "changed").get(observations.name, {})
        loads: set[int] = set()
        for some in in_portions(own):
            brought = select(observations.c.operation_id).where(observations.c.id.in_(some)).distinct()
            loads.update(self._connection.execute(brought).scalars())
        if not loads:
            return
        whole = and_(changes.c.table_name == observations.name, changes.c.row_id.is_(None))
        for row in self._later_changes(whole):
            if row.after.get("brought_by") in loads:
                self._add(row.operation_id, "took back the load that the observation came with")

    def _same_state_of_a_system(self) -> None:
        for table, reason in _ONE_A_SYSTEM:
            numbers = self._rows("added", "changed").get(table.name, {})
            for some in in_portions(numbers):
                owners = select(table.c.system_id).where(table.c.id.in_(some))
                rows_of_owners = select(table.c.id).where(table.c.system_id.in_(owners))
                same = and_(changes.c.table_name == table.name, changes.c.row_id.in_(rows_of_owners))
                for row in self._later_changes(same):
                    self._add(row.operation_id, reason)

    def _same_load(self) -> None:
        for effect in self._effects:
            if isinstance(effect, BulkEffect):
                brought = exists().where(
                    observations.c.id == changes.c.row_id,
                    observations.c.operation_id == effect.brought_by,
                )
                for row in self._later_changes(and_(changes.c.table_name == observations.name, brought)):
                    self._add(row.operation_id, f"changed observation {row.row_id}, which this load brought")

    def _counted_from_the_anchor(self) -> None:
        """Cycles that were counted from the anchor which this operation set."""
        anchored = [
            number
            for number, effect in self._rows("changed").get(systems.name, {}).items()
            if any(effect.after.get(name) is not None for name in _ANCHOR)
        ]
        for table, column in ((solutions, "epoch_cycle"), (episodes, "cycle")):
            for some in in_portions(anchored):
                counted = select(table.c.id).where(
                    table.c.system_id.in_(some), table.c[column].is_not(None), row_in_use(table)
                )
                for number in set(self._connection.execute(counted).scalars()):
                    operation_id = entered_by(self._connection, table, number)
                    # What was there before, and only taken back and put back since, was not counted from it.
                    is_later = operation_id is not None and operation_id > self._operation_id
                    if is_later and operation_id not in self._idle:
                        self._add(operation_id, "counts cycles from the epoch adopted here")

    def _children(self, child: Table[Any], refers: ColumnElement[bool], parent: Table[Any]) -> None:
        """Entries in use that refer to what goes out of use, and do not go with it."""
        reason = f"uses the {SPOKEN[parent.name]} that this operation entered"
        used, going = and_(refers, row_in_use(child)), rows_out(self._effects, child)
        if child is observations:
            # Loads may be large: first which operations brought any, then whether they go with it.
            brought = select(observations.c.operation_id).where(used).distinct()
            for number in set(self._connection.execute(brought).scalars()) - set(loads_out(self._effects)):
                own = select(observations.c.id).where(used, observations.c.operation_id == number)
                if not going.issuperset(self._connection.execute(own.limit(len(going) + 1)).scalars()):
                    self._add(number, reason)
            return
        for number in set(self._connection.execute(select(child.c.id).where(used)).scalars()) - going:
            self._add(entered_by(self._connection, child, number), reason)
