"""Exported systems, solutions and episodes, back into a catalogue."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import fields, replace
from typing import Any

from campaign.catalogue import episodes, rules, solutions, systems
from campaign.catalogue.naming import name_key
from campaign.catalogue.store import Writing
from campaign.errors import CampaignError, Conflict, InputRefused
from campaign.model.exported import ExchangedSolution, ExchangedSystem, ExchangeRow
from campaign.model.loading import LoadWarning
from campaign.model.systems import DustRule, Episode, Solution, System
from campaign.reading.exchange_models import episode_from_row, solution_from_row, system_from_row
from campaign.studies.load_exchanged import Tally, attempted
from campaign.studies.load_names import NameIndex, PlaceIndex, alias_warnings, system_index

# What an entry has in its own catalogue alone.
_OWN = {"id", "system_id"}


def enter_systems(writing: Writing, rows: Iterable[ExchangeRow], tally: Tally) -> None:
    """Enter exported systems with their dust rules.

    Parameters
    ----------
    writing : Writing
        The operation under way.
    rows : iterable of ExchangeRow
        Units as in ``campaign.model.exchange_columns``.
    tally : Tally
        Gets what comes of each row; one that is known with other values is refused.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    known = {
        name_key(system.name): system
        for system in systems.list_systems(writing.connection, include_retired=True)
    }
    places = PlaceIndex()
    for system in known.values():
        places.add(system)
    for row in rows:
        try:
            exchanged = system_from_row(row.cells)
        except InputRefused as refused:
            tally.refuse_for(row, refused)
            continue
        there = known.get(name_key(exchanged.system.name))
        if there is not None:
            _compare_system(writing, tally, row, exchanged, there)
        elif attempted(writing, tally, row, lambda new=exchanged: _enter_system(writing, new)):  # type: ignore[misc]
            tally.added += 1
            near = places.warning(exchanged.system)
            tally.warnings += [] if near is None else [replace(near, lines=(row.line,))]
            places.add(exchanged.system)


def _enter_system(writing: Writing, exchanged: ExchangedSystem) -> None:
    number = systems.add_system(writing, exchanged.system)
    if exchanged.rule is not None:
        rules.set_rule(writing, replace(exchanged.rule, system_id=number))


def _compare_system(
    writing: Writing, tally: Tally, row: ExchangeRow, exchanged: ExchangedSystem, there: System
) -> None:
    differing = _differing(replace(exchanged.system, name=there.name), there)
    rule = rules.rule_of(writing.connection, there.id)
    if not _same_rule(exchanged.rule, rule):
        differing.append("dust rule")
    if differing:
        tally.refuse_for(
            row,
            _known_otherwise(
                f"The system {there.name!r}", differing, f'campaign system change "{there.name}"'
            ),
        )
    else:
        tally.already_known += 1


def _same_rule(new: DustRule | None, there: DustRule | None) -> bool:
    if new is None or there is None:
        return new is there
    return not _differing(new, there)


def _differing(new: Any, there: Any) -> list[str]:
    """Names of the fields in which two entries differ, as far as they do not belong to a catalogue."""
    return [
        field.name
        for field in fields(new)
        if field.name not in _OWN and getattr(new, field.name) != getattr(there, field.name)
    ]


def _known_otherwise(what: str, differing: list[str], command: str) -> Conflict:
    return Conflict(
        f"{what} is known with other values.",
        why=f"They differ in {', '.join(differing)}.",
        hint=f"What is known is never changed by a load; change it with: {command}.",
        code="known-otherwise",
    )


