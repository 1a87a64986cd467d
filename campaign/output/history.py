"""Who changed what and when, and what an undo does: on the screen and as JSON."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime
from typing import Any

from campaign.model.history import EntryChange, FieldChange, History, Operation, ToldOperation, Undone
from campaign.model.instants import Moment
from campaign.model.measured import Limit, Measured, Range
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.values import number, sexagesimal

UNIT_NAMES = {
    "kms": "km/s",
    "jy": "Jy",
    "angstrom": "Å",
    "BMJD_TDB": "",
}
_ENTRIES_SHOWN = 8
# What a new entry is called says these already.
_IN_SUBJECT = frozenset({"name", "label", "title", "key"})
_NOTHING = "none"


def render_history(screen: Screen, history: History, *, whole: bool = False) -> None:
    """One paragraph an operation; ``whole`` shows every entry of each."""
    if not history.operations:
        screen.wrapped(f"Nothing of this kind was done to {history.about}.")
        return
    for told in history.operations:
        _render_operation(screen, told, None if whole else _ENTRIES_SHOWN)
    if history.more:
        screen.wrapped("There are older operations: see more with --limit N.", style="dim")


def _render_operation(screen: Screen, told: ToldOperation, most: int | None) -> None:
    operation = told.operation
    style = "bold" if operation.stands else "dim"
    mark = _mark(operation)
    screen.wrapped(
        f"{operation.id}  {minute(operation.at)}  {operation.who}: {operation.summary or operation.command}"
        + (f"  [{mark}]" if mark else ""),
        hang=4,
        style=style,
    )
    render_changes(screen, told.changes, most, f"campaign history --operation {operation.id}")


def _mark(operation: Operation) -> str:
    parts = []
    if operation.undoes_id is not None:
        parts.append(f"undo of {operation.undoes_id}")
    if operation.undone_by_id is not None:
        back = ", and put back" if operation.stands else ""
        parts.append(f"taken back by {operation.undone_by_id}{back}")
    return ", ".join(parts)


def render_changes(
    screen: Screen, changes: Sequence[EntryChange], most: int | None = None, see: str = ""
) -> None:
    """What happened to each entry, its fields before and after."""
    for change in changes[:most]:
        about = f"{_subject(change)}: {change.action}"
        if change.note:
            about += f" ({change.note})"
        is_new = change.action in ("added", "adopted", "in force", "loaded", "removed")
        fields = [field for field in change.fields if field.name not in _IN_SUBJECT]
        if is_new and fields:
            about += ": " + ", ".join(_stated(field) for field in fields)
        screen.wrapped(about, label="    ", hang=6)
        if not is_new:
            for field in change.fields:
                before, after = both(field)
                screen.wrapped(f"{field.name}: {before} → {after}", label="      ", hang=8)
    left = len(changes) - len(changes[:most])
    if left:
        screen.wrapped(
            f"and {left:,} more entr{'y' if left == 1 else 'ies'}; all of them: {see}",
            label="    ",
            hang=6,
            style="dim",
        )


def _subject(change: EntryChange) -> str:
    if change.rows is not None:
        of = f" of {change.system}" if change.system else ""
        return f"{change.rows:,} observation{'' if change.rows == 1 else 's'}{of}"
    if change.subject == "system":
        return f"system {change.system}"
    return f"{change.subject} of {change.system}" if change.system else change.subject


def _stated(field: FieldChange) -> str:
    value = field.after if field.after is not None else field.before
    return f"{field.name} {told_value(field.name, value, field.unit)}"


def both(field: FieldChange) -> tuple[str, str]:
    """A field before and after; with all digits where rounding would make them look alike."""
    before = told_value(field.name, field.before, field.unit)
    after = told_value(field.name, field.after, field.unit)
    if before == after and isinstance(field.before, Moment) and isinstance(field.after, Moment):
        before, after = (f"BMJD_TDB {moment.bmjd_tdb:.9f}" for moment in (field.before, field.after))
    if before == after:
        return _exact(field.before), _exact(field.after)
    return before, after


def told_value(name: str, value: Any, unit: str) -> str:
    """One value for people."""
    if value is None:
        return _NOTHING
    if unit == "BMJD_TDB" and isinstance(value, float):
        return f"BMJD_TDB {value:.10g}"
    unit = UNIT_NAMES.get(unit, unit)
    if isinstance(value, (Measured, Limit, Range)):
        return number(value, unit)
    if isinstance(value, Moment):
        return _moment(value)
    if isinstance(value, float):
        if name in ("right ascension", "declination"):
            return sexagesimal(value, hours=name == "right ascension")
        return f"{value:.10g}{f' {unit}' if unit else ''}"
    if isinstance(value, dict):
        return "given"
    return f"{value}"


def _moment(moment: Moment) -> str:
    kept = f"BMJD_TDB {number(Measured(moment.bmjd_tdb, moment.minus_d, moment.plus_d))}"
    if moment.minus_d is None or moment.plus_d is None or max(moment.minus_d, moment.plus_d) < 1e-4:
        kept = f"BMJD_TDB {moment.bmjd_tdb:.6f}"
    return f"{moment.text} ({kept})" if moment.text else kept


def _exact(value: Any) -> str:
    if isinstance(value, Measured):
        return f"{value.value!r} +{value.plus!r} −{value.minus!r}"
    if isinstance(value, Moment):
        return f"BMJD_TDB {value.bmjd_tdb!r} +{value.plus_d!r} −{value.minus_d!r} ({value.text})"
    if isinstance(value, Limit):
        return f"{'>' if value.side == 'above' else '<'} {value.bound!r} at {value.limit_sigma:g} sigma"
    return _NOTHING if value is None else repr(value)


def minute(at: datetime) -> str:
    """An entry time to the minute, UTC."""
    return f"{at:%Y-%m-%d %H:%M}"


def history_json(history: History, as_of: str) -> str:
    """Document ``history``."""
    data = {
        "about": history.about,
        "operations": [
            operation_data(told.operation) | {"changes": [change_data(change) for change in told.changes]}
            for told in history.operations
        ],
        "more": history.more,
    }
    return document("history", data, as_of=as_of)


def operation_data(operation: Operation) -> dict[str, Any]:
    """An operation for a program."""
    return {
        "operation": operation.id,
        "at": iso(operation.at),
        "who": operation.who,
        "command": operation.command,
        "summary": operation.summary,
        "undoes": operation.undoes_id,
        "undone_by": operation.undone_by_id,
        "stands": operation.stands,
    }


def change_data(change: EntryChange) -> dict[str, Any]:
    """What happened to one entry, for a program."""
    return {
        "subject": change.subject,
        "action": change.action,
        "system": change.system,
        "rows": change.rows,
        "note": change.note,
        "fields": [field_data(field) for field in change.fields],
    }


def field_data(field: FieldChange) -> dict[str, Any]:
    """A field before and after, for a program; ``unit`` is that of every number in it."""
    return {
        "name": field.name,
        "unit": field.unit or None,
        "before": plain(field.before),
        "after": plain(field.after),
    }


def iso(at: datetime | None) -> str | None:
    """An entry time as ISO 8601 in UTC with all its digits."""
    return None if at is None else at.isoformat().replace("+00:00", "Z")


def render_undone(screen: Screen, undone: Undone, *, whole: bool = False) -> None:
    """What an undo does to which entries."""
    first, done = undone.first, undone.by_id is not None
    if undone.puts_back:
        head = "put back" if done else "would put back"
    else:
        head = "undone" if done else "would undo"
    told = first.summary or first.command
    screen.wrapped(
        f"{head}: operation {first.id}, {told} ({first.who}, {minute(first.at)} UTC)", hang=4, style="bold"
    )
    see = f"campaign history --operation {undone.operation.id}"
    render_changes(screen, undone.changes, None if whole else _ENTRIES_SHOWN, see)
    if done:
        back = "undo it again" if undone.puts_back else "put it back"
        screen.wrapped(f"this is operation {undone.by_id}; {back} with: campaign undo {undone.by_id}", hang=4)


def undone_json(undone: Undone, as_of: str) -> str:
    """Document ``undo``; ``by`` is null for a preview."""
    data = operation_data(undone.operation) | {
        "by": undone.by_id,
        "puts_back": undone.puts_back,
        "first": undone.first.id,
        "changes": [change_data(change) for change in undone.changes],
    }
    return document("undo", data, as_of=as_of)
