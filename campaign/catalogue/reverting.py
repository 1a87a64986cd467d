"""Taking back one operation, row by row, so that what was known at any time stays what it was.

An entry is not removed but marked as out of use from now on, and an end is not forgotten: the time in
which the entry was out of use is kept as a lapse. Only tables that nobody asks for their past, and to
which nothing refers, lose a row; the journal keeps it whole.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from datetime import datetime
from typing import Any

from sqlalchemy import Table, and_, select

from campaign.catalogue.lifecycle import (
    MARKER_OF,
    MARKERS,
    cleared_marker,
    comes_back,
    goes_out,
    is_lasting,
    withdrawn_load,
)
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import lapses, metadata, observations
from campaign.catalogue.types import utc_text
from campaign.errors import Conflict
from campaign.model.history import BulkEffect, Effect, RowEffect

Told = Callable[[int, int], None]


def revert(writing: Writing, effects: Sequence[Effect], told: Told) -> None:
    """Take back what an operation came to. The caller made sure that nothing depends on it.

    What goes out of use goes first, so that names, digests and places in force are free for what returns.
    ``told`` gets how many rows of a load are done, and out of how many.

    Raises
    ------
    Conflict
        ``changed-outside``, when a row is not as the operation left it.
    """
    backwards = [effect for effect in reversed(effects) if not is_lasting(effect)]
    for effect in backwards:
        if goes_out(effect):
            _take_out(writing, effect, told)
    for effect in backwards:
        if comes_back(effect):
            _bring_back(writing, effect, told)


def _take_out(writing: Writing, effect: Effect, told: Told) -> None:
    if isinstance(effect, BulkEffect):
        _withdraw_load(writing, effect, told)
        return
    table = metadata.tables[effect.table]
    cleared, marker = cleared_marker(effect), MARKER_OF.get(effect.table)
    if cleared is not None:
        _refuse_unless_as_left(writing, table, effect)
        writing.update(table, effect.row_id, {**effect.before, cleared: writing.at})
    elif effect.kind == "replaced" or marker is None:
        writing.delete(table, effect.row_id)
    elif effect.after[marker] is None:
        digest = {"sameness": None} if table is observations else {}
        writing.update(table, effect.row_id, {marker: writing.at, **digest})


def _bring_back(writing: Writing, effect: Effect, told: Told) -> None:
    if isinstance(effect, BulkEffect):
        _restore_load(writing, effect, told)
        return
    table = metadata.tables[effect.table]
    if effect.kind != "changed":
        writing.insert(table, {**effect.before, **_own_number(writing, table, effect.row_id)})
        return
    _refuse_unless_as_left(writing, table, effect)
    for name in sorted(MARKERS & effect.before.keys()):
        if effect.before[name] is None and effect.after[name] is not None:
            _keep_lapse(writing, table, effect.after[name], row_id=effect.row_id)
    writing.update(table, effect.row_id, effect.before)


def _own_number(writing: Writing, table: Table[Any], row_id: int) -> dict[str, int]:
    """The row's own number, unless it was given away since; nothing refers to rows of these tables."""
    taken = writing.connection.execute(select(table.c.id).where(table.c.id == row_id)).first()
    return {} if taken is not None else {"id": row_id}


def _keep_lapse(
    writing: Writing,
    table: Table[Any],
    since: datetime,
    *,
    row_id: int | None = None,
    brought_by: int | None = None,
) -> None:
    """Remember that entries were out of use from ``since`` until now."""
    writing.insert(
        lapses,
        {
            "table_name": table.name,
            "row_id": row_id,
            "brought_by_id": brought_by,
            "from_at": since,
            "until_at": writing.at,
        },
    )


def _withdraw_load(writing: Writing, effect: BulkEffect, told: Told) -> None:
    columns = observations.c
    writing.update_many(
        observations,
        and_(
            columns.operation_id == effect.brought_by,
            columns.withdrawn_at.is_(None),
            columns.superseded_at.is_(None),
        ),
        {"withdrawn_at": writing.at, "former_sameness": columns.sameness, "sameness": None},
        "withdraw many",
        {"brought_by": effect.brought_by, "withdrawn_at": utc_text(writing.at)},
        lambda done: told(done, effect.rows),
    )


def _restore_load(writing: Writing, effect: BulkEffect, told: Told) -> None:
    columns = observations.c
    assert effect.withdrawn_at is not None
    _keep_lapse(writing, observations, effect.withdrawn_at, brought_by=effect.brought_by)
    rows = writing.update_many(
        observations,
        withdrawn_load(effect),
        {"withdrawn_at": None, "sameness": columns.former_sameness, "former_sameness": None},
        "restore many",
        {"brought_by": effect.brought_by},
        lambda done: told(done, effect.rows),
    )
    if rows != effect.rows:
        raise _changed_outside(observations, f"{rows} of {effect.rows} rows are as they were left")


def _refuse_unless_as_left(writing: Writing, table: Table[Any], effect: RowEffect) -> None:
    names = sorted(effect.after)
    row = writing.connection.execute(
        select(*[table.c[name] for name in names]).where(table.c.id == effect.row_id)
    ).first()
    if row is None or any(value != effect.after[name] for name, value in zip(names, row, strict=True)):
        raise _changed_outside(table, f"row {effect.row_id}")


def _changed_outside(table: Table[Any], what: str) -> Conflict:
    return Conflict(
        "The catalogue is not as this operation left it.",
        why=f"In {table.name}, {what}: something changed it without a line in the journal.",
        hint="Correct the entry itself instead, for example with campaign amend or campaign system change.",
        code="changed-outside",
        details={"table": table.name},
    )
