"""Take back one whole command, or put back what was taken back."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

from sqlalchemy import Connection

from campaign.catalogue import journal, store
from campaign.catalogue.dependants import dependants_of
from campaign.catalogue.reverting import revert
from campaign.catalogue.telling import Teller
from campaign.errors import Conflict, NotFound
from campaign.model.history import Dependant, Effect, Operation, Undone
from campaign.model.kept import Stamp
from campaign.model.loading import FINISHING

_NAMED_AT_MOST = 3


def preview_undo(db: str, who: str, operation_id: int | None) -> Undone:
    """What an undo would do; the catalogue stays as it is.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    who : str
        Whose last operation is meant when no number is given.
    operation_id : int or None
        Number of the operation; an undo can be named too.

    Returns
    -------
    Undone
        ``by_id`` is None; ``operation`` is the one whose effects would be taken back.

    Raises
    ------
    NotFound
        No such operation, or nothing to undo.
    Conflict
        ``already-undone``; ``depended-on``, with the later operations in the details.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    with store.reading(db) as connection:
        return _plan(connection, who, operation_id)[0]


def undo(
    db: str,
    stamp: Stamp,
    operation_id: int | None,
    told: Callable[[str, int, int | None], None] = lambda stage, done, total: None,
) -> Undone:
    """Take back one whole operation, as an operation of its own that can be taken back too.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command; without a number, whose last operation is meant.
    operation_id : int or None
        Number of the operation; the number of an undo puts back what it took back.
    told : callable, optional
        Gets what is being done, how many rows of a load are done and out of how many; ``FINISHING`` comes
        last, before what was done is kept.

    Returns
    -------
    Undone
        ``by_id`` is the new operation.

    Raises
    ------
    NotFound
        No such operation, or nothing to undo.
    Conflict
        ``already-undone``; ``depended-on``, with the later operations in the details; ``changed-outside``.

    Notes
    -----
    Accuracy: entries go out of use at ``stamp.at`` and are still known before it; what is put back was out
    of use in between. Source: project convention.
    """
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        plan, effects = _plan(writing.connection, stamp.who, operation_id)
        writing.undoes(plan.operation.id)
        number = writing.operation_id
        revert(writing, effects, lambda done, rows: told("undoing", done, rows))
        did = "put back" if plan.puts_back else "took back"
        writing.summarise(f"{did} operation {plan.first.id}: {plan.first.summary}")
        told(FINISHING, 0, None)
    return replace(plan, by_id=number)


def _plan(connection: Connection, who: str, operation_id: int | None) -> tuple[Undone, list[Effect]]:
    undos = journal.Undos(connection)
    target = _target(connection, undos, who, operation_id)
    effects = journal.effects_of(connection, target.id)
    found = dependants_of(connection, target.id, effects)
    if found:
        raise _depended_on(target, found)
    chain = undos.chain(target.id)
    first = journal.get_operation(connection, chain[0], undos)
    changes = Teller(connection).reversed(target.id, effects)
    return Undone(target, first, changes, puts_back=len(chain) % 2 == 0), effects


def _target(connection: Connection, undos: journal.Undos, who: str, operation_id: int | None) -> Operation:
    """The operation whose effects hold now: the one asked for, or the undo of its undo."""
    if operation_id is None:
        last = journal.last_standing(connection, who)
        if last is None:
            raise NotFound(
                f"There is nothing of {who} to undo.",
                why="Every operation of this observer was taken back already, or there is none.",
                hint="See all operations with: campaign history. Undo one by its number: campaign undo 12.",
                code="nothing-to-undo",
            )
        return journal.get_operation(connection, last, undos)
    asked = journal.get_operation(connection, operation_id, undos)
    last = undos.chain(operation_id)[-1]
    if not asked.stands:
        raise Conflict(
            f"Operation {operation_id} was taken back already.",
            why=f"Operation {last} took it back.",
            hint=f"To put it back: campaign undo {last}.",
            code="already-undone",
            details={"operation": operation_id, "undone_by": last},
        )
    return journal.get_operation(connection, last, undos)


def _depended_on(target: Operation, found: Sequence[Dependant]) -> Conflict:
    told = [_spoken(each) for each in found[:_NAMED_AT_MOST]]
    more = len(found) - len(told)
    if more:
        told.append(f"and {more} more")
    numbers = [each.operation.id for each in found if each.operation is not None]
    hint = (
        f"Undo the later one first: campaign undo {numbers[0]}."
        if numbers
        else "Look at what happened since: campaign history."
    )
    return Conflict(
        f"Operation {target.id} ({target.summary}) cannot be undone: what came later depends on it.",
        why="; ".join(told) + ".",
        hint=hint,
        code="depended-on",
        details={
            "operation": target.id,
            "dependants": [
                {
                    "operation": None if each.operation is None else each.operation.id,
                    "summary": None if each.operation is None else each.operation.summary,
                    "reason": each.reason,
                }
                for each in found
            ],
        },
    )


def _spoken(dependant: Dependant) -> str:
    operation = dependant.operation
    if operation is None:
        return f"An entry that no operation explains {dependant.reason}"
    return f"Operation {operation.id} ({operation.summary}, {operation.at:%Y-%m-%d}) {dependant.reason}"
