"""A small catalogue that is kept by commands, one operation each, and by undos of them."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import replace
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import Engine
from studies_examples import CLOCK

from campaign.catalogue import episodes, observations, sites, store, systems, upgrade
from campaign.catalogue.store import Writing
from campaign.errors import Conflict
from campaign.model.history import Undone
from campaign.model.instants import Moment
from campaign.model.kept import Stamp
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, DustRule, Episode, Site, Solution, System
from campaign.reading.instants import read_instant
from campaign.studies import amend, rules, solutions, undo
from campaign.studies import systems as system_studies


def begun(folder: Path) -> Path:
    """The folder, with an empty catalogue in it for each :class:`Keeper` to begin with."""
    upgrade.begin_database(folder / "begun.db", at=CLOCK)
    return folder


@contextmanager
def keep_engines() -> Iterator[None]:
    """Let the engines of a path live on, so that each statement is compiled once and not once a command."""

    def keeping(make: Callable[..., Engine]) -> Callable[..., Engine]:
        made: dict[Any, Engine] = {}

        def engine(address: Any, *how: Any) -> Engine:
            if address.path not in made:
                made[address.path] = make(address, *how)
            return made[address.path]

        return engine

    with pytest.MonkeyPatch.context() as patch:
        for name in ("reading_engine", "writing_engine"):
            patch.setattr(store, name, keeping(getattr(store, name)))
        yield


class Keeper:
    """Gives commands an hour apart; each returns the number of its operation."""

    def __init__(self, folder: Path) -> None:
        self.db = str(folder / "campaign.db")
        self.clock = CLOCK
        shutil.copy(folder / "begun.db", self.db)

    def stamp(self, who: str = "Ida Vik") -> Stamp:
        self.clock += timedelta(hours=1)
        return Stamp(self.clock, who, "campaign test")

    def newest(self) -> int:
        with store.reading(self.db) as connection:
            return int(connection.exec_driver_sql("SELECT max(id) FROM operations").scalar_one())

    def command(self, study: Callable[..., object], *words: Any, **how: Any) -> int:
        study(self.db, self.stamp(how.pop("who", "Ida Vik")), *words, **how)
        return self.newest()

    def catalogue(self, work: Callable[[Writing], object], summary: str) -> int:
        stamp = self.stamp()
        with store.writing(self.db, at=stamp.at, who=stamp.who, command="x", summary=summary) as writing:
            work(writing)
        return self.newest()

    # ------------------------------------------------------------------ commands

    def system(self, name: str, **fields: Any) -> int:
        return self.command(system_studies.add_system, System(0, name, 10.0, 20.0, **fields))

    def change(self, system: str, /, **fields: Any) -> int:
        return self.command(system_studies.change_system, system, fields)

    def star(self, name: str, spectral_type: str) -> int:
        return self.change(name, star_b={"spectral_type": spectral_type})

    def site(self, name: str) -> int:
        place = Site(0, name, latitude_deg=-31.0, longitude_deg_east=-70.0)
        return self.catalogue(lambda writing: sites.add_site(writing, place), f"added site {name}")

    def solution(
        self,
        name: str,
        label: str,
        *,
        adopt: bool = False,
        epoch: str = "2001-01-01",
        published_cycle: int | None = None,
    ) -> int:
        draft = Solution(0, 0, label, period_d=Measured(3000.0, 1.0, 1.0))
        at = read_instant(epoch)
        return self.command(solutions.add_solution, name, draft, at, None, published_cycle, adopt)

    def adopt(self, name: str, weights: Mapping[str, float | None] | str) -> int:
        given = {weights: None} if isinstance(weights, str) else weights
        return self.command(solutions.adopt_solutions, name, given, True)

    def rule(self, name: str, onset: float) -> int:
        return self.command(rules.set_rule, name, DustRule(0, 0, "lag", onset=Measured(onset, 1.0, 1.0)))

    def episode(self, name: str, cycle: int | None, onset: float = 58_000.0) -> int:
        def work(writing: Writing) -> None:
            system_id = systems.find_system(writing.connection, name).id
            dated = DatedEvent(Moment(onset, 1.0, 1.0), "K", None)
            episodes.add_episode(writing, Episode(0, system_id, cycle, "proposed", onset=dated))

        return self.catalogue(work, f"added an episode of {name}")

    def decide(self, number: int, state: Any) -> int:
        return self.catalogue(
            lambda w: episodes.decide_episode(w, number, state), f"{state} episode {number}"
        )

    def point(self, writing: Writing, name: str, day: int, **fields: Any) -> Observation:
        system_id = systems.find_system(writing.connection, name).id
        moment = Moment(60_000.0 + day, 0.0, 0.0, "typed", "utc", "geocentre")
        point = Observation(0, "", system_id, "photometry", moment, Measured(7.0), "mag", band="K")
        return replace(point, **fields)

    def log(self, name: str, day: int, **fields: Any) -> int:
        return self.catalogue(
            lambda w: observations.add_observation(w, self.point(w, name, day, **fields)), f"logged {name}"
        )

    def load(self, name: str, days: range, **fields: Any) -> int:
        return self.catalogue(
            lambda w: observations.add_observations(w, [self.point(w, name, d, **fields) for d in days]),
            f"loaded {len(days)} observations of {name}",
        )

    def amend(self, number: int, mag: float) -> int:
        return self.command(amend.amend_observation, number, {"value": Measured(mag)})

    def withdraw(self, *numbers: int) -> int:
        return self.command(amend.withdraw_observations, numbers, "wrong star")

    def undo(self, number: int | None = None, who: str = "Ida Vik") -> int:
        done: Undone = undo.undo(self.db, self.stamp(who), number)
        assert done.by_id is not None
        return done.by_id

    # ------------------------------------------------------------------ what is there

    def refused(self, number: int) -> dict[int | None, str]:
        """Which later operations stand against the undo, each with its reason; nothing changes."""
        before = self.newest()
        with pytest.raises(Conflict) as refused:
            undo.undo(self.db, self.stamp(), number)
        assert refused.value.code == "depended-on", refused.value
        with pytest.raises(Conflict):
            undo.preview_undo(self.db, "Ida Vik", number)
        assert self.newest() == before
        return {each["operation"]: each["reason"] for each in refused.value.details["dependants"]}

    def record(self, name: str, known_at: datetime | None = None) -> SystemRecord:
        from campaign.catalogue import records

        with store.reading(self.db) as connection:
            found = records.load_records(connection, known_at=known_at, include_retired=True)
        return next(record for record in found if record.system.name == name)

    def names(self) -> list[tuple[str, ...]]:
        """Name and aliases of each system in use."""
        with store.reading(self.db) as connection:
            found = systems.list_systems(connection, include_retired=True)
        return [(system.name, *system.aliases) for system in found]

    def values(self, known_at: datetime | None = None) -> dict[int, float]:
        """Magnitudes in use, by number of the observation."""
        with store.reading(self.db) as connection:
            found = observations.observations_of(connection, known_at=known_at)
        return {each.id: each.value.value for each in found if each.value is not None}