def enter_solutions(writing: Writing, rows: Iterable[ExchangeRow], tally: Tally) -> None:
    """Enter exported solutions, and adopt those that were adopted where nothing else is.

    Parameters
    ----------
    writing : Writing
        The operation under way.
    rows : iterable of ExchangeRow
        Units as in ``campaign.model.exchange_columns``.
    tally : Tally
        Gets what comes of each row; one that is known with other values is refused.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    index, known_systems = _index(writing)
    adopted: dict[int, list[tuple[int, Solution]]] = {}
    for row in rows:
        try:
            exchanged = solution_from_row(row.cells)
            system = known_systems[index.read(exchanged.system)]
        except InputRefused as refused:
            tally.refuse_for(row, refused)
            continue
        there = next(
            (
                each
                for each in solutions.solutions_of(writing.connection, system.id)
                if name_key(each.label) == name_key(exchanged.solution.label)
            ),
            None,
        )
        if there is not None:
            _compare_solution(tally, row, exchanged, there, system)
            if there.adopted == exchanged.solution.adopted:
                continue
            number = there.id
        else:
            entered: list[int] = []
            draft = replace(exchanged.solution, system_id=system.id)
            if not attempted(
                writing, tally, row,
                lambda new=draft, into=entered: into.append(solutions.add_solution(writing, new)),  # type: ignore[misc]
            ):  # fmt: skip
                continue
            tally.added += 1
            number = entered[0]
        if exchanged.solution.adopted and (there is None or not there.adopted):
            adopted.setdefault(system.id, []).append((number, exchanged.solution))
    tally.warnings += alias_warnings(index, known_systems)
    for system_id, wanted in adopted.items():
        _adopt(writing, tally, systems.get_system(writing.connection, system_id), wanted)


def _compare_solution(
    tally: Tally, row: ExchangeRow, exchanged: ExchangedSolution, there: Solution, system: System
) -> None:
    new = replace(exchanged.solution, label=there.label, adopted=there.adopted, weight=there.weight)
    differing = _differing(new, there)
    if differing:
        what = f"The solution {there.label!r} of {system.name!r}"
        tally.refuse_for(
            row, _known_otherwise(what, differing, "campaign solution add ... with another --label")
        )
    else:
        tally.already_known += 1


def _adopt(writing: Writing, tally: Tally, system: System, wanted: list[tuple[int, Solution]]) -> None:
    """Adopt as it was, unless the system rests on something else already."""
    before = [each for each in solutions.solutions_of(writing.connection, system.id) if each.adopted]
    if before:
        labels = ", ".join(repr(each.label) for each in before)
        text = f"{system.name} goes on resting on {labels}; what the table adopts was not adopted"
        tally.warnings.append(LoadWarning("adoption-kept", text, len(wanted)))
        return
    weights = {number: solution.weight for number, solution in wanted if solution.weight is not None}
    try:
        if len(weights) == len(wanted):
            solutions.adopt_weighted(writing, system.id, weights)
        elif len(wanted) == 1:
            solutions.adopt_alone(writing, wanted[0][0])
        else:
            raise InputRefused("Several are adopted, and not all have a weight.", code="adoption-refused")
    except CampaignError as refused:
        text = f"{system.name}: nothing was adopted ({refused.message})"
        tally.warnings.append(LoadWarning("adoption-refused", text, len(wanted)))


def enter_episodes(writing: Writing, rows: Iterable[ExchangeRow], tally: Tally) -> None:
    """Enter exported episodes.

    Parameters
    ----------
    writing : Writing
        The operation under way.
    rows : iterable of ExchangeRow
        Units as in ``campaign.model.exchange_columns``.
    tally : Tally
        Gets what comes of each row; one that was there before, in every cell, is known.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    index, known_systems = _index(writing)
    there: dict[tuple[int, bool], list[Episode]] = {}
    for row in rows:
        try:
            exchanged = episode_from_row(row.cells)
            system = known_systems[index.read(exchanged.system)]
        except InputRefused as refused:
            tally.refuse_for(row, refused)
            continue
        draft = replace(exchanged.episode, system_id=system.id)
        group = system.id, exchanged.withdrawn
        if group not in there:
            there[group] = _episodes_there(writing, *group)
        same = next((each for each in there[group] if replace(draft, id=each.id) == each), None)
        if same is not None:
            # Each of those there stands for one row: a table may hold two that are alike.
            there[group].remove(same)
            tally.already_known += 1
        elif attempted(
            writing, tally, row,
            lambda new=draft, gone=exchanged.withdrawn: _enter_episode(writing, new, gone),  # type: ignore[misc]
        ):  # fmt: skip
            tally.added += 1
    tally.warnings += alias_warnings(index, known_systems)


def _episodes_there(writing: Writing, system_id: int, withdrawn: bool) -> list[Episode]:
    if withdrawn:
        return list(episodes.load_withdrawn_episodes(writing.connection, {system_id}).get(system_id, ()))
    return list(episodes.episodes_of(writing.connection, system_id))


def _enter_episode(writing: Writing, episode: Episode, withdrawn: bool) -> None:
    number = episodes.add_episode(writing, episode)
    if withdrawn:
        episodes.withdraw_episode(writing, number)


def _index(writing: Writing) -> tuple[NameIndex, list[System]]:
    known = systems.list_systems(writing.connection, include_retired=True)
    return system_index(known), known
