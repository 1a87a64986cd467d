"""A fault at the n-th statement, for every n: the state before or the state after, nothing between.

Recipe: engineering notes 4.11.
"""

from __future__ import annotations

import shutil
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest
from reliability_examples import NOW, FaultError, assert_sound, content, fault_at, fill, point, solution

from campaign.catalogue import episodes, info, observations, rules, sites, solutions, store, systems, upgrade
from campaign.catalogue.store import Writing
from campaign.errors import CampaignError
from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.systems import DatedEvent, DustRule, Episode, Site, Star, System


def new_system(writing: Writing) -> None:
    star = Star("A", "WC7", mass_msun=Measured(13.0, 1.0, 1.0))
    systems.add_system(writing, System(0, "Harbour", 1.0, 2.0, aliases=("Port", "Quay"), star_a=star))


def renamed_system(writing: Writing) -> None:
    before = systems.find_system(writing.connection, "Lantern")
    after = replace(before, name="Lantern B", aliases=("Lantern", "Lamp"), priority=1, star_b=Star("B", "O5"))
    systems.change_system(writing, before, after)


def new_adopted_solution(writing: Writing) -> None:
    third = solutions.add_solution(writing, solution(1, "third"))
    solutions.adopt_instead(writing, third)
    systems.set_cycle_anchor(writing, 1, 61_234.0, 3127.5)
    solutions.set_epoch_cycle(writing, third, 0)


def weighted_solutions(writing: Writing) -> None:
    known = solutions.solutions_of(writing.connection, 1)
    solutions.adopt_weighted(writing, 1, {known[0].id: 0.4, known[1].id: 0.6})


def new_rule(writing: Writing) -> None:
    rules.set_rule(writing, DustRule(0, 1, "phase", onset=Measured(-0.02, 0.005, 0.005)))


def amended_episode(writing: Writing) -> None:
    later = Episode(0, 1, 0, "proposed", maximum=DatedEvent(Moment(58_200.0), "L"), source="Night book")
    number = episodes.amend_episode(writing, 1, later)
    episodes.decide_episode(writing, number, "confirmed")


def new_site(writing: Writing) -> None:
    sites.add_site(writing, Site(0, "High Kite", "space", elongation_min_deg=85.0, elongation_max_deg=135.0))
    info.set_info(writing, "sample_as_of", "2031-04-07T00:00:00Z")


def one_observation(writing: Writing) -> None:
    observations.add_observation(writing, replace(point(1, 900), site="Cold Mesa", source="Night book"))


def many_observations(writing: Writing) -> None:
    entries = [replace(point(2, 900 + number), source=f"book {number % 3}") for number in range(30)]
    observations.add_observations(writing, entries)


def corrected_observation(writing: Writing) -> None:
    observations.supersede_observation(writing, 1, replace(point(1, 0), value=Measured(7.5, 0.1, 0.1)))
    observations.withdraw_observation(writing, 2)


CHANGES = [
    new_system,
    renamed_system,
    new_adopted_solution,
    weighted_solutions,
    new_rule,
    amended_episode,
    new_site,
    one_observation,
    many_observations,
    corrected_observation,
]


@pytest.fixture(scope="module")
def good(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("good") / "campaign.db"
    fill(path)
    return path


@pytest.mark.parametrize("change", CHANGES, ids=lambda change: change.__name__)
def test_a_fault_at_any_statement_leaves_before_or_after(
    change: Callable[[Writing], None], good: Path, tmp_path: Path
) -> None:
    database = tmp_path / "campaign.db"
    shutil.copy(good, database)
    before = content(database)
    number = 0
    while True:
        number += 1
        with fault_at(number) as tried:
            try:
                with store.writing(database, at=NOW, who="x", command="y", summary="z") as writing:
                    change(writing)
            except (FaultError, CampaignError):
                assert len(tried) == number
                assert content(database) == before
                continue
        break
    assert number > 5
    assert tried[-1] == "COMMIT"
    after = content(database)
    assert len(after["operations"]) == len(before["operations"]) + 1
    assert after["operations"][-1][5] == "z"
    assert len(after["changes"]) > len(before["changes"])
    assert_sound(database)


def test_a_fault_at_any_statement_of_a_first_start_leaves_nothing(tmp_path: Path) -> None:
    number, stopped = 1, 0
    while True:
        database = tmp_path / f"{number}.db"
        with fault_at(number) as tried:
            try:
                upgrade.begin_database(database, at=NOW)
            except (FaultError, CampaignError):
                # A migration that rebuilds a table clears its copy away after a fault.
                assert tried[number:] in ([], [s for s in tried[number:] if "_alembic_tmp_" in s])
                found = content(database) if database.exists() else {}
                # After the last commit comes only the check that the new file is whole.
                assert len(found.get("campaign_info", [])) == (3 if "COMMIT" in tried[:-1] else 0)
                assert bool(found) == ("COMMIT" in tried[:-1])
                number += 2
                stopped += 1
                continue
        break
    assert stopped >= 15
    assert "COMMIT" in tried
    assert len(content(database)["alembic_version"]) == 1
