"""Sets of orbital elements, and which of them the forecast rests on."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from datetime import datetime
from typing import Any

from sqlalchemy import Connection, and_, select

from campaign.catalogue.converting import (
    among,
    columns_of,
    in_force,
    kept,
)
from campaign.catalogue.naming import name_key, nearest_names, tidy_name
from campaign.catalogue.solution_rows import SOLUTION_COLUMNS, element_values, solution_from_row
from campaign.catalogue.sources import source_id, source_titles
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import adoptions, solutions
from campaign.catalogue.types import ValueRefused
from campaign.errors import Conflict, NotFound
from campaign.model.systems import Solution


def add_solution(writing: Writing, solution: Solution) -> int:
    """Enter a solution; ``id``, ``adopted`` and ``weight`` are ignored.

    Raises
    ------
    Conflict
        ``label-taken``, when the system has a solution of that label.
    InputRefused
        For a value that the columns refuse.
    """
    label = tidy_name(solution.label)
    taken = writing.connection.execute(
        select(solutions.c.label).where(
            solutions.c.system_id == solution.system_id,
            solutions.c.label_key == name_key(label),
            solutions.c.withdrawn_at.is_(None),
        )
    ).scalar_one_or_none()
    if taken is not None:
        raise Conflict(
            f"The system already has a solution labelled {taken!r}.",
            why="Labels of one system are compared without regard to case and spaces.",
            hint="Give the new one a label of its own, for example with year or author.",
            code="label-taken",
            details={"label": taken},
        )
    return writing.insert(
        solutions,
        {
            "system_id": solution.system_id,
            "label": label,
            "label_key": name_key(label),
            **element_values(solution),
            "source_id": source_id(writing, solution.source),
            "entered_at": writing.at,
        },
    )


def solutions_of(
    connection: Connection, system_id: int, *, known_at: datetime | None = None
) -> list[Solution]:
    """The system's solutions in the order of entry, with what was adopted at ``known_at``."""
    return load_solutions(connection, {system_id}, known_at).get(system_id, [])


def get_solution(connection: Connection, solution_id: int) -> Solution:
    """The solution of that number.

    Raises
    ------
    NotFound
    """
    system_id = connection.execute(
        select(solutions.c.system_id).where(solutions.c.id == solution_id)
    ).scalar_one_or_none()
    for solution in solutions_of(connection, system_id) if system_id is not None else ():
        if solution.id == solution_id:
            return solution
    raise NotFound(
        f"There is no solution number {solution_id}.",
        hint="See the solutions of a system with: campaign solution list SYSTEM.",
        code="solution-not-found",
    )


def find_solution(
    connection: Connection, system_id: int, label: str, *, known_at: datetime | None = None
) -> Solution:
    """The system's solution of that label, whatever its case and spaces.

    Raises
    ------
    NotFound
        ``solution-not-found``; ``details["nearest"]`` lists labels like it.
    """
    known = solutions_of(connection, system_id, known_at=known_at)
    key = name_key(label)
    for solution in known:
        if name_key(solution.label) == key:
            return solution
    labels = {name_key(solution.label): solution.label for solution in known}
    nearest = nearest_names(label, labels)
    raise NotFound(
        f"The system has no solution labelled {label!r}.",
        why="It has: " + ", ".join(repr(name) for name in labels.values()) + "."
        if labels
        else "It has no solution at all.",
        hint="Did you mean " + " or ".join(f'"{near}"' for near in nearest) + "?"
        if nearest
        else "See them with: campaign solution list SYSTEM.",
        code="solution-not-found",
        details={"label": label, "nearest": nearest},
    )


def adopt_alone(writing: Writing, solution_id: int) -> None:
    """Let the forecast rest on this solution alone; nothing happens when it already does.

    Raises
    ------
    Conflict
        ``already-adopted``, when another one is adopted.
    """
    system_id, current = _current(writing, solution_id)
    others = [row for row in current if row.solution_id != solution_id]
    if others:
        labels = ", ".join(repr(_label(writing.connection, row.solution_id)) for row in others)
        raise Conflict(
            "Another solution of this system is already adopted.",
            why=f"Adopted now: {labels}. Two stand side by side only with weights.",
            hint="Adopt this one instead of it, or give each a weight, for example FIRST=0.7 SECOND=0.3.",
            code="already-adopted",
            details={"adopted": [row.solution_id for row in others]},
        )
    _set_adoptions(writing, system_id, current, {solution_id: None})


