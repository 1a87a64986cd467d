"""Commands and undos in any order, beside a model that knows nothing of the journal.

The model is a mapping of what the catalogue shows, entry by entry, before and after each command. Taking a
command back must give every entry that the command changed its earlier look, and change no other. It must be
refused when such an entry looks otherwise by now, or when something in use would be left hanging.
"""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any, ClassVar

import pytest
from hypothesis import HealthCheck, Phase, settings
from hypothesis import strategies as st
from hypothesis.stateful import (
    RuleBasedStateMachine,
    initialize,
    invariant,
    precondition,
    rule,
    run_state_machine_as_test,
)
from sqlalchemy import text
from studies_examples import CLOCK
from undo_examples import begun, keep_engines

from campaign.catalogue import (
    episodes,
    keepings,
    observations,
    records,
    sites,
    store,
    systems,
)
from campaign.catalogue.store import Writing
from campaign.errors import Conflict, NotFound
from campaign.model.forecasts import EventForecast
from campaign.model.instants import Moment
from campaign.model.kept import Stamp
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.model.systems import DatedEvent, DustRule, Episode, Site, Solution, Star, System
from campaign.model.verification import ForecastInputs, Keeping, KeptForecast
from campaign.reading.instants import read_instant
from campaign.studies import amend, rules, solutions, undo
from campaign.studies import systems as system_studies

Look = dict[tuple[Any, ...], Any]

NAMES = ("Dim", "Faint", "Harbour")
LABELS = ("first", "second")
PLACES = ("Cold Mesa", "Harrow Pass")
PEOPLE = ("Ida Vik", "Tor Asp")

names = st.sampled_from(NAMES)
labels = st.sampled_from(LABELS)
places = st.sampled_from(PLACES)
numbers = st.integers(0, 1000)


@dataclass(frozen=True)
class Done:
    """A command: who gave it, and what of the catalogue looked how before and after it."""

    who: str
    before: Look
    after: Look

    @property
    def changed(self) -> set[tuple[Any, ...]]:
        keys = self.before.keys() | self.after.keys()
        return {key for key in keys if self.before.get(key) != self.after.get(key)}


def look(connection: Any) -> Look:
    """Everything that the catalogue shows now, entry by entry, through its reading functions."""
    found: Look = {}
    for record in records.load_records(connection, include_retired=True):
        system = record.system
        found["system", system.id] = True
        found["priority", system.id], found["state", system.id] = system.priority, system.state
        found["anchor", system.id] = system.cycle_anchor_bmjd_tdb, system.cycle_anchor_period_d
        found["name", system.id] = system.name
        for alias in system.aliases:
            found["alias", system.id, alias] = True
        found["star", system.id, "A"], found["star", system.id, "B"] = system.star_a, system.star_b
        for solution in record.solutions:
            found["solution", solution.id] = replace(solution, adopted=False, weight=None, epoch_cycle=None)
            found["cycle", solution.id] = ("cycle", solution.epoch_cycle)
            if solution.adopted:
                found["adopted", system.id, solution.id] = ("weight", solution.weight)
        if record.rule is not None:
            found["rule", system.id] = record.rule
        for episode in record.episodes:
            found["episode", episode.id] = episode
    for site in sites.list_sites(connection):
        found["site", site.id] = site
    for observation in observations.observations_of(connection):
        found["observation", observation.id] = observation
    for keeping in keepings.list_keepings(connection):
        found["keeping", keeping.id] = keeping
    for forecast in keepings.load_kept(connection):
        # It is shown under the name that its system has now.
        event = replace(forecast.event, system="")
        found["kept forecast", forecast.id] = replace(forecast, event=event)
    return found


