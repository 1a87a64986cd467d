"""Keep systems: add, change, retire; and show one with everything that is known and derived."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from campaign.catalogue import observations, records, store, systems
from campaign.errors import Conflict
from campaign.model.kept import Kept, Stamp
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.shown import DerivedValue, ShownSystem
from campaign.model.systems import Solution, System
from campaign.studies.rows import distance_of
from campaign.studies.sampling import DEFAULT_SEED

FloatArray = NDArray[np.float64]
_DRAWS = 20_000


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
    Accuracy: not applicable. Source: design, section 2.
    """
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        system_id = systems.add_system(writing, system)
        writing.summarise(f"added system {system.name}")
    lines = [f"added system {system.name} ({system.state})"]
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
    return ShownSystem(record, derive(record, adopted) if adopted is not None else (), counts)


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
    Conflict
        If there is none to use.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    if label is not None:
        for solution in record.solutions:
            if solution.label.casefold() == label.casefold():
                return solution
        labels = ", ".join(f"'{s.label}'" for s in record.solutions) or "none at all"
        raise Conflict(
            f"{record.system.name} has no solution '{label}'.",
            why=f"Its solutions are: {labels}.",
            hint=f'See them with: campaign solution list "{record.system.name}"',
            code="solution-not-found",
        )
    for solution in record.solutions:
        if solution.adopted:
            return solution
    raise Conflict(
        f"{record.system.name} has no adopted solution.",
        why="A table needs elements, and none has been chosen.",
        hint=f'Adopt one with: campaign solution adopt "{record.system.name}" LABEL',
        code="no-adopted-solution",
    )


def derive(record: SystemRecord, solution: Solution) -> tuple[DerivedValue, ...]:
    """Masses, sizes and distance that follow from the elements, with errors by seeded draws.

    From the velocities of one star alone only the size of its own orbit times sin i follows.

    Parameters
    ----------
    record : SystemRecord
        System with distance in pc or parallax in mas.
    solution : Solution
        Elements.

    Returns
    -------
    tuple of DerivedValue
        Median and 16/84 % errors; an input without an error gives a value without one.

    Notes
    -----
    Accuracy: about 1 % of the errors, from 20,000 draws.

    Source: M sin^3 i = (P/2 pi G)(1 - e^2)^1.5 (K_A + K_B)^2 K_other; a sin i = K P sqrt(1 - e^2)/(2 pi);
    Kepler's third law.
    """
    from campaign.physics import masses
    from campaign.physics.constants import AU_KM
    from campaign.physics.draws import stratified_normals, two_piece_within

    found: list[DerivedValue] = []
    names = ["period", "e", "k_a", "k_b", "i", "a_au", "a_arcsec", "distance"]
    normals = stratified_normals(names, _DRAWS, DEFAULT_SEED)

    def drawn(name: str, value: Measured, low: float, high: float) -> FloatArray:
        middle, minus, plus = (np.array([[x]]) for x in (value.value, value.minus or 0.0, value.plus or 0.0))
        column = two_piece_within(middle, minus, plus, normals[name][None, :], low, high)
        return column.ravel()

    def add(quantity: str, values: Any, unit: str, how: str, *inputs: Measured | None) -> None:
        low, median, high = np.quantile(values, [0.16, 0.5, 0.84])
        known = all(x is not None and x.error_known for x in inputs)
        errors = (float(median - low), float(high - median)) if known else (None, None)
        found.append(DerivedValue(quantity, Measured(float(median), *errors), unit, how))

    distance = distance_of(record)
    if distance is not None and record.system.distance_pc is None:
        found.append(DerivedValue("distance", distance, "pc", "parallax, " + parallax_method(record.system)))
    if solution.a_arcsec is not None and distance is not None:
        size = drawn("a_arcsec", solution.a_arcsec, 1e-9, np.inf) * drawn("distance", distance, 1e-3, np.inf)
        add("semi-major axis", size, "au", "a in arcsec times distance", solution.a_arcsec, distance)
    if solution.a_au is not None and distance is not None:
        size = 1000.0 * drawn("a_au", solution.a_au, 1e-9, np.inf) / drawn("distance", distance, 1e-3, np.inf)
        add("semi-major axis", size, "mas", "a in au over distance", solution.a_au, distance)
    if solution.a_au is not None and solution.a_arcsec is not None:
        far = drawn("a_au", solution.a_au, 1e-9, np.inf) / drawn("a_arcsec", solution.a_arcsec, 1e-9, np.inf)
        add("distance", far, "pc", "a in au over a in arcsec", solution.a_au, solution.a_arcsec)
    k_a, k_b, e, spread = solution.k_a_kms, solution.k_b_kms, solution.eccentricity, solution.period_d
    if e is None or not isinstance(spread, Measured):
        return tuple(found)
    p, ecc = drawn("period", spread, 1e-6, np.inf), drawn("e", e, 0.0, 1.0 - 1e-9)
    if k_a is None or k_b is None:
        for star, name, k in (("A", "k_a", k_a), ("B", "k_b", k_b)):
            if k is not None:
                path = masses.projected_semi_major_axis_km(p, ecc, drawn(name, k, 1e-9, np.inf)) / AU_KM
                add(f"semi-major axis of star {star} times sin i", path, "au", "velocities", spread, e, k)
        return tuple(found)
    ka, kb = drawn("k_a", k_a, 1e-9, np.inf), drawn("k_b", k_b, 1e-9, np.inf)
    minimum_a, minimum_b = masses.minimum_masses(p, ecc, ka, kb)
    inputs = (spread, e, k_a, k_b)
    add("mass of star A times sin^3 i", minimum_a, "Msun", "velocities", *inputs)
    add("mass of star B times sin^3 i", minimum_b, "Msun", "velocities", *inputs)
    add("mass ratio B/A", ka / kb, "", "velocities", k_a, k_b)
    if solution.inclination_deg is not None:
        tilt = drawn("i", solution.inclination_deg, 0.0, 180.0)
        sine = np.sin(np.radians(tilt))
        whole = (*inputs, solution.inclination_deg)
        add("mass of star A", minimum_a / sine**3, "Msun", "velocities and inclination", *whole)
        add("mass of star B", minimum_b / sine**3, "Msun", "velocities and inclination", *whole)
        size = masses.semi_major_axis_from_velocities(p, ecc, ka, kb, np.radians(tilt))
        add("semi-major axis", size, "au", "velocities and inclination", *whole)
    return tuple(found)
