"""Keep systems: add, change, retire; and show one with everything that is known and derived."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from campaign.catalogue import observations, records, store, systems
from campaign.errors import Conflict, NotFound
from campaign.model.kept import Kept, Stamp
from campaign.model.records import SystemRecord
from campaign.model.shown import ShownSystem
from campaign.model.systems import Solution, System
from campaign.studies.derived import derive, derive_distance
from campaign.studies.episodes import counted
from campaign.studies.rows import distance_of


def add_system(db: str, stamp: Stamp, system: System) -> Kept:
    """Add a system with its aliases and its two stars.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    system : System
        Position in deg (ICRS), distance in pc or parallax in mas.

    Returns
    -------
    Kept
        What was written.

    Raises
    ------
    Conflict
        If the name or an alias is taken, whatever its case and spaces.

    Notes
    -----
    Accuracy: not applicable. Source: DEVELOPERS.md.
    """
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        system_id = systems.add_system(writing, system)
        writing.summarise(f"added system {system.name}")
    lines = [
        f"added system {system.name} ({system.state})",
        f"position: RA {system.ra_deg:.5f} deg ({system.ra_deg / 15.0:.5f} h), "
        f"Dec {system.dec_deg:+.5f} deg, ICRS, epoch {system.position_epoch_jyr:g}",
    ]
    if system.distance_pc is None and system.parallax_mas is not None:
        distance = distance_of(SystemRecord(system))
        if distance is not None and distance.minus is not None and distance.plus is not None:
            size = f"{distance.value:.0f} +{distance.plus:.0f} -{distance.minus:.0f} pc"
            lines.append(f"distance {size} from the parallax, {parallax_method(system)}")
    lines.append(f'next: campaign solution add "{system.name}" --period ... --epoch ... --adopt')
    return Kept("system-add", True, tuple(lines), {"system": system.name, "id": system_id})


def parallax_method(system: System) -> str:
    """How a parallax was turned into a distance.

    Parameters
    ----------
    system : System
        Parallax in mas.

    Returns
    -------
    str
        One phrase.

    Notes
    -----
    Accuracy: words only. Source: ``campaign.physics.distance``.
    """
    from campaign.physics.distance import distance_from_parallax

    parallax = system.parallax_mas
    if parallax is None or parallax.sigma is None:
        return "plain inversion, error unknown"
    return distance_from_parallax(parallax.value, parallax.sigma).method


def change_system(db: str, stamp: Stamp, name: str, changes: dict[str, Any]) -> Kept:
    """Change what is given of a system and leave the rest.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    name : str
        Name or alias.
    changes : dict
        Fields of ``System`` to replace; ``star_a`` and ``star_b`` hold dicts of fields of ``Star``.

    Returns
    -------
    Kept
        ``changed`` is False when nothing differed.

    Raises
    ------
    NotFound, Conflict
        Unknown system; a name that is taken, or a change by somebody else in between.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        before = systems.find_system(writing.connection, name)
        changed_fields = dict(changes)
        for star in ("star_a", "star_b"):
            if star in changed_fields:
                changed_fields[star] = replace(getattr(before, star), **changed_fields[star])
        changed_fields["aliases"] = _aliases(before, changed_fields)
        after = replace(before, **changed_fields)
        changed = systems.change_system(writing, before, after)
        writing.summarise(f"changed {', '.join(sorted(changes))} of {before.name}")
    text = f"changed {after.name}" if changed else f"{after.name} already reads so; nothing was changed"
    return Kept("system-change", changed, (text,), {"system": after.name, "changed": sorted(changes)})


def _aliases(before: System, changes: dict[str, Any]) -> tuple[str, ...]:
    """Aliases are only ever added; a name that is replaced stays as one."""
    more = tuple(changes.get("aliases", ()))
    if changes.get("name", before.name) != before.name:
        more = (before.name, *more)
    return tuple(dict.fromkeys((*before.aliases, *more)))


def retire_system(db: str, stamp: Stamp, name: str) -> Kept:
    """Take a system out of the watch; nothing of it is erased.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    name : str
        Name or alias.

    Returns
    -------
    Kept
        ``changed`` is False when it was retired before.

    Raises
    ------
    NotFound
        If the system is unknown.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        system = systems.find_system(writing.connection, name)
        changed = systems.set_state(writing, system.id, "retired")
        writing.summarise(f"retired {system.name}")
    text = (
        f'retired {system.name}; bring it back with: campaign system change "{system.name}" --state episodic'
        if changed
        else f"{system.name} is already retired"
    )
    return Kept("system-retire", changed, (text,), {"system": system.name})


def list_systems(db: str, include_retired: bool) -> list[SystemRecord]:
    """Systems with their solutions, rules and episodes, by name.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    include_retired : bool
        Whether retired systems are listed too.

    Returns
    -------
    list of SystemRecord
        By name.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    with store.reading(db) as connection:
        found = records.load_records(connection, include_retired=include_retired)
    return sorted(found, key=lambda r: r.system.name.casefold())


def load_record(db: str, name: str) -> SystemRecord:
    """One system with everything that a forecast needs.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    name : str
        Name or alias.

    Returns
    -------
    SystemRecord
        Also of a retired system.

    Raises
    ------
    NotFound
        If the system is unknown; the nearest names are in the details.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    with store.reading(db) as connection:
        system = systems.find_system(connection, name)
        return records.load_records(connection, [system.id], include_retired=True)[0]


def show_system(db: str, name: str) -> ShownSystem:
    """Everything known of one system, and what follows from it.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    name : str
        Name or alias.

    Returns
    -------
    ShownSystem
        Derived values carry their unit.

    Raises
    ------
    NotFound
        If the system is unknown.

    Notes
    -----
    Accuracy: errors by 20,000 seeded draws.

    Source: see ``derive``.
    """
    with store.reading(db) as connection:
        system = systems.find_system(connection, name)
        record = records.load_records(connection, [system.id], include_retired=True)[0]
        counts = observations.count_observations(connection, [system.id]).get(system.id, {})
    adopted = next((s for s in record.solutions if s.adopted), None)
    derived = derive(record, adopted) if adopted is not None else tuple(derive_distance(record))
    return ShownSystem(replace(record, episodes=counted(record)), derived, counts)


def require_solution(record: SystemRecord, label: str | None) -> Solution:
    """The named solution, else the adopted one.

    Parameters
    ----------
    record : SystemRecord
        A system.
    label : str or None
        Label of a solution.

    Returns
    -------
    Solution
        The solution.

    Raises
    ------
    NotFound, Conflict
        No solution of that label; none adopted to take in its place.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    if label is not None:
        for solution in record.solutions:
            if solution.label.casefold() == label.casefold():
                return solution
        labels = ", ".join(f"'{s.label}'" for s in record.solutions) or "none at all"
        raise NotFound(
            f"{record.system.name} has no solution '{label}'.",
            why=f"Its solutions are: {labels}.",
            hint=f'See them with: campaign solution list "{record.system.name}"',
            code="solution-not-found",
        )
    for solution in record.solutions:
        if solution.adopted:
            return solution
    name = record.system.name
    labels = ", ".join(f"'{s.label}'" for s in record.solutions)
    raise Conflict(
        f"{name} has no adopted solution.",
        why=f"None of its solutions has been chosen: {labels}." if labels else "It has no solution at all.",
        hint=f'Name one of them, or adopt it: campaign solution adopt "{name}" "{record.solutions[0].label}"'
        if labels
        else f'Add one: campaign solution add "{name}" --period ... --epoch ... --adopt',
        code="no-adopted-solution",
    )