def adopt_instead(writing: Writing, solution_id: int) -> None:
    """Let the forecast rest on this solution alone, in place of whatever was adopted."""
    system_id, current = _current(writing, solution_id)
    _set_adoptions(writing, system_id, current, {solution_id: None})


def adopt_weighted(writing: Writing, system_id: int, weights: Mapping[int, float]) -> None:
    """From now on let the forecast be the mixture of exactly these solutions.

    Parameters
    ----------
    weights
        Weight by number of the solution, each above zero; only their ratios matter.

    Raises
    ------
    InputRefused
        For a weight that is not above zero, or a solution of another system.
    """
    for solution_id, weight in weights.items():
        if not weight > 0:
            raise ValueRefused(
                f"The weight {weight} is not above zero.",
                why="A solution without weight has no part in a mixture.",
                hint="Leave it out, or give it a weight such as 0.3.",
                code="weight-refused",
            )
        if get_solution(writing.connection, solution_id).system_id != system_id:
            raise ValueRefused(f"Solution number {solution_id} belongs to another system.")
    current = _current_of_system(writing, system_id)
    _set_adoptions(writing, system_id, current, dict(weights))


def end_adoption(writing: Writing, solution_id: int) -> None:
    """Let this solution have no part in the forecast any more."""
    for row in _current(writing, solution_id)[1]:
        if row.solution_id == solution_id:
            writing.update(adoptions, row.id, {"ended_at": writing.at})


def set_epoch_cycle(
    writing: Writing, solution_id: int, epoch_cycle: int | None, published_cycle_offset: int | None = None
) -> bool:
    """Map the solution's epoch to the system's cycle count; False when it was so."""
    return writing.update(
        solutions,
        solution_id,
        {"epoch_cycle": epoch_cycle, "published_cycle_offset": published_cycle_offset},
    )


def load_solutions(
    connection: Connection, system_ids: Collection[int] | None, known_at: datetime | None
) -> dict[int, list[Solution]]:
    """Solutions by system, in two statements however many there are."""
    titles = source_titles(connection)
    adopted = in_force(adoptions.c.adopted_at, adoptions.c.ended_at, known_at)
    entered = in_force(solutions.c.entered_at, solutions.c.withdrawn_at, known_at)
    rows = connection.execute(
        select(*columns_of(solutions, SOLUTION_COLUMNS), adoptions.c.id, adoptions.c.weight)
        .outerjoin_from(solutions, adoptions, and_(adoptions.c.solution_id == solutions.c.id, adopted))
        .where(among(solutions.c.system_id, system_ids), entered)
        .order_by(solutions.c.system_id, solutions.c.id, adoptions.c.id)
    )
    by_system: dict[int, list[Solution]] = {}
    for row in rows.all():
        if not kept(row[1], system_ids):
            continue
        found = by_system.setdefault(row[1], [])
        solution = solution_from_row(row, titles)
        # A clock that was set back can make two adoptions overlap: the later entry counts.
        if found and found[-1].id == solution.id:
            found[-1] = solution
        else:
            found.append(solution)
    return by_system


def _current(writing: Writing, solution_id: int) -> tuple[int, list[Any]]:
    system_id = get_solution(writing.connection, solution_id).system_id
    return system_id, _current_of_system(writing, system_id)


def _current_of_system(writing: Writing, system_id: int) -> list[Any]:
    rows = writing.connection.execute(
        select(adoptions.c.id, adoptions.c.solution_id, adoptions.c.weight).where(
            adoptions.c.system_id == system_id, adoptions.c.ended_at.is_(None)
        )
    )
    return list(rows.all())


def _set_adoptions(
    writing: Writing, system_id: int, current: list[Any], wanted: Mapping[int, float | None]
) -> None:
    """End what is not wanted or has another weight, then begin what is missing."""
    missing = dict(wanted)
    for row in current:
        if row.solution_id in missing and missing[row.solution_id] == row.weight:
            del missing[row.solution_id]
        else:
            writing.update(adoptions, row.id, {"ended_at": writing.at})
    for solution_id, weight in missing.items():
        writing.insert(
            adoptions,
            {
                "system_id": system_id,
                "solution_id": solution_id,
                "weight": weight,
                "adopted_at": writing.at,
            },
        )


def _label(connection: Connection, solution_id: int) -> str:
    return str(
        connection.execute(select(solutions.c.label).where(solutions.c.id == solution_id)).scalar_one()
    )
