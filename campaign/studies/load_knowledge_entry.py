"""Systems, solutions and episodes of a table of somebody, entered row by row."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from typing import Any

from campaign.catalogue import solutions, systems
from campaign.catalogue.naming import name_key
from campaign.catalogue.store import Writing
from campaign.errors import Conflict, InputRefused
from campaign.model.instants import TypedInstant
from campaign.model.loading import LoadWarning
from campaign.model.measured import Measured
from campaign.model.systems import Episode, Solution, Star, System
from campaign.studies.episodes import enter_episode
from campaign.studies.instants import moment_of
from campaign.studies.load_names import PlaceIndex
from campaign.studies.solutions import enter_solution

_ELEMENTS = {
    "eccentricity": "eccentricity", "omega": "omega_deg", "inclination": "inclination_deg",
    "node": "node_deg", "k_a": "k_a_kms", "k_b": "k_b_kms", "gamma": "gamma_kms", "a_au": "a_au",
    "a_arcsec": "a_arcsec",
}  # fmt: skip
_STAGES = ("onset", "maximum", "end")


class KnownSystems:
    """Systems of the catalogue and those that rows have added; ``told`` is what there is to warn of."""

    def __init__(self, known: Sequence[System]) -> None:
        self.by_name: dict[str, System] = {}
        self.places = PlaceIndex()
        self.told: list[LoadWarning] = []
        for system in known:
            self.add(system)

    def add(self, system: System) -> None:
        """Count one more among the known."""
        self.by_name[name_key(system.name)] = system
        self.places.add(system)


# Enters the values of one row, and tells whether they were new.
Enterer = Callable[[Writing, Mapping[str, Any], KnownSystems], bool]


def _with_error(values: Mapping[str, Any], name: str) -> Any:
    """A value with its error from the column beside it, if its cell has none."""
    value, error = values.get(name), values.get(f"{name}_error")
    if error is None or not isinstance(value, Measured):
        return value
    if value.minus is not None:
        raise InputRefused(
            f"The error of {name} is given twice.",
            why="It stands in the cell of the value and in its own column.",
            hint="Leave one of them out.",
            code="error-twice",
        )
    return Measured(value.value, error.value, error.value)


def _dated(values: Mapping[str, Any], name: str) -> TypedInstant | None:
    """An instant with its error from the column beside it; no narrower than a day or month that it names."""
    typed: TypedInstant | None = values.get(name)
    error: Measured | None = values.get(f"{name}_error")
    if typed is None or error is None:
        return typed
    floor = (typed.minus_d or 0.0) if typed.width_d else 0.0
    size = max(error.value, floor)
    return replace(typed, minus_d=size, plus_d=size, width_d=typed.width_d if size <= floor else 0.0)


def _enter_system(writing: Writing, values: Mapping[str, Any], known: KnownSystems) -> bool:
    priority = values.get("priority", 3.0)
    if priority not in range(1, 10):
        raise InputRefused(
            "The priority is refused.", why="It is a whole number from 1 to 9.", code="priority-refused"
        )
    aliases = tuple(name for part in values.get("aliases", "").split(";") if (name := part.strip()))
    system = System(
        id=0,
        name=values["name"],
        ra_deg=values["ra"],
        dec_deg=values["dec"],
        distance_pc=_with_error(values, "distance"),
        parallax_mas=_with_error(values, "parallax"),
        state=values.get("state", "episodic"),
        priority=int(priority),
        notes=values.get("notes", ""),
        aliases=aliases,
        star_a=Star("A", spectral_type=values.get("spectral_type_a")),
        star_b=Star("B", spectral_type=values.get("spectral_type_b")),
    )
    there = known.by_name.get(name_key(system.name))
    if there is not None:
        if _says_nothing_new(system, there, values):
            return False
        raise Conflict(
            f"The system {there.name!r} is known with other values.",
            why="What is known is never changed by a load.",
            hint=f'Change it with: campaign system change "{there.name}".',
            code="known-otherwise",
        )
    systems.add_system(writing, system)
    near = known.places.warning(system)
    known.told += [] if near is None else [near]
    known.add(system)
    return True


def _says_nothing_new(new: System, there: System, values: Mapping[str, Any]) -> bool:
    """Whether everything that the row says is known of the system."""
    pairs = {
        "ra": ("ra_deg",), "dec": ("dec_deg",), "distance": ("distance_pc",), "parallax": ("parallax_mas",),
        "state": ("state",), "priority": ("priority",), "notes": ("notes",),
    }  # fmt: skip
    alike = all(
        getattr(new, field) == getattr(there, field)
        for name, names in pairs.items()
        if name in values
        for field in names
    )
    names_there = {name_key(name) for name in there.aliases}
    types = ((new.star_a, there.star_a), (new.star_b, there.star_b))
    return (
        alike
        and all(name_key(name) in names_there for name in new.aliases)
        and all(one.spectral_type in (None, other.spectral_type) for one, other in types)
    )


def _enter_solution(writing: Writing, values: Mapping[str, Any], known: KnownSystems) -> bool:
    elements: dict[str, Any] = {column: _with_error(values, name) for name, column in _ELEMENTS.items()}
    if elements["omega_deg"] is not None and values.get("omega_of") is None:
        raise InputRefused(
            "The row does not say which star omega belongs to.",
            why="omega of star A and omega of star B differ by 180 deg.",
            hint="Add a column omega_of, or say it for all rows: --constant omega_of=A.",
            code="omega-of-missing",
        )
    draft = Solution(
        id=0,
        system_id=0,
        label=values.get("label", ""),
        period_d=_with_error(values, "period"),
        epoch_marks=values.get("epoch_marks", "periastron"),
        omega_of=values.get("omega_of"),
        source=values.get("source", ""),
        note=values.get("note", ""),
        **elements,
    )
    system = systems.find_system(writing.connection, values["system"])
    epoch = _dated(values, "epoch")
    moment = None if epoch is None else moment_of(epoch, system)
    for there in solutions.solutions_of(writing.connection, system.id):
        same = replace(
            there, id=0, system_id=0, label=draft.label, adopted=False, weight=None, epoch=None,
            epoch_cycle=None, published_cycle_offset=None, covariance=None, data_until_bmjd_tdb=None,
        ) == draft  # fmt: skip
        label_fits = not draft.label or name_key(draft.label) == name_key(there.label)
        at, known_at = (None if m is None else m.bmjd_tdb for m in (moment, there.epoch))
        if same and label_fits and at == known_at:
            return False
    enter_solution(writing, values["system"], draft, epoch, None, None, adopt=False)
    return True


def _enter_episode(writing: Writing, values: Mapping[str, Any], known: KnownSystems) -> bool:
    dates = {
        stage: (typed, values.get("band"), values.get("method"))
        for stage in _STAGES
        if (typed := _dated(values, stage)) is not None
    }
    cycle = values.get("cycle")
    if cycle is not None and cycle != int(cycle):
        raise InputRefused("The cycle is refused.", why="It is a whole number.", code="cycle-refused")
    draft = Episode(
        id=0,
        system_id=0,
        cycle=None if cycle is None else int(cycle),
        state=values.get("state", "confirmed"),
        source=values.get("source", ""),
        note=values.get("note", ""),
    )
    kept = enter_episode(writing, values["system"], draft, dates)
    known.told += [LoadWarning("future", f"{values['system']}: {text}", 1) for text in kept.warnings]
    return kept.changed


ENTERERS: Mapping[str, Enterer] = {
    "systems": _enter_system,
    "solutions": _enter_solution,
    "episodes": _enter_episode,
}