def known(connection: Any, at: datetime) -> Look:
    """What was known at an instant; positions, names and stars are always the present ones."""
    found: Look = {}
    for record in records.load_records(connection, known_at=at, include_retired=True):
        found["system", record.system.id] = True
        for solution in record.solutions:
            found["solution", solution.id] = solution.label
            if solution.adopted:
                found["adopted", record.system.id, solution.id] = solution.weight
        if record.rule is not None:
            found["rule", record.system.id] = record.rule.kind
        for episode in record.episodes:
            found["episode", episode.id] = episode.state
    for observation in observations.observations_of(connection, known_at=at):
        found["observation", observation.id] = observation.value
    return found


def hanging(found: Look) -> list[str]:
    """What would be wrong with a catalogue that looked so."""
    wrong = []
    there = {key[1] for key in found if key[0] == "system"}
    placed = {key[1] for key in found if key[0] == "site"}
    solved = {key[1] for key in found if key[0] == "solution"}
    spoken, labelled, located, measured = set(), set(), set(), set()
    kept = [value.label for key, value in found.items() if key[0] == "keeping" and value.label]
    wrong += ["a label of kept forecasts twice"] if len(kept) != len(set(kept)) else []
    for key, value in found.items():
        if (
            key[0] in ("alias", "name", "star", "rule", "adopted", "priority", "anchor")
            and key[1] not in there
        ):
            wrong.append(f"{key} without its system")
        if key[0] in ("name", "alias"):
            name = value if key[0] == "name" else key[2]
            wrong += [f"{name} twice"] if name in spoken else []
            spoken.add(name)
        if key[0] in ("solution", "episode", "observation", "kept forecast") and value.system_id not in there:
            wrong.append(f"{key} without its system")
        if key[0] == "solution":
            wrong += [f"{value.label} twice"] if (value.system_id, value.label) in labelled else []
            labelled.add((value.system_id, value.label))
        if key[0] == "adopted" and key[2] not in solved:
            wrong.append(f"{key} without its solution")
        if key[0] == "site":
            wrong += [f"{value.name} twice"] if value.name in located else []
            located.add(value.name)
        if key[0] == "observation":
            if value.site_id is not None and value.site_id not in placed:
                wrong.append(f"{key} without its site")
            what = (value.system_id, value.moment.bmjd_tdb, value.value.value, value.site_id)
            wrong += [f"{key} twice"] if what in measured else []
            measured.add(what)
    return wrong


