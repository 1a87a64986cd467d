"""What an operation did to the entries of the catalogue, in the words of those who keep it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

from sqlalchemy import Connection, Table, func, select

from campaign.catalogue.fieldwords import field_changes
from campaign.catalogue.journal import from_journal
from campaign.catalogue.lifecycle import MARKERS, cleared_marker, is_lasting
from campaign.catalogue.sources import source_titles
from campaign.catalogue.tables import (
    adoptions,
    changes,
    dust_rules,
    keepings,
    kept_forecasts,
    lapses,
    metadata,
    observations,
    sites,
    solutions,
    stars,
    system_names,
    systems,
)
from campaign.model.history import BulkEffect, Effect, EntryChange, FieldChange, RowEffect

# So many systems of a load are named.
_SYSTEMS_NAMED = 4
_WHOLE_SYSTEM = frozenset({systems.name, system_names.name, stars.name})


class Teller:
    """Puts effects into words; what names are needed is read once."""

    def __init__(self, connection: Connection) -> None:
        self._connection = connection
        self._systems = _first_names(connection)
        self._labels: dict[int, str] | None = None
        self._names_of: dict[str, Mapping[int, str]] | None = None

    def tell(self, operation_id: int, effects: Sequence[Effect]) -> tuple[EntryChange, ...]:
        """One change an entry; names and stars are told with their system, corrections with the corrected."""
        told: list[EntryChange] = []
        done: set[int] = set()
        corrections = _corrections(effects)
        kept: dict[int, list[RowEffect]] = {}
        for effect in effects:
            if isinstance(effect, RowEffect) and _key(effect) in corrections:
                continue
            if isinstance(effect, BulkEffect):
                told.append(_of_load(effect))
            elif effect.table in _WHOLE_SYSTEM:
                system_id = self._system_of(operation_id, effect)
                if system_id not in done:
                    done.add(system_id)
                    told.append(self._of_system(operation_id, system_id, effects))
            elif effect.table == kept_forecasts.name:
                kept.setdefault(self._system_of(operation_id, effect), []).append(effect)
            elif effect.table != lapses.name:
                told.append(self._of_row(operation_id, effect))
        told += [self._of_forecasts(operation_id, *each) for each in kept.items()]
        return tuple(told)

    def reversed(self, operation_id: int, effects: Sequence[Effect]) -> tuple[EntryChange, ...]:
        """What taking the effects back would do, in the same words."""
        kept = [effect for effect in effects if not is_lasting(effect)]
        told = [_backwards(change) for change in self.tell(operation_id, kept)]
        load = next((effect for effect in effects if isinstance(effect, BulkEffect)), None)
        if load is not None:
            of_each = self._systems_of_load(load.brought_by)
            told = [each if each.rows is None else replace(each, note=of_each) for each in told]
        return tuple(told)

    def _systems_of_load(self, brought_by: int) -> str:
        """How many observations of which system a load brought, the most first."""
        counted = self._connection.execute(
            select(observations.c.system_id, func.count())
            .where(observations.c.operation_id == brought_by)
            .group_by(observations.c.system_id)
            .order_by(func.count().desc(), observations.c.system_id)
        ).all()
        told = [f"{rows:,} of {self._systems[system_id]}" for system_id, rows in counted[:_SYSTEMS_NAMED]]
        more = len(counted) - len(told)
        return ", ".join(told) + (f" and {more} more system{'' if more == 1 else 's'}" if more else "")

    def brought_by(self, observation_id: int) -> int:
        """The operation that an observation came with."""
        row = select(observations.c.operation_id).where(observations.c.id == observation_id)
        return int(self._connection.execute(row).scalar_one())

    def tell_loaded(self, observation_id: int, operation_id: int, load: BulkEffect) -> EntryChange:
        """What happened to one observation when its whole load was brought, taken back or put back."""
        row = row_after(self._connection, observations, observation_id, operation_id)
        fields = field_changes(observations, {}, row, frozenset(row), self._names())
        return EntryChange(
            subject=f"observation {observation_id}",
            action=_of_load(load).action,
            system=self._systems.get(row["system_id"]),
            fields=fields if load.kind == "brought" else (),
        )

    # ------------------------------------------------------------------------------------ one entry

    def _of_row(self, operation_id: int, effect: RowEffect) -> EntryChange:
        table = metadata.tables[effect.table]
        before, after = self._rows(operation_id, table, effect)
        row = after or before
        action = _action(effect, table)
        fields: tuple[FieldChange, ...] = ()
        if action in ("added", "changed", "removed", "adopted", "in force"):
            fields = self._fields(table, before, after, effect)
        note = ""
        if table is observations and effect.kind == "changed":
            note = effect.after.get("withdrawn_why") or ""
            other = _other_version(effect)
            if other is not None:
                corrected = row_after(self._connection, table, other, operation_id)
                old, new = (after, corrected) if effect.after["superseded_by_id"] else (corrected, after)
                fields = field_changes(table, old, new, frozenset(corrected), self._names())
        return EntryChange(
            subject=self._subject(table, effect.row_id, row),
            action=action,
            system=self._systems.get(row["system_id"]) if "system_id" in row else None,
            fields=fields,
            note=note,
        )

    def _of_system(self, operation_id: int, system_id: int, effects: Sequence[Effect]) -> EntryChange:
        own = [
            e
            for e in effects
            if isinstance(e, RowEffect)
            and e.table in _WHOLE_SYSTEM
            and self._system_of(operation_id, e) == system_id
        ]
        itself = next((e for e in own if e.table == systems.name), None)
        action = "changed" if itself is None else _action(itself, systems)
        fields: list[FieldChange] = []
        if action in ("added", "changed"):
            fields += _name_changes(own)
            for effect in own:
                table = metadata.tables[effect.table]
                if table is not system_names:
                    before, after = self._rows(operation_id, table, effect)
                    found = self._fields(table, before, after, effect)
                    star = f"star {(after or before)['star']}: " if table is stars else ""
                    fields += [
                        FieldChange(star + f.name, f.unit, f.before, f.after)
                        for f in found
                        if not (star and f.name == "star")
                    ]
        return EntryChange("system", action, self._systems.get(system_id), tuple(fields))

    def _of_forecasts(self, operation_id: int, system_id: int, effects: Sequence[RowEffect]) -> EntryChange:
        """Kept forecasts of one system: which events, not every quantile."""
        rows = [self._rows(operation_id, kept_forecasts, effect)[1] for effect in effects]
        events = [row["event"] if row["cycle"] is None else f"{row['event']} {row['cycle']}" for row in rows]
        many = "" if len(rows) == 1 else "s"
        return EntryChange(
            subject=f"{len(rows)} kept forecast{many}",
            action=_action(effects[0], kept_forecasts),
            system=self._systems.get(system_id),
            note=", ".join(events),
        )

    def _fields(
        self, table: Table[Any], before: Mapping[str, Any], after: Mapping[str, Any], effect: RowEffect
    ) -> tuple[FieldChange, ...]:
        changed = frozenset(effect.before) | frozenset(effect.after)
        return field_changes(table, before, after, changed, self._names())

    def _subject(self, table: Table[Any], row_id: int, row: Mapping[str, Any]) -> str:
        if table is adoptions:
            return f"solution '{self._label(row['solution_id'])}'"
        if table is solutions:
            return f"solution '{row['label']}'"
        if table is dust_rules:
            return f"dust rule '{row['kind']}'"
        if table is keepings:
            return f"keeping {row_id}" + (f" '{row['label']}'" if row["label"] else "")
        if table is sites:
            return f"site {row['name']}"
        words = {
            "sources": lambda: f"source '{row['title']}'",
            "column_mappings": lambda: f"column mapping '{row['name']}'",
            "campaign_info": lambda: f"fact '{row['key']}'",
        }
        named = words.get(table.name)
        return named() if named else f"{table.name.removesuffix('s')} {row_id}"

    # ------------------------------------------------------------------------------------ whole rows

    def _rows(
        self, operation_id: int, table: Table[Any], effect: RowEffect
    ) -> tuple[Mapping[str, Any], Mapping[str, Any]]:
        """The whole row before and after the operation."""
        if effect.kind != "changed":
            return effect.before, effect.after
        after = {**row_after(self._connection, table, effect.row_id, operation_id), **effect.after}
        return {**after, **effect.before}, after

    def _system_of(self, operation_id: int, effect: RowEffect) -> int:
        if effect.table == systems.name:
            return effect.row_id
        row = effect.after or effect.before
        if "system_id" not in row:
            table = metadata.tables[effect.table]
            row = row_after(self._connection, table, effect.row_id, operation_id)
        return int(row["system_id"])

    def _label(self, solution_id: int) -> str:
        if self._labels is None:
            rows = self._connection.execute(select(solutions.c.id, solutions.c.label))
            self._labels = {number: label for number, label in rows}
        return self._labels[solution_id]

    def _names(self) -> Mapping[str, Mapping[int, str]]:
        """What stands for the numbers in columns that refer elsewhere."""
        if self._names_of is None:
            rows = self._connection.execute(select(sites.c.id, sites.c.name))
            self._names_of = {
                "site_id": {number: name for number, name in rows},
                "source_id": source_titles(self._connection),
            }
        return self._names_of


def row_after(connection: Connection, table: Table[Any], row_id: int, operation_id: int) -> dict[str, Any]:
    """A row as an operation left it: the present one with all later changes unwound."""
    present = connection.execute(select(table).where(table.c.id == row_id)).mappings().first()
    row: dict[str, Any] = {} if present is None else dict(present)
    later = connection.execute(
        select(changes.c.action, changes.c.before)
        .where(
            changes.c.table_name == table.name,
            changes.c.row_id == row_id,
            changes.c.operation_id > operation_id,
        )
        .order_by(changes.c.id.desc())
    )
    for change in later:
        if change.action == "insert":
            row = {}
        elif change.action == "delete":
            row = from_journal(table, change.before)
        else:
            row |= from_journal(table, change.before)
    return row


def _first_names(connection: Connection) -> dict[int, str]:
    """Primary names by system, also of systems out of use."""
    rows = connection.execute(
        select(system_names.c.system_id, system_names.c.name)
        .where(system_names.c.name_rank == 0)
        .order_by(system_names.c.withdrawn_at.is_(None), system_names.c.id)
    )
    return {system_id: name for system_id, name in rows}


def _action(effect: RowEffect, table: Table[Any]) -> str:
    in_force = {adoptions.name: "adopted", dust_rules.name: "in force"}.get(table.name)
    if effect.kind == "added":
        return in_force or "added"
    if effect.kind == "removed":
        return "removed"
    if cleared_marker(effect) == "superseded_at":
        return f"put back in place of {effect.before['superseded_by_id']}"
    if cleared_marker(effect) is not None:
        return in_force or "put back"
    if MARKERS & effect.after.keys():
        if effect.after.get("superseded_at") is not None:
            return f"replaced by {effect.after['superseded_by_id']}"
        return f"no longer {in_force}" if in_force else "withdrawn"
    return "changed"


def _name_changes(effects: Sequence[RowEffect]) -> list[FieldChange]:
    """Names that a system lost and gained; one that only changed its place is not told."""
    gone: dict[int, list[str]] = {0: [], 1: []}
    new: dict[int, list[str]] = {0: [], 1: []}
    for effect in effects:
        if effect.table == system_names.name:
            if "name" in effect.before:
                gone[min(effect.before["name_rank"], 1)].append(effect.before["name"])
            if "name" in effect.after:
                new[min(effect.after["name_rank"], 1)].append(effect.after["name"])
    found = []
    if gone[0] != new[0]:
        found.append(FieldChange("name", "", next(iter(gone[0]), None), next(iter(new[0]), None)))
    found += [FieldChange("alias", "", name, None) for name in gone[1] if name not in new[1]]
    found += [FieldChange("alias", "", None, name) for name in new[1] if name not in gone[1]]
    return found


def _of_load(effect: BulkEffect) -> EntryChange:
    action = {"brought": "loaded", "withdrawn": "withdrawn", "restored": "put back"}[effect.kind]
    return EntryChange("observations", action, rows=effect.rows)


def _corrections(effects: Sequence[Effect]) -> frozenset[tuple[str, int]]:
    """Rows that took, or gave back, the place of others in the same operation: told with those."""
    return frozenset(
        (effect.table, other)
        for effect in effects
        if isinstance(effect, RowEffect) and (other := _other_version(effect)) is not None
    )


def _other_version(effect: RowEffect) -> int | None:
    """The observation that took, or gave back, the place of this one."""
    if effect.kind != "changed":
        return None
    number = effect.after.get("superseded_by_id") or effect.before.get("superseded_by_id")
    return None if number is None else int(number)


def _key(effect: RowEffect) -> tuple[str, int]:
    return effect.table, effect.row_id


_OPPOSITE_OF_CORRECTION = {"replaced by": "put back in place of", "put back in place of": "replaced by"}
_OPPOSITE = {
    "added": "withdrawn",
    "loaded": "withdrawn",
    "withdrawn": "put back",
    "put back": "withdrawn",
    "removed": "put back",
    "adopted": "no longer adopted",
    "no longer adopted": "adopted",
    "in force": "no longer in force",
    "no longer in force": "in force",
    "changed": "changed",
}


def _backwards(change: EntryChange) -> EntryChange:
    did, _, other = change.action.rpartition(" ")
    corrected = did in _OPPOSITE_OF_CORRECTION
    action = f"{_OPPOSITE_OF_CORRECTION[did]} {other}" if corrected else _OPPOSITE[change.action]
    fields = tuple(FieldChange(f.name, f.unit, f.after, f.before) for f in change.fields)
    return EntryChange(
        subject=change.subject,
        action=action,
        system=change.system,
        fields=fields if corrected or action == "changed" else (),
        rows=change.rows,
    )
