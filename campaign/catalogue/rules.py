"""Dust rules: one in force for each system, the earlier ones kept with their dates."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import replace
from datetime import datetime
from typing import Any

from sqlalchemy import Connection, select

from campaign.catalogue.converting import (
    among,
    columns_of,
    in_force,
    kept,
    measured_names,
    measured_or_none,
    measured_values,
)
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import dust_rules
from campaign.catalogue.tables_knowledge import RULE_QUANTITIES
from campaign.model.systems import DustRule

_PLAIN = ("kind", "scatter_onset_d", "scatter_maximum_d", "scatter_end_d", "note")
# Name in the table by name in the model, where they differ: "end" is a word of SQL.
_FIELD_OF = {"onset_offset": "onset", "maximum_offset": "maximum", "end_offset": "end"}


def set_rule(writing: Writing, rule: DustRule) -> int:
    """Put a rule in force and end the one before; ``rule.id`` is ignored.

    A rule equal to the one in force changes nothing, and its number is returned.
    """
    present = rule_of(writing.connection, rule.system_id)
    if present is not None and replace(rule, id=present.id) == present:
        return present.id
    end_rule(writing, rule.system_id)
    values: dict[str, Any] = {name: getattr(rule, name) for name in _PLAIN}
    for name in RULE_QUANTITIES:
        values |= measured_values(name, getattr(rule, _FIELD_OF.get(name, name)))
    return writing.insert(dust_rules, {"system_id": rule.system_id, **values, "set_at": writing.at})


def end_rule(writing: Writing, system_id: int) -> bool:
    """Leave the system without a rule; False when it had none."""
    found = writing.connection.execute(
        select(dust_rules.c.id).where(dust_rules.c.system_id == system_id, dust_rules.c.ended_at.is_(None))
    ).scalar_one_or_none()
    return found is not None and writing.update(dust_rules, found, {"ended_at": writing.at})


def rule_of(connection: Connection, system_id: int, *, known_at: datetime | None = None) -> DustRule | None:
    """The rule in force, now or at ``known_at``."""
    return load_rules(connection, {system_id}, known_at).get(system_id)


def load_rules(
    connection: Connection, system_ids: Collection[int] | None, known_at: datetime | None
) -> dict[int, DustRule]:
    """Rules in force by system, in one statement."""
    holds = in_force(dust_rules.c.set_at, dust_rules.c.ended_at, known_at)
    rows = connection.execute(
        select(*columns_of(dust_rules, _COLUMNS))
        .where(among(dust_rules.c.system_id, system_ids), holds)
        .order_by(dust_rules.c.id)
    )
    return {
        row[1]: DustRule(
            id=row[0],
            system_id=row[1],
            kind=row[2],
            scatter_onset_d=row[3],
            scatter_maximum_d=row[4],
            scatter_end_d=row[5],
            note=row[6],
            onset=measured_or_none(row[7], row[8], row[9]),
            maximum=measured_or_none(row[10], row[11], row[12]),
            end=measured_or_none(row[13], row[14], row[15]),
            critical_separation_au=measured_or_none(row[16], row[17], row[18]),
            condensation_distance_au=measured_or_none(row[19], row[20], row[21]),
            flow_speed_kms=measured_or_none(row[22], row[23], row[24]),
            maximum_lag_d=measured_or_none(row[25], row[26], row[27]),
        )
        for row in rows.all()
        if kept(row[1], system_ids)
    }


_COLUMNS = ("id", "system_id", *_PLAIN, *measured_names(*RULE_QUANTITIES))