class Undoing(RuleBasedStateMachine):
    """Commands of two observers, and undos of any of them."""

    @initialize()
    def begin(self) -> None:
        self.db = str(BEGUN["path"].with_name("campaign.db"))
        shutil.copy(BEGUN["path"], self.db)
        self.clock = CLOCK
        self.done: dict[int, Done] = {}
        self.undoes: dict[int, int] = {}
        self.now: Look = {}
        self.was_known: list[tuple[datetime, Look]] = []
        self.rows: dict[str, int] = {}
        # Something to work on, so that few commands are refused for want of it.
        for name in NAMES[:2]:
            self.add_system(name, None, False)
            self.add_solution(name, LABELS[0], name == NAMES[0], 2001)
            self.log(name, 1, 7.0, None, None)
        self.add_site(PLACES[0])

    def teardown(self) -> None:
        if hasattr(self, "db"):
            self._everything_is_still_known()

    # ------------------------------------------------------------------ commands

    def stamp(self, who: str = PEOPLE[0]) -> Stamp:
        self.clock += timedelta(hours=1)
        return Stamp(self.clock, who, "campaign test")

    def command(self, work: Callable[[Stamp], object], *, who: str = PEOPLE[0]) -> bool:
        """Run a command as the program does; a refusal changes nothing."""
        stamp = self.stamp(who)
        before = self.now
        try:
            work(stamp)
        except (Conflict, NotFound):
            assert self.look() == before
            return False
        self.now = self.look()
        newest = self.newest()
        if newest is not None and newest not in self.done:
            self.done[newest] = Done(who, before, self.now)
        self.was_known.append((self.clock, self.known_now()))
        return True

    def one_of(self, kind: str, pick: int) -> int:
        """The number of an entry that there is, or of one that was there."""
        numbers = sorted({key[1] for each in self.done.values() for key in each.after if key[0] == kind})
        return numbers[pick % len(numbers)] if numbers else 1

    def catalogue(self, work: Callable[[Writing], object], **how: Any) -> bool:
        def run(stamp: Stamp) -> None:
            with store.writing(self.db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
                work(writing)

        return self.command(run, **how)

    def add_system(self, name: str, alias: str | None, star: bool) -> None:
        entry = System(0, name, 10.0, 20.0, aliases=() if alias is None else (alias,))
        if star:
            entry = replace(entry, star_a=Star("A", "WC7"))
        self.command(lambda stamp: system_studies.add_system(self.db, stamp, entry))

    def change_priority(self, name: str, priority: int, who: str) -> None:
        self.command(
            lambda stamp: system_studies.change_system(self.db, stamp, name, {"priority": priority}), who=who
        )

    def rename_or_describe(self, name: str, other: str, star: bool) -> None:
        changes: dict[str, Any] = {"star_b": {"spectral_type": other}} if star else {"name": other}
        self.command(lambda stamp: system_studies.change_system(self.db, stamp, name, changes))

    def add_alias(self, name: str, alias: str) -> None:
        self.command(lambda stamp: system_studies.change_system(self.db, stamp, name, {"aliases": (alias,)}))

    def retire(self, name: str) -> None:
        self.command(lambda stamp: system_studies.retire_system(self.db, stamp, name))

    def add_site(self, place: str) -> None:
        site = Site(0, place, latitude_deg=-31.0, longitude_deg_east=-70.0)
        self.catalogue(lambda writing: sites.add_site(writing, site))

    def add_solution(self, name: str, label: str, adopt: bool, year: int) -> None:
        draft = Solution(0, 0, label, period_d=Measured(3000.0, 1.0, 1.0), source="Orrery 2029")
        epoch = read_instant(f"{year}-01-01T00:00:00Z")
        self.command(
            lambda stamp: solutions.add_solution(self.db, stamp, name, draft, epoch, None, None, adopt),
        )

    def adopt(self, name: str, weights: Mapping[str, float]) -> None:
        given = dict(weights) if len(weights) > 1 else {next(iter(weights)): None}
        self.command(lambda stamp: solutions.adopt_solutions(self.db, stamp, name, given, True))

    def set_rule(self, name: str, onset: float) -> None:
        wanted = DustRule(0, 0, "lag", onset=Measured(onset, 1.0, 1.0))
        self.command(lambda stamp: rules.set_rule(self.db, stamp, name, wanted))

    def add_episode(self, name: str, cycle: int | None, state: Any) -> None:
        def work(writing: Writing) -> None:
            system_id = systems.find_system(writing.connection, name).id
            onset = DatedEvent(Moment(58_000.0, 1.0, 1.0), "K", None)
            episodes.add_episode(writing, Episode(0, system_id, cycle, state, onset=onset))

        self.catalogue(work)

    def decide_episode(self, number: int, state: Any) -> None:
        number = self.one_of("episode", number)
        self.catalogue(lambda writing: episodes.decide_episode(writing, number, state))

    def amend_or_withdraw_episode(self, number: int) -> None:
        number = self.one_of("episode", number)

        def work(writing: Writing) -> None:
            if number % 2:
                episodes.withdraw_episode(writing, number)
                return
            found = {e.id: e for r in records.load_records(writing.connection) for e in r.episodes}
            if number in found:
                episodes.amend_episode(writing, number, replace(found[number], note="better"))

        self.catalogue(work)

    def point(self, system_id: int, day: int, mag: float, **fields: Any) -> Observation:
        moment = Moment(60_000.0 + day, 0.0, 0.0, "typed", "utc", "geocentre")
        return Observation(0, "", system_id, "photometry", moment, Measured(mag), "mag", band="K", **fields)

    def log(self, name: str, day: int, mag: float, place: str | None, source: str | None) -> None:
        def work(writing: Writing) -> None:
            system_id = systems.find_system(writing.connection, name).id
            observations.add_observation(writing, self.point(system_id, day, mag, site=place, source=source))

        self.catalogue(work)

    def load(self, first: str, second: str, days: set[int]) -> None:
        def work(writing: Writing) -> None:
            both = [systems.find_system(writing.connection, name).id for name in (first, second)]
            observations.add_observations(
                writing, [self.point(both[day % 2], day, 7.0, source="Table 3") for day in sorted(days)]
            )

        self.catalogue(work)

    def amend(self, number: int, mag: float) -> None:
        number = self.one_of("observation", number)
        self.command(lambda stamp: amend.amend_observation(self.db, stamp, number, {"value": Measured(mag)}))

    def withdraw(self, number: int, other: int) -> None:
        number, other = self.one_of("observation", number), self.one_of("observation", other)
        self.command(lambda stamp: amend.withdraw_observations(self.db, stamp, [number, other], "wrong star"))

    def keep_forecasts(self, name: str, label: str | None) -> None:
        def work(writing: Writing) -> None:
            system_id = systems.find_system(writing.connection, name).id
            keeping = Keeping(0, label, 6e4, 6e4, 6.1e4, writing.at, writing.at, 100, 1, "0.1")
            event = EventForecast(name, "onset", 1, "orbit", None, None, None, None, "open", 1.0, 0.5)
            forecast = KeptForecast(0, 0, system_id, event, (), None, None, ForecastInputs())
            keepings.add_keeping(writing, keeping, [forecast, forecast])

        self.catalogue(work)

    COMMANDS: ClassVar[dict[str, st.SearchStrategy[dict[str, Any]]]] = {
        "add_system": st.fixed_dictionaries(dict(name=names, alias=st.none() | names, star=st.booleans())),
        "change_priority": st.fixed_dictionaries(
            dict(name=names, priority=st.integers(1, 3), who=st.sampled_from(PEOPLE))
        ),
        "rename_or_describe": st.fixed_dictionaries(dict(name=names, other=names, star=st.booleans())),
        "add_alias": st.fixed_dictionaries(dict(name=names, alias=names)),
        "retire": st.fixed_dictionaries(dict(name=names)),
        "add_site": st.fixed_dictionaries(dict(place=places)),
        "add_solution": st.fixed_dictionaries(
            dict(name=names, label=labels, adopt=st.booleans(), year=st.integers(2001, 2009))
        ),
        "adopt": st.fixed_dictionaries(
            dict(name=names, weights=st.dictionaries(labels, st.sampled_from([1.0, 2.0]), min_size=1))
        ),
        "set_rule": st.fixed_dictionaries(dict(name=names, onset=st.sampled_from([-10.0, -20.0]))),
        "add_episode": st.fixed_dictionaries(
            dict(
                name=names,
                cycle=st.none() | st.integers(0, 2),
                state=st.sampled_from(["proposed", "confirmed"]),
            )
        ),
        "keep_forecasts": st.fixed_dictionaries(dict(name=names, label=st.none() | labels)),
        "decide_episode": st.fixed_dictionaries(
            dict(number=numbers, state=st.sampled_from(["proposed", "confirmed", "rejected"]))
        ),
        "amend_or_withdraw_episode": st.fixed_dictionaries(dict(number=numbers)),
        "log": st.fixed_dictionaries(
            dict(
                name=names,
                day=st.integers(0, 3),
                mag=st.sampled_from([7.0, 7.5]),
                place=st.none() | places,
                source=st.none() | st.just("Night book"),
            )
        ),
        "load": st.fixed_dictionaries(
            dict(first=names, second=names, days=st.sets(st.integers(0, 9), min_size=1, max_size=5))
        ),
        "amend": st.fixed_dictionaries(dict(number=numbers, mag=st.sampled_from([7.0, 7.5, 8.0]))),
        "withdraw": st.fixed_dictionaries(dict(number=numbers, other=numbers)),
    }

    @rule(data=st.data(), name=st.sampled_from(sorted(COMMANDS)))
    def give_command(self, data: Any, name: str) -> None:
        getattr(self, name)(**data.draw(self.COMMANDS[name]))

    @rule(data=st.data(), name=st.sampled_from(sorted(COMMANDS)))
    def give_another_command(self, data: Any, name: str) -> None:
        getattr(self, name)(**data.draw(self.COMMANDS[name]))

    @rule(
        data=st.data(),
        name=st.sampled_from(["load", "log", "amend", "withdraw", "add_episode", "decide_episode"]),
    )
    def keep_what_was_seen(self, data: Any, name: str) -> None:
        getattr(self, name)(**data.draw(self.COMMANDS[name]))

    # ------------------------------------------------------------------ undo

    @precondition(lambda self: self.done)
    @rule(pick=st.integers(0, 10_000), who=st.sampled_from(PEOPLE))
    def undo_any(self, pick: int, who: str) -> None:
        asked = sorted(self.done)[pick % len(self.done)]
        self.undo(asked, who)

    @precondition(lambda self: self.done)
    @rule(back=st.integers(1, 4), who=st.sampled_from(PEOPLE))
    def undo_lately(self, back: int, who: str) -> None:
        self.undo(sorted(self.done)[-min(back, len(self.done))], who)

    @rule(who=st.sampled_from(PEOPLE))
    def undo_last_of(self, who: str) -> None:
        mine = [
            number
            for number, each in self.done.items()
            if each.who == who and number not in self.undoes.values() and len(self.chain(number)) % 2 == 1
        ]
        if mine:
            self.undo(None, who, expected=max(mine))
        else:
            with pytest.raises(NotFound):
                undo.undo(self.db, self.stamp(who), None)

    def undo(self, asked: int | None, who: str, expected: int | None = None) -> None:
        target = self.chain(expected if asked is None else asked)[-1]  # type: ignore[arg-type]
        stamp, before = self.stamp(who), self.now
        if asked is not None and not self.stands(asked):
            with pytest.raises(Conflict) as refused:
                undo.undo(self.db, stamp, asked)
            assert refused.value.code == "already-undone"
            assert refused.value.details["undone_by"] == target
            return
        wanted, reasons = self.without(target)
        try:
            preview = undo.preview_undo(self.db, who, asked)
            result = undo.undo(self.db, stamp, asked)
        except Conflict as refused:
            assert refused.code == "depended-on", refused.why
            assert self.look() == before
            later = [each["operation"] for each in refused.details["dependants"]]
            assert later and all(self.stands(number) for number in later)
            assert reasons or self.may_be_cautious(target, later), (target, refused.why)
            return
        assert not reasons, (target, reasons)
        assert preview.changes == result.changes
        self.now = self.look()
        assert not {key for key in difference(self.now, wanted) if not self.follows(key)}
        assert result.by_id is not None
        assert result.by_id == self.newest()
        self.undoes[result.by_id] = target
        self.done[result.by_id] = Done(who, before, self.now)
        self.was_known.append((self.clock, self.known_now()))

    def without(self, target: int) -> tuple[Look, list[str]]:
        """How the catalogue looks with this command taken back, and what speaks against it."""
        did = self.done[target]
        wanted, reasons = dict(self.now), []
        for key in did.changed:
            if self.now.get(key) != did.after.get(key) and not self.follows(key):
                reasons.append(f"{key} looks otherwise")
            wanted.pop(key, None)
            if key in did.before:
                wanted[key] = did.before[key]
        return wanted, reasons + hanging(wanted)

    def follows(self, key: tuple[Any, ...]) -> bool:
        """The cycle of a solution's epoch follows from what is adopted, also while it is out of use."""
        return key[0] == "cycle" and any(
            each.before.get(("solution", key[1])) != each.after.get(("solution", key[1]))
            for number, each in self.done.items()
            if number in self.undoes or ("solution", key[1]) in each.changed
        )

    def may_be_cautious(self, target: int, later: list[int]) -> bool:
        """What a system rests on is one state, and what counts from it: any later change of these counts."""
        mine = {key[0] for key in self.done[target].changed}
        for number in later:
            theirs = {key[0] for key in self.done[number].changed}
            counted = "anchor" in mine and theirs & {"episode", "solution", "cycle"}
            one_state = mine & theirs & {"adopted", "rule"}
            # Changed back and forth by later commands that stand, an entry looks as it was left.
            same_entry = self.done[target].changed & self.done[number].changed
            if not (counted or one_state or same_entry):
                return False
        return True

    def chain(self, number: int) -> list[int]:
        first = number
        while first in self.undoes:
            first = self.undoes[first]
        found = [first]
        by_target = {target: undo for undo, target in self.undoes.items()}
        while found[-1] in by_target:
            found.append(by_target[found[-1]])
        return found

    def stands(self, number: int) -> bool:
        chain = self.chain(number)
        return (len(chain) - chain.index(number)) % 2 == 1

    # ------------------------------------------------------------------ what holds always

    def look(self) -> Look:
        with store.reading(self.db) as connection:
            return look(connection)

    def known_now(self) -> Look:
        with store.reading(self.db) as connection:
            return known(connection, self.clock)

    def newest(self) -> int | None:
        with store.reading(self.db) as connection:
            found: int | None = connection.execute(text("SELECT max(id) FROM operations")).scalar()
            return found

    @invariant()
    def nothing_is_lost(self) -> None:
        if not hasattr(self, "db"):
            return
        with store.reading(self.db) as connection:
            for table in ("systems", "sites", "sources", "solutions", "adoptions", "dust_rules", "episodes",
                          "observations", "operations", "changes"):  # fmt: skip
                rows = connection.execute(text(f"SELECT count(*) FROM {table}")).scalar_one()
                assert rows >= self.rows.get(table, 0), table
                self.rows[table] = rows
            assert connection.execute(text("PRAGMA foreign_key_check")).all() == []

    def _everything_is_still_known(self) -> None:
        with store.reading(self.db) as connection:
            for at, then in self.was_known:
                found = known(connection, at)
                # A system that was entered later is listed, with nothing known of it.
                later = {key for key in found if key not in then and key[0] == "system"}
                assert {key: value for key, value in found.items() if key not in later} == then, at


def difference(found: Look, wanted: Look) -> dict[Any, Any]:
    keys = found.keys() | wanted.keys()
    return {k: (found.get(k), wanted.get(k)) for k in keys if found.get(k) != wanted.get(k)}


BEGUN: dict[str, Path] = {}


@pytest.fixture
def _begun(tmp_path: Path) -> Iterator[None]:
    BEGUN["path"] = begun(tmp_path) / "begun.db"
    with keep_engines():
        yield


def run(examples: int, steps: int) -> None:
    run_state_machine_as_test(
        Undoing,
        settings=settings(
            max_examples=examples,
            stateful_step_count=steps,
            deadline=None,
            suppress_health_check=list(HealthCheck),
            # A failure shows the steps that led to it; to shorten them would take many minutes.
            phases=[Phase.explicit, Phase.generate],
            report_multiple_bugs=False,
            print_blob=True,
            database=None,
        ),
    )


@pytest.mark.usefixtures("_begun")
def test_commands_and_undos_in_any_order_agree_with_a_simple_model() -> None:
    run(8, 30)


@pytest.mark.slow
@pytest.mark.usefixtures("_begun")
def test_commands_and_undos_in_any_order_agree_with_a_simple_model_for_long() -> None:
    run(60, 50)
